//! The page of a conditioned record: what was assumed, what it costs, and what was done.

use crate::compare::How;
use crate::place::escape;
use crate::report::page::content::Content;
use crate::report::page::shared::{self, DRAWN};
use crate::report::page::{
    Band, Block, Cell, Figure, FigureSet, Line, Page, Passage, Quantity, Section, Spectra, Stack, Table, thinned_along,
};
use crate::report::{Amount, ChannelReport, IntegralReport, Report};
use crate::settings::Group;
use crate::verdict::{Adequacy, Edge};

/// The page of a conditioned record. Passages belong to the channels in their order.
pub fn condition_page(report: &Report, passages: &[Passage]) -> Page {
    let axis = &report.input.axis;
    let contents: Vec<Content<'_>> = report
        .channels
        .iter()
        .map(|channel| Content {
            name: &channel.name,
            unit: channel.unit.to_string(),
            used: &channel.extension.kind,
            why: why(channel.extension.how),
            used_sentence: format!("{} ends, {}.", channel.extension.kind, why(channel.extension.how)),
            verdict: channel.verdict.as_ref(),
            trusted: channel.trusted,
        })
        .collect();
    let mut sections = Vec::new();
    if report.channels.len() > 1 {
        let blocks = vec![Block::Table(shared::overview(&contents, axis))];
        sections.push(Section { heading: "All channels".to_owned(), blocks });
    }
    let count = shared::points(passages.len());
    for (index, channel) in report.channels.iter().enumerate() {
        sections.push(section(channel, passages.get(index).filter(|_| index < DRAWN), report, count));
    }
    let notes: Vec<_> = report.notes.iter().chain(report.channels.iter().flat_map(|c| &c.notes)).collect();
    sections.push(shared::quality(&report.input, &notes));
    let output =
        report.outputs.first().map_or_else(String::new, |output| format!("-o {}", shared::quoted(&output.path)));
    sections.push(shared::settings("condition", Group::CONDITION, &report.input.path, &report.settings, &output));
    Page {
        title: format!("{} conditioned", report.input.path),
        asked: shared::asked(&report.input, &report.chain),
        answers: contents.iter().map(|content| shared::answer(content, axis)).collect(),
        sections,
        caution: report.caution.to_owned(),
    }
}

const fn why(how: How) -> &'static str {
    match how {
        How::Asked => "as asked",
        How::Asserted => "as asserted",
        How::Verdict => "by the verdict",
        How::Default => "by default, not by a finding about this record",
    }
}

fn section(channel: &ChannelReport, passage: Option<&Passage>, report: &Report, count: usize) -> Section {
    let axis = &report.input.axis;
    let mut blocks = Vec::new();
    if let Some(verdict) = &channel.verdict {
        blocks.push(Block::Text(verdict.sentence.clone()));
    }
    blocks.push(Block::Text(format!(
        "Assumed past the ends: {} ({} seat, {}), {}. Baseline: {}.",
        channel.extension.kind,
        channel.extension.seat,
        channel.extension.transform,
        why(channel.extension.how),
        channel.baseline.kind
    )));
    match passage {
        Some(passage) => {
            if let Some(picture) = &passage.picture {
                blocks.extend(shared::ends(picture, axis, count));
            }
            if !channel.candidates.is_empty() {
                blocks.push(Block::Table(candidates(&channel.candidates, &channel.unit.to_string())));
            }
            blocks.push(Block::Heading("Before and after".to_owned()));
            blocks.push(Block::Figures(passed(channel, passage, report, count)));
            if let (Some(stack), Some(integral)) = (&passage.integral, &channel.integral) {
                blocks.push(Block::Heading("The integral and its uncertainty".to_owned()));
                blocks.push(Block::Figures(stacked(channel, passage, stack, report, count)));
                blocks.push(Block::Table(constants(integral, &channel.unit.to_string())));
            }
            if let Some(found) = &passage.spectra {
                blocks.push(Block::Heading("Spectrum, with the gain as applied".to_owned()));
                blocks.push(Block::Figures(spectra(channel, found, count)));
            }
        }
        None => blocks.push(Block::Text(shared::too_many())),
    }
    blocks.push(Block::Table(levels(channel)));
    Section { heading: channel.name.clone(), blocks }
}

