//! The page of a batch: how it went, the worst channels, the failures and what they need, all edge errors at a glance.

use crate::fleet::overview::Overview;
use crate::fleet::ranking::{Ranked, WORST};
use crate::fleet::summary::Summary;
use crate::place::escape;
use crate::report::figure;
use crate::report::page::{
    Answer, Block, Cell, Figure, FigureSet, Line, Page, Quantity, Section, Table, command_line, options, quoted,
    thinned_along,
};
use crate::settings::CONDITION;

/// Points of a curve over all channels.
const POINTS: usize = 1000;
/// Letters of a name or a remark at most: a batch of hostile names must not make a page that no browser opens.
const LETTERS: usize = 160;

/// The page of a merged batch whose output folder was given as `into`.
pub fn overview_page(overview: &Overview, into: &str) -> Page {
    let summary = overview.summary();
    let mut sections = vec![numbers(&summary)];
    sections.extend(failures(&summary));
    sections.extend(redo(&summary));
    sections.extend(curves(overview));
    sections.extend(worst(&summary.worst, overview.ranking().of_tolerance().len()));
    sections.push(settings(&summary, into));
    Page {
        title: format!("Batch in {}", short(into)),
        asked: format!("{}: {}.", short(into), counted(summary.records, "record")),
        answers: vec![answer(&summary)],
        sections,
        caution: summary.caution.to_owned(),
    }
}

/// The sentence, and the figure that decides.
fn answer(summary: &Summary) -> Answer {
    let sentence = format!(
        "{}: {} done, {} failed, {} below the requirement, {} missing, {} doubled.",
        counted(summary.records, "record"),
        summary.done + summary.repeated,
        summary.failed,
        summary.below_requirement,
        summary.missing,
        summary.doubled,
    );
    let edges = summary.edge_error_percent_of_tolerance.zip(summary.worst.first()).map(|(edges, worst)| {
        format!(
            "Largest edge error: {} % of its tolerance ({} of {}); half of the channels stay below {} %.",
            figure(edges.worst, 3),
            short(&worst.channel),
            short(&worst.path),
            figure(edges.median, 3),
        )
    });
    let complete = summary.missing == 0 && summary.extra == 0;
    let open = if complete { "" } else { " The batch is incomplete: run it again, then merge." };
    Answer {
        name: String::new(),
        sentence: format!("{sentence}{open}"),
        figure: edges.unwrap_or_else(|| "No edge was judged.".to_owned()),
    }
}

/// Every count.
fn numbers(summary: &Summary) -> Section {
    let count = |name: &str, count: u64| vec![Cell::text(name), Cell::text(count.to_string())];
    let mut rows = vec![
        count("records", summary.records),
        count("done", summary.done),
        count("repeated names", summary.repeated),
        count("failed", summary.failed),
        count("below the requirement", summary.below_requirement),
        count("missing or not as told", summary.missing),
        count("doubled results", summary.doubled),
        count("results of no record", summary.extra),
    ];
    let listed = |counts: &std::collections::BTreeMap<String, u64>| {
        counts.iter().map(|(name, count)| format!("{name} {count}")).collect::<Vec<_>>().join(", ")
    };
    for (name, counts) in [("edges", &summary.adequacies), ("ends", &summary.extensions), ("remarks", &summary.notes)] {
        if !counts.is_empty() {
            rows.push(vec![Cell::text(name), Cell::text(listed(counts))]);
        }
    }
    if let Some(edges) = summary.edge_error_percent_of_tolerance {
        let told = format!(
            "median {} %, 95 of 100 below {} %, worst {} % of the tolerance",
            figure(edges.median, 3),
            figure(edges.high, 3),
            figure(edges.worst, 3)
        );
        rows.push(vec![Cell::text("edge error"), Cell::text(told)]);
    }
    let head = vec!["what".into(), "value".into()];
    let mut blocks = vec![Block::Table(Table {
        caption: "All records; edges and ends by channels, remarks by records".to_owned(),
        head,
        rows,
    })];
    if !summary.remarks.is_empty() {
        blocks.push(Block::List(summary.remarks.clone()));
    }
    Section { heading: "Counts".to_owned(), blocks }
}

