//! The page of a conditioned record: what was assumed, what it costs, and what was done.

use crate::compare::How;
use crate::place::escape;
use crate::report::page::content::Content;
use crate::report::page::shared::{self, DRAWN};
use crate::report::page::{
    Block, Cell, Figure, FigureSet, Line, Page, Passage, Quantity, Section, Table, thinned_along,
};
use crate::report::{ChannelReport, Report};
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
    sections.push(shared::settings("condition", &report.input.path, &report.settings, &output));
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
        }
        None => blocks.push(Block::Text(format!(
            "Figures are drawn for the first {DRAWN} channels; choose others with --channel."
        ))),
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
            Cell::text(edge.name),
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