/// The candidates at the edges.
fn candidates(edges: &[Edge], unit: &str) -> Table {
    let head =
        ["extension".to_owned(), format!("edge error [{unit}]"), "% of s.d.".to_owned(), format!("bound [{unit}]")];
    let head = head.into_iter().chain(["adequacy", "trusted samples"].map(str::to_owned)).collect();
    let rows = edges.iter().map(|edge| {
        vec![
            Cell::text(edge.name.clone()),
            Cell::Number(Some(edge.predicted_error), 3),
            Cell::Number(Some(100.0 * edge.relative_error), 3),
            Cell::Number(Some(edge.bound), 3),
            Cell::text(match edge.adequacy {
                Adequacy::Within => "within",
                Adequacy::Borderline => "borderline",
                Adequacy::Outside => "outside",
            }),
            Cell::text(edge.trusted.map_or("\u{2013}".to_owned(), |span| format!("{} to {}", span.first, span.last))),
        ]
    });
    Table { caption: "What each extension would cost".to_owned(), head, rows: rows.collect() }
}

/// Before, after, removed.
fn passed(channel: &ChannelReport, passage: &Passage, report: &Report, count: usize) -> FigureSet {
    let along = shared::along(&report.input.axis);
    let thin = |points: &[[f64; 2]]| {
        let (places, values): (Vec<f64>, Vec<f64>) = points.iter().map(|p| (p[0], p[1])).unzip();
        thinned_along(&places, &values, count)
    };
    let line = |name: &str, style: usize, points: &[[f64; 2]]| Line {
        name: name.to_owned(),
        style,
        option: None,
        points: thin(points),
    };
    let figure = |what: &str, unit: String, lines: Vec<Line>| Figure {
        title: format!("{}: {what}", channel.name),
        description: format!("Line chart of channel {}: {what}.", channel.name),
        x: along.clone(),
        y: Quantity::linear(escape(&channel.name), unit),
        lines,
        bands: Vec::new(),
        spans: Vec::new(),
    };
    let (before, after) = (channel.unit_in.to_string(), channel.unit.to_string());
    let figures = match &passage.removed {
        Some(removed) => vec![
            figure(
                "before and after",
                after.clone(),
                vec![line("before", 8, &passage.before), line("after", 4, &passage.after)],
            ),
            figure("removed", after, vec![line("removed", 6, removed)]),
        ],
        None => vec![
            figure("before", before, vec![line("before", 8, &passage.before)]),
            figure("after", after, vec![line("after", 4, &passage.after)]),
        ],
    };
    FigureSet { choice: None, figures }
}

/// The record as corrected, and the result under it with the band that the record's noise leaves.
fn stacked(channel: &ChannelReport, passage: &Passage, stack: &Stack, report: &Report, count: usize) -> FigureSet {
    let thin = |points: &[[f64; 2]]| {
        let (places, values): (Vec<f64>, Vec<f64>) = points.iter().map(|p| (p[0], p[1])).unzip();
        thinned_along(&places, &values, count)
    };
    let every = stack.band.len().div_ceil((count / 2).max(1)).max(1);
    let band = stack.band.iter().step_by(every).chain(stack.band.last()).copied().collect();
    let figure = |what: &str, unit: String, line: Line, bands: Vec<Band>| Figure {
        title: format!("{}: {what}", channel.name),
        description: format!("Line chart of channel {}: {what}.", channel.name),
        x: shared::along(&report.input.axis),
        y: Quantity::linear(escape(&channel.name), unit),
        lines: vec![line],
        bands,
        spans: Vec::new(),
    };
    let line =
        |name: &str, style: usize, points: Vec<[f64; 2]>| Line { name: name.to_owned(), style, option: None, points };
    let corrected = line("less offset and drift", 8, thin(&stack.corrected));
    let result = line("result", 4, thin(&passage.after));
    let bands = vec![Band { name: "± 2 standard deviations, from noise alone".to_owned(), style: 4, points: band }];
    FigureSet {
        choice: None,
        figures: vec![
            figure("the record that is integrated", channel.unit_in.to_string(), corrected, Vec::new()),
            figure("the result", channel.unit.to_string(), result, bands),
        ],
    }
}