fn failures(summary: &Summary) -> Option<Section> {
    let rows = summary.failures.iter().map(|group| {
        vec![
            Cell::text(group.kind.clone()),
            Cell::Number(Some(group.count as f64), 9),
            Cell::text(short(&group.path)),
            Cell::text(short(&group.place)),
            Cell::text(short(&group.text)),
            Cell::text(short(group.remedy.as_deref().unwrap_or("\u{2013}"))),
        ]
    });
    let head = ["kind", "records", "such as", "place", "what", "remedy"].map(str::to_owned);
    let table =
        Table { caption: "Failures by kind, each with an example".to_owned(), head: head.into(), rows: rows.collect() };
    let blocks = vec![
        Block::Table(table),
        Block::Text("Every failure stands in results/merged.csv with its own place and remedy.".to_owned()),
    ];
    (!summary.failures.is_empty()).then(|| Section { heading: "Failures".to_owned(), blocks })
}

fn redo(summary: &Summary) -> Option<Section> {
    let rows = summary.redo.iter().map(|(record, path, reason)| {
        vec![Cell::text(record.to_string()), Cell::text(short(path)), Cell::text(reason.replace('_', " "))]
    });
    let caption = if summary.missing > summary.redo.len() as u64 {
        format!("The first {} of {}; all of them stand in results/redo.jsonl", summary.redo.len(), summary.missing)
    } else {
        "Records without a whole result".to_owned()
    };
    let head = ["record", "name", "why"].map(str::to_owned);
    let table = Table { caption, head: head.into(), rows: rows.collect() };
    (!summary.redo.is_empty())
        .then(|| Section { heading: "To be done again".to_owned(), blocks: vec![Block::Table(table)] })
}

fn worst(ranked: &[Ranked], judged: usize) -> Option<Section> {
    let rows = ranked.iter().map(|channel| {
        let trusted = channel.trusted.map_or_else(
            || "\u{2013}".to_owned(),
            |[from, to]| format!("{} to {} {}", figure(from, 6), figure(to, 6), channel.axis_unit),
        );
        vec![
            Cell::text(short(&channel.path)),
            Cell::text(short(&channel.channel)),
            Cell::text(channel.extension.clone()),
            Cell::text(channel.unit.clone()),
            Cell::Number(Some(channel.edge_error), 3),
            Cell::Number(channel.percent_of_deviation, 3),
            Cell::Number(channel.bound, 3),
            Cell::Number(Some(channel.percent_of_tolerance), 3),
            Cell::text(channel.adequacy.clone().unwrap_or_else(|| "not judged".to_owned())),
            Cell::text(trusted),
        ]
    });
    let head =
        ["record", "channel", "ends", "unit", "edge error", "% of s.d.", "bound", "% of tol.", "adequacy", "trusted"];
    let caption = if judged > WORST {
        format!("The {WORST} channels of {judged} with the largest edge errors for their tolerance")
    } else {
        "Channels by edge error over tolerance, the worst first".to_owned()
    };
    let table = Table { caption, head: head.map(str::to_owned).into(), rows: rows.collect() };
    (!ranked.is_empty())
        .then(|| Section { heading: "The worst channels".to_owned(), blocks: vec![Block::Table(table)] })
}

