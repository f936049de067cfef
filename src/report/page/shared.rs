//! What several pages show: verdicts, candidates, the ends enlarged, input quality, settings.

use serde_json::{Map, Value};

use crate::error::Finding;
use crate::numeric::sum::rms;
use crate::operator::ChainDescription;
use crate::place::escape;
use crate::report::page::content::Content;
use crate::report::page::{
    Answer, Band, Block, Cell, Choice, Figure, FigureSet, Line, POINTS, Quantity, Section, Span, Stretch, Table,
    thinned,
};
use crate::report::text::{figure, operators_text};
use crate::report::{AxisReport, Curve, InputReport, Picture, TrustedReport, VerdictReport};
use crate::settings::{Group, find};
use crate::verdict::Adequacy;

/// Channels that get figures: with more, each would be too coarse to judge. The others stand in the tables.
pub const DRAWN: usize = 6;
/// Lines' worth of points that one channel's figures take.
const LINES: usize = 24;

/// What stands where a channel's figures would.
pub fn too_many() -> String {
    format!("Figures are drawn for the first {DRAWN} channels; choose others with --channel.")
}

/// Points of a line that runs over the whole record, when so many channels are drawn.
pub fn points(channels: usize) -> usize {
    (POINTS / (LINES * channels.clamp(1, DRAWN))).min(1000)
}

/// `lowpass 12Hz, butterworth:4` and so on, in one line.
pub fn asked(input: &InputReport, chain: &ChainDescription) -> String {
    let operators = operators_text(chain, &input.axis);
    let operators: Vec<&str> = operators.lines().collect();
    format!("{}: {} samples. {}.", input.path, input.samples, operators.join("; "))
}

/// The axis across.
pub fn along(axis: &AxisReport) -> Quantity {
    Quantity::linear(if axis.kind == "time" { "time" } else { "position" }, axis.unit.to_string())
}

/// `within tolerance`.
pub const fn adequacy(found: Adequacy) -> &'static str {
    match found {
        Adequacy::Within => "within tolerance",
        Adequacy::Borderline => "borderline",
        Adequacy::Outside => "outside tolerance",
    }
}

/// The verdict on one channel in one sentence, with the figure that decides.
pub fn answer(content: &Content<'_>, axis: &AxisReport) -> Answer {
    let name = content.name.to_owned();
    let used = content.used_sentence.as_str();
    let Some(verdict) = content.verdict else {
        return Answer {
            name,
            sentence: format!("{used} Nothing was judged: the operators leave nothing to assume."),
            figure: String::new(),
        };
    };
    let unit = &content.unit;
    let (Some(error), Some(bound)) = (verdict.predicted_error, verdict.bound) else {
        return Answer { name, sentence: format!("{used} Their edge error was not judged."), figure: String::new() };
    };
    let share = 100.0 * error / verdict.output_deviation;
    let judged = verdict.adequacy.map_or("not judged", adequacy);
    let trusted = match content.trusted {
        Some(span) => format!("trust {} to {} {}", figure(span.from, 6), figure(span.to, 6), axis.unit),
        None => "no sample is trusted".to_owned(),
    };
    Answer {
        name,
        sentence: format!(
            "{used} The assumption costs about {} {unit} ({} % of the output's standard deviation) at the ends, {judged} of {} {unit}; {trusted}.",
            figure(error, 2),
            figure(share, 2),
            figure(verdict.tolerance, 3),
        ),
        figure: format!("Edge error below {} {unit} in about 95 of 100 records.", figure(bound, 2)),
    }
}