/// The constants that the end conditions asked for, and what is uncertain.
fn constants(integral: &IntegralReport, unit: &str) -> Table {
    let amount = |name: &str, amount: &Amount| {
        vec![Cell::text(name), Cell::Number(Some(amount.value), 5), Cell::text(amount.unit.to_string())]
    };
    let plain =
        |name: &str, value: f64, unit: &str| vec![Cell::text(name), Cell::Number(Some(value), 4), Cell::text(unit)];
    let mut rows = vec![amount("first integral at the start", &integral.initial_first)];
    rows.extend(integral.initial_second.as_ref().map(|found| amount("second integral at the start", found)));
    rows.push(amount("offset taken off", &integral.offset));
    rows.push(amount("drift taken off", &integral.drift));
    rows.push(amount("first integral at the end", &integral.final_first));
    rows.extend(integral.final_second.as_ref().map(|found| amount("second integral at the end", found)));
    rows.push(amount("noise a sample", &integral.noise));
    rows.push(plain("largest standard deviation of the result", integral.sigma.largest, unit));
    rows.push(plain("largest difference on integrating again", integral.reintegration_difference, unit));
    if let Some(corner) = &integral.corner {
        rows.push(plain("high-pass that leaves a standard deviation of", corner.sigma, unit));
        rows.push(plain("its corner", corner.frequency, corner.unit));
    }
    Table {
        caption: format!(
            "Integrated {} under {}",
            if integral.times == 1 { "once" } else { "twice" },
            integral.conditions
        ),
        head: ["what", "value", "unit"].map(str::to_owned).into(),
        rows,
    }
}

/// Densities before and after, and the gain.
fn spectra(channel: &ChannelReport, found: &Spectra, count: usize) -> FigureSet {
    let line = |name: &str, style: usize, points: &[[f64; 2]]| {
        let (places, values): (Vec<f64>, Vec<f64>) = points.iter().map(|p| (p[0], p[1])).unzip();
        Line { name: name.to_owned(), style, option: None, points: thinned_along(&places, &values, count) }
    };
    let figure = |what: &str, y: Quantity, lines: Vec<Line>| Figure {
        title: format!("{}: {what}", channel.name),
        description: format!("Line chart of channel {}: {what}, by frequency.", channel.name),
        x: Quantity::logarithmic("frequency", found.frequency_unit),
        y,
        lines,
        bands: Vec::new(),
        spans: Vec::new(),
    };
    let density = |unit: &str| Quantity::logarithmic("density", unit);
    let [before, after] = &found.units;
    let (one, two) = (line("before", 8, &found.before), line("after", 4, &found.after));
    let mut figures = if before == after {
        vec![figure("density before and after", density(before), vec![one, two])]
    } else {
        vec![figure("density before", density(before), vec![one]), figure("density after", density(after), vec![two])]
    };
    figures.push(figure("gain as applied", Quantity::linear("gain", ""), vec![line("gain", 6, &found.gain)]));
    FigureSet { choice: None, figures }
}

/// Levels before and after.
fn levels(channel: &ChannelReport) -> Table {
    let unit = |after: bool| if after { channel.unit.to_string() } else { channel.unit_in.to_string() };
    let row = |name: &str, level: Option<&crate::audit::level::Level>, after: bool| {
        let of = |get: fn(&crate::audit::level::Level) -> Option<f64>| Cell::Number(level.and_then(get), 4);
        vec![
            Cell::text(name),
            of(|l| Some(l.mean)),
            of(|l| Some(l.rms)),
            of(|l| Some(l.peak)),
            of(|l| l.crest_factor),
            of(|l| l.kurtosis),
            Cell::text(unit(after)),
        ]
    };
    Table {
        caption: "Levels; the peak is counted from the mean".to_owned(),
        head: ["", "mean", "RMS", "peak", "crest factor", "kurtosis", "unit"].map(str::to_owned).into(),
        rows: vec![
            row("before", channel.level.before.as_ref(), false),
            row("after", channel.level.after.as_ref(), true),
        ],
    }
}
