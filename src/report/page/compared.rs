//! The page of a comparison: every extension side by side.

use serde_json::Value;

use crate::report::page::content::Content;
use crate::report::page::shared::{self, DRAWN};
use crate::report::page::{Block, Cell, Page, Section, Table};
use crate::report::text::figure;
use crate::report::{AxisReport, ChannelComparison, Comparison, Picture, Row};
use crate::settings::Group;
use crate::verdict::Adequacy;

/// The page of a comparison. Pictures belong to the channels they name.
pub fn comparison_page(report: &Comparison, pictures: &[Picture]) -> Page {
    let axis = &report.input.axis;
    let contents: Vec<Content<'_>> = report
        .channels
        .iter()
        .map(|channel| Content {
            name: &channel.name,
            unit: channel.unit.to_string(),
            used: &channel.takes,
            why: "what condition would take",
            used_sentence: format!("condition would take {} ends.", channel.takes),
            verdict: channel.verdict.as_ref(),
            trusted: channel.trusted,
        })
        .collect();
    let count = shared::points(pictures.len());
    let mut sections = Vec::new();
    if report.channels.len() > 1 {
        sections.push(Section {
            heading: "All channels".to_owned(),
            blocks: vec![Block::Table(shared::overview(&contents, axis))],
        });
    }
    for (index, channel) in report.channels.iter().enumerate() {
        let picture =
            pictures.iter().take(DRAWN).find(|picture| picture.name == channel.name && !picture.curves.is_empty());
        sections.push(section(channel, picture, axis, count, index));
    }
    let notes: Vec<_> = report.notes.iter().collect();
    sections.push(shared::quality(&report.input, &notes));
    sections.push(shared::settings("compare", Group::COMPARE, &report.input.path, &report.settings, ""));
    Page {
        title: format!("Extensions of {} compared", report.input.path),
        asked: shared::asked(&report.input, &report.chain),
        answers: contents.iter().map(|content| shared::answer(content, axis)).collect(),
        sections,
        caution: report.caution.to_owned(),
    }
}

fn section(
    channel: &ChannelComparison,
    picture: Option<&Picture>,
    axis: &AxisReport,
    count: usize,
    index: usize,
) -> Section {
    let mut blocks = Vec::new();
    if let Some(verdict) = &channel.verdict {
        blocks.push(Block::Text(verdict.sentence.clone()));
    }
    match picture {
        Some(picture) => blocks.extend(shared::ends(picture, axis, count)),
        None if index >= DRAWN => {
            blocks.push(Block::Text(shared::too_many()));
        }
        None => blocks.push(Block::Text("Nothing was judged here, so there is no figure.".to_owned())),
    }
    blocks.push(Block::Table(candidates(&channel.candidates, &channel.unit.to_string(), axis)));
    if let Some(ends) = &channel.edge {
        let row = |name: &str, end: &crate::baseline::EndEstimate| {
            vec![
                Cell::text(name),
                Cell::Number(Some(end.value), 5),
                Cell::Number(Some(end.value_error), 2),
                Cell::Number(Some(end.slope), 5),
                Cell::Number(Some(end.slope_error), 2),
            ]
        };
        let head = ["end", "value", "standard error", "slope a step", "standard error"].map(str::to_owned).into();
        blocks.push(Block::Table(Table {
            caption: format!("The record at its ends, in {}; noise {}", channel.unit_in, figure(ends.noise, 3)),
            head,
            rows: vec![row("left", &ends.left), row("right", &ends.right)],
        }));
    }
    Section { heading: channel.name.clone(), blocks }
}

/// The table of candidates; references in brackets.
pub fn candidates(rows: &[Row], unit: &str, axis: &AxisReport) -> Table {
    let head =
        ["extension".to_owned(), format!("edge error [{unit}]"), "% of s.d.".to_owned(), format!("bound [{unit}]")]
            .into_iter()
            .chain(["adequacy".to_owned(), format!("trusted [{}]", axis.unit)])
            .chain(["value jump", "slope jump", "leakage [dB]", "excess [dB]", "decay"].map(str::to_owned))
            .collect();
    let rows = rows.iter().map(|row| {
        let metric = |key: &str| Cell::Number(row.metrics.get(key).and_then(Value::as_f64), 3);
        vec![
            Cell::text(if row.reference { format!("({})", row.name) } else { row.name.to_owned() }),
            Cell::Number(row.predicted_error, 3),
            Cell::Number(row.relative_error.map(|r| 100.0 * r), 3),
            Cell::Number(row.bound, 3),
            Cell::text(row.adequacy.map_or("\u{2013}", |found| match found {
                Adequacy::Within => "within",
                Adequacy::Borderline => "borderline",
                Adequacy::Outside => "outside",
            })),
            Cell::text(shared::span(row.trusted)),
            metric("value_jump"),
            metric("slope_jump"),
            metric("leakage_share_db"),
            metric("leakage_excess_db"),
            metric("decay_exponent"),
        ]
    });
    Table {
        caption: "Extensions side by side; those in brackets are for reference and never chosen".to_owned(),
        head,
        rows: rows.collect(),
    }
}