/// The table over all channels.
pub fn overview(contents: &[Content<'_>], axis: &AxisReport) -> Table {
    let head = ["channel", "unit", "ends", "chosen", "edge error", "% of s.d.", "bound", "tolerance", "adequacy"];
    let mut head: Vec<String> = head.map(str::to_owned).into();
    head.push(format!("trusted [{}]", axis.unit));
    let rows = contents.iter().map(|content| {
        let of = |get: fn(&VerdictReport) -> Option<f64>| content.verdict.and_then(get);
        vec![
            Cell::text(content.name),
            Cell::text(content.unit.clone()),
            Cell::text(content.used),
            Cell::text(content.why),
            Cell::Number(of(|v| v.predicted_error), 3),
            Cell::Number(of(|v| v.predicted_error.map(|e| 100.0 * e / v.output_deviation)), 3),
            Cell::Number(of(|v| v.bound), 3),
            Cell::Number(of(|v| Some(v.tolerance)), 3),
            Cell::text(content.verdict.and_then(|v| v.adequacy).map_or("\u{2013}", adequacy)),
            Cell::text(span(content.trusted)),
        ]
    });
    Table {
        caption: "What the assumption about the ends costs, channel by channel".to_owned(),
        head,
        rows: rows.collect(),
    }
}

/// `0.1 to 11.9`.
pub fn span(trusted: Option<TrustedReport>) -> String {
    trusted.map_or_else(|| "\u{2013}".to_owned(), |s| format!("{} to {}", figure(s.from, 6), figure(s.to, 6)))
}

/// The record with its continuations, and both ends enlarged.
pub fn ends(picture: &Picture, axis: &AxisReport, count: usize) -> Vec<Block> {
    let options: Vec<String> = picture.curves.iter().map(|curve| curve.name.to_owned()).collect();
    let first = options.iter().position(|name| *name == picture.takes).unwrap_or(0);
    let choice = Choice { legend: "Continued past both ends by".to_owned(), options, first };
    let continuations = FigureSet {
        choice: Some(choice),
        figures: vec![
            whole(picture, axis, count),
            close(picture, axis, 0, count / 2),
            close(picture, axis, 1, count / 2),
        ],
    };
    let outputs = FigureSet {
        choice: None,
        figures: vec![
            output(picture, axis, 0, count / 4, Shown::Output),
            output(picture, axis, 1, count / 4, Shown::Output),
            output(picture, axis, 0, count / 4, Shown::Difference),
            output(picture, axis, 1, count / 4, Shown::Difference),
        ],
    };
    vec![
        Block::Heading("The record, and what is assumed past its ends".to_owned()),
        Block::Figures(continuations),
        Block::Heading("The outputs near the ends, under every extension".to_owned()),
        Block::Figures(outputs),
        Block::Table(costs(picture)),
    ]
}

/// What every extension costs at either end: over its edge zone, the distance from the forecast's output and the forecast's own
/// deviation taken together.
fn costs(picture: &Picture) -> Table {
    let len = picture.record.len();
    let zone = picture.zone.min(len);
    let foretold = picture.curves.first().map(|curve| curve.output.as_slice()).unwrap_or_default();
    let at = |curve: &Curve, side: usize, from_end: usize| {
        let n = if side == 0 { from_end } else { len - 1 - from_end };
        let distance = curve.output.get(n)? - foretold.get(n)?;
        Some(distance.hypot(picture.deviation[side].get(from_end).copied().unwrap_or(0.0)))
    };
    let rows = picture.curves.iter().map(|curve| {
        let mut row = vec![Cell::text(curve.name)];
        for side in 0..SIDES.len() {
            let values: Vec<f64> = (0..zone).filter_map(|from_end| at(curve, side, from_end)).collect();
            let spread = (!values.is_empty()).then(|| rms(&values));
            row.extend([Cell::Number(spread, 3), Cell::Number(values.first().copied(), 3)]);
        }
        row
    });
    let unit = &picture.unit;
    let head =
        SIDES.iter().flat_map(|side| [format!("{side} end, RMS [{unit}]"), format!("at the {side} sample [{unit}]")]);
    Table {
        caption: format!("What to expect at each end, over {zone} samples: one standard deviation"),
        head: std::iter::once("continued by".to_owned()).chain(head).collect(),
        rows: rows.collect(),
    }
}

const SIDES: [&str; 2] = ["left", "right"];
/// Style of the record's own line.
const RECORD: usize = 8;

/// A curve past one end, from the record's end sample outwards, in the order of the axis.
fn continuation(picture: &Picture, index: usize, side: usize, count: usize) -> Vec<[f64; 2]> {
    let (len, outwards) = (picture.record.len(), &picture.curves[index].past[side]);
    let axis = &picture.axis;
    let mut values: Vec<f64> = Vec::with_capacity(outwards.len() + 1);
    values.extend(if side == 0 { picture.record.first() } else { picture.record.last() });
    values.extend(outwards);
    if side == 0 {
        values.reverse();
        thinned(&values, axis.start() - outwards.len() as f64 * axis.step(), axis.step(), count)
    } else {
        thinned(&values, axis.start() + (len.saturating_sub(1)) as f64 * axis.step(), axis.step(), count)
    }
}

fn record_span(picture: &Picture) -> Span {
    let (axis, len) = (&picture.axis, picture.record.len());
    let to = axis.start() + len.saturating_sub(1) as f64 * axis.step();
    Span { kind: Stretch::Record, from: axis.start(), to }
}

fn whole(picture: &Picture, axis: &AxisReport, count: usize) -> Figure {
    let mut lines: Vec<Line> = Vec::new();
    for (index, curve) in picture.curves.iter().enumerate() {
        for (side, end) in SIDES.iter().enumerate() {
            lines.push(Line {
                name: if side == 0 { curve.name.to_owned() } else { String::new() },
                style: index,
                option: Some(index),
                points: continuation(picture, index, side, (count / 10).max(8)),
            });
            debug_assert!(!end.is_empty());
        }
    }
    let own = thinned(&picture.record, picture.axis.start(), picture.axis.step(), count);
    lines.push(Line { name: "record".to_owned(), style: RECORD, option: None, points: own });
    Figure {
        title: format!("{}: the record and its continuation", picture.name),
        description: format!(
            "Line chart of channel {} over {}, with the assumed continuation past both ends; the white field is the record.",
            picture.name, axis.kind
        ),
        x: along(axis),
        y: Quantity::linear(picture.name.clone(), picture.unit_in.clone()),
        lines,
        bands: Vec::new(),
        spans: vec![record_span(picture)],
    }
}

/// The record and its continuation around one end.
fn close(picture: &Picture, axis: &AxisReport, side: usize, count: usize) -> Figure {
    let past = picture.curves.iter().map(|curve| curve.past[side].len()).max().unwrap_or(0);
    let len = picture.record.len();
    let inside = past.max(8).min(len);
    let range = if side == 0 { 0..inside } else { len - inside..len };
    let start = picture.axis.start() + range.start as f64 * picture.axis.step();
    let mut lines: Vec<Line> = (0..picture.curves.len())
        .map(|index| Line {
            name: picture.curves[index].name.to_owned(),
            style: index,
            option: Some(index),
            points: continuation(picture, index, side, count / 2),
        })
        .collect();
    let own = thinned(&picture.record[range.clone()], start, picture.axis.step(), count / 2);
    lines.push(Line { name: "record".to_owned(), style: RECORD, option: None, points: own });
    let to = start + range.len().saturating_sub(1) as f64 * picture.axis.step();
    Figure {
        title: format!("{}: {} end enlarged", picture.name, SIDES[side]),
        description: format!(
            "Line chart of channel {} around its {} end, with the assumed continuation outside the white field.",
            picture.name, SIDES[side]
        ),
        x: along(axis),
        y: Quantity::linear(picture.name.clone(), picture.unit_in.clone()),
        lines,
        bands: Vec::new(),
        spans: vec![Span { kind: Stretch::Record, from: start, to }],
    }
}

/// What a figure of an edge zone shows.
#[derive(Clone, Copy, PartialEq, Eq)]
enum Shown {
    /// The outputs.
    Output,
    /// Their distances from the forecast's: what the assumptions differ by.
    Difference,
}

/// Every candidate over one edge zone, the forecast's band, and what is trusted.
fn output(picture: &Picture, axis: &AxisReport, side: usize, count: usize, shown: Shown) -> Figure {
    let len = picture.record.len();
    let zone = picture.zone.clamp(8, len.max(8)).min(len);
    let range = if side == 0 { 0..zone } else { len - zone..len };
    let stamp = |n: usize| picture.axis.start() + n as f64 * picture.axis.step();
    let foretold = picture.curves.first().map(|curve| curve.output.as_slice()).unwrap_or_default();
    let value = |curve: &Curve, n: usize| match shown {
        Shown::Output => curve.output.get(n).copied(),
        Shown::Difference => Some(curve.output.get(n)? - foretold.get(n)?),
    };
    let lines = picture.curves.iter().enumerate().rev().map(|(index, curve)| {
        let values: Vec<f64> = range.clone().filter_map(|n| value(curve, n)).collect();
        let points = thinned(&values, stamp(range.start), picture.axis.step(), count);
        Line { name: curve.name.to_owned(), style: index, option: None, points }
    });
    let spread = |n: usize| {
        let from_end = if side == 0 { n } else { len - 1 - n };
        picture.deviation[side].get(from_end).copied().unwrap_or(0.0)
    };
    let every = (range.len() / count.max(1)).max(1);
    let band = range.clone().step_by(every).filter_map(|n| {
        let middle = picture.curves.first().and_then(|curve| value(curve, n))?;
        Some([stamp(n), middle - 2.0 * spread(n), middle + 2.0 * spread(n)])
    });
    let trusted = picture.trusted.and_then(|trusted| {
        let (from, to) = (trusted.from.max(stamp(range.start)), trusted.to.min(stamp(range.end.saturating_sub(1))));
        (from < to).then_some(Span { kind: Stretch::Trusted, from, to })
    });
    let white = Span { kind: Stretch::Record, from: stamp(range.start), to: stamp(range.end.saturating_sub(1)) };
    let (what, upwards) = match shown {
        Shown::Output => ("output", "conditioned"),
        Shown::Difference => ("difference from the forecast's output", "difference"),
    };
    Figure {
        title: format!("{}: {what} at the {} end", picture.name, SIDES[side]),
        description: format!(
            "Channel {}, {what} over its {} end under every extension, with the band of two standard deviations around the forecast.",
            picture.name, SIDES[side]
        ),
        x: along(axis),
        y: Quantity::linear(format!("{} {upwards}", picture.name), picture.unit.clone()),
        lines: lines.collect(),
        bands: vec![Band { name: "forecast ± 2 s.d.".to_owned(), style: 0, points: band.collect() }],
        spans: std::iter::once(white).chain(trusted).collect(),
    }
}

/// What was read, and every remark.
pub fn quality(input: &InputReport, notes: &[&Finding]) -> Section {
    let axis = &input.axis;
    let interval = axis
        .rate_interval
        .map_or(String::new(), |[low, high]| format!(" (between {} and {})", figure(low, 8), figure(high, 8)));
    let row = |name: &str, value: String| vec![Cell::text(name), Cell::text(value)];
    let rate_unit = if axis.kind == "time" { "Hz" } else { "samples per metre" };
    let mut rows = vec![
        row("file", input.path.clone()),
        row("bytes", input.bytes.to_string()),
        row("SHA-256", input.sha256.clone()),
        row("samples a channel", input.samples.to_string()),
        row("rate", format!("{} {rate_unit}{interval}", figure(axis.rate, 8))),
        row("rate known from", rate_source(axis).to_owned()),
        row("first stamp", format!("{} {}", figure(axis.start, 10), axis.unit)),
    ];
    rows.extend(axis.epoch.as_ref().map(|epoch| row("stamp 0 is", epoch.clone())));
    let table = Table { caption: "The record as read".to_owned(), head: vec!["what".into(), "value".into()], rows };
    Section { heading: "Input quality".to_owned(), blocks: vec![Block::Table(table), remarks(notes)] }
}

/// Every remark.
pub fn remarks(notes: &[&Finding]) -> Block {
    if notes.is_empty() {
        return Block::Text("No remarks: nothing was repaired, guessed or left out.".to_owned());
    }
    Block::List(notes.iter().map(|note| note.to_string()).collect())
}

fn rate_source(axis: &AxisReport) -> &'static str {
    use crate::record::RateSource;
    match axis.how {
        RateSource::Given => "the command line",
        RateSource::Header => "the file's header",
        RateSource::Stamps => "the stamps",
    }
}