/// All edge errors, sorted: how many channels are good, and how bad the others are.
fn curves(overview: &Overview) -> Option<Section> {
    let ranking = overview.ranking();
    let drawn = |values: Vec<f64>, of: &str, tolerance: bool| {
        // A silent channel has no error and no place on an axis by decades.
        let count = values.len();
        let shares = (1..=count).map(|rank| 100.0 * rank as f64 / count as f64);
        let (places, values): (Vec<f64>, Vec<f64>) = shares.zip(values).filter(|(_, value)| *value > 0.0).unzip();
        let points = thinned_along(&places, &values, POINTS);
        let (first, last) = (points.first()?[0], points.last()?[0]);
        let mut lines = vec![Line { name: "channels".to_owned(), style: 8, option: None, points }];
        if tolerance {
            let points = vec![[first, 100.0], [last, 100.0]];
            lines.push(Line { name: "tolerance".to_owned(), style: 4, option: None, points });
        }
        (first < last).then(|| Figure {
            title: format!("Edge error in % of its {of}"),
            description: format!(
                "Sorted edge errors of {count} channels in per cent of the {of}, by decades, over the share of channels \
                 that are no worse."
            ),
            x: Quantity::linear("channels no worse", "%"),
            y: Quantity::logarithmic("edge error", "%"),
            lines,
            bands: Vec::new(),
            spans: Vec::new(),
        })
    };
    let figures: Vec<Figure> = [
        drawn(ranking.of_deviation(), "output's standard deviation", false),
        drawn(ranking.of_tolerance(), "tolerance", true),
    ]
    .into_iter()
    .flatten()
    .collect();
    let blocks = vec![Block::Figures(FigureSet { choice: None, figures: figures.clone() })];
    (!figures.is_empty()).then(|| Section { heading: "All edge errors".to_owned(), blocks })
}

fn settings(summary: &Summary, into: &str) -> Section {
    let mut words = vec![format!("endgrain batch --files-from LIST --into {}", quoted(into))];
    words.extend(options(&summary.settings, CONDITION));
    let mut blocks = vec![Block::Code(command_line(&words))];
    blocks.push(Block::Text("LIST holds the names of the records, one a line.".to_owned()));
    if !summary.differing_settings.is_empty() {
        let keys: Vec<String> = summary.differing_settings.iter().map(|key| format!("--{key}")).collect();
        blocks.push(Block::Text(format!(
            "Records differ in {}: what each had stands in its line of results/merged.jsonl.",
            keys.join(", ")
        )));
    }
    Section { heading: "Settings of the batch".to_owned(), blocks }
}

/// `1 record`, `30 records`.
fn counted(count: u64, what: &str) -> String {
    format!("{count} {what}{}", if count == 1 { "" } else { "s" })
}

/// A text whose middle is left out where it is very long: names differ at their ends.
fn short(text: &str) -> String {
    let text = escape(text);
    let count = text.chars().count();
    if count <= LETTERS {
        return text;
    }
    let head: String = text.chars().take(LETTERS / 2).collect();
    let tail: String = text.chars().skip(count - LETTERS / 2).collect();
    format!("{head}\u{2026}{tail}")
}

#[cfg(test)]
mod tests {
    use serde_json::json;

    use super::*;
    use crate::report::page::{figures_json, html};

    /// Fifty thousand records of three channels, with names as hostile as they come.
    #[test]
    fn fifty_thousand_hostile_names_make_a_small_page() {
        let mut overview = Overview::default();
        let name = "<&\"\u{1b}".repeat(1000);
        for record in 0..50_000_u64 {
            let channel = |n: u64| {
                let error = 1e-6 * (1 + (record * 7919 + n) % 50_021) as f64;
                json!({"name": name, "unit": "g", "extension": {"kind": "odd", "how": "auto"},
                    "trusted": {"from": 0.5, "to": 9.5},
                    "verdict": {"predicted_error": error, "bound": 2.0 * error, "tolerance": 0.01, "output_deviation": 0.5,
                        "adequacy": "within"}})
            };
            overview.count(&json!({"record": record, "path": name, "status": "done", "settings": {"lowpass": ["3Hz"]},
                "channels": [channel(0), channel(1), channel(2)]}));
        }
        overview.records = 50_000;
        let page = overview_page(&overview, "out");
        let text = html(&page);
        assert!(text.len() < 2_000_000, "{} bytes", text.len());
        assert!(text.contains("50000 records: 50000 done, 0 failed, 0 below the requirement, 0 missing, 0 doubled."));
        assert!(!text.contains("<&\"") && text.contains("--lowpass 3Hz"));
        let json = figures_json(&overview.summary(), &page).expect("JSON");
        assert!(json.contains("\"below_requirement\": 0"), "{}", &json[..400]);
    }
}