/// The command line that gives the same again.
pub fn settings(command: &str, groups: &[Group], input: &str, settings: &Map<String, Value>, tail: &str) -> Section {
    let mut words = vec!["endgrain".to_owned(), command.to_owned(), quoted(input)];
    words.extend(options(settings, groups));
    if !tail.is_empty() {
        words.push(tail.to_owned());
    }
    let code = command_line(&words);
    Section { heading: "Settings, to run it again".to_owned(), blocks: vec![Block::Code(code)] }
}

/// A command line with one option a line.
pub fn command_line(words: &[String]) -> String {
    words.join(" \\\n    ")
}

/// Settings as options of a command that has these groups of them.
pub fn options(settings: &Map<String, Value>, groups: &[Group]) -> Vec<String> {
    let mut words = Vec::new();
    let own = |key: &str| find(key).is_some_and(|row| groups.contains(&row.group));
    for (key, value) in settings.iter().filter(|(key, _)| own(key)) {
        match value {
            Value::Bool(true) => words.push(format!("--{key}")),
            Value::Array(values) => {
                words.extend(values.iter().filter_map(Value::as_str).map(|text| format!("--{key} {}", quoted(text))));
            }
            Value::String(text) => words.push(format!("--{key} {}", quoted(text))),
            Value::Number(number) => words.push(format!("--{key} {number}")),
            _ => {}
        }
    }
    words
}

/// A word for a POSIX shell, control characters made visible.
pub fn quoted(text: &str) -> String {
    let plain = |c: char| c.is_ascii_alphanumeric() || "._/:=%+-,@#".contains(c);
    let text = escape(text);
    if !text.is_empty() && text.chars().all(plain) { text } else { format!("'{}'", text.replace('\'', "'\\''")) }
}
