//! The page of an archive: what it took, what is lost and where, against the bound that was asked for.

use crate::codec::{Limit, Mode};
use crate::report::page::restored::{Close, Restoration};
use crate::report::page::shared::{self, DRAWN};
use crate::report::page::{Answer, Band, Block, Cell, Figure, FigureSet, Line, Page, Quantity, Section, Table};
use crate::report::text::figure;
use crate::report::{ArchiveReport, ArchivedReport};
use crate::settings;
use crate::unit::Unit;

/// The page of an archive. Restorations belong to the channels in their order.
pub fn archive_page(report: &ArchiveReport, restorations: &[Restoration]) -> Page {
    let mut sections = vec![Section {
        heading: "The archive".to_owned(),
        blocks: [Some(whole(report)), (report.channels.len() > 1).then(|| overview(report))]
            .into_iter()
            .flatten()
            .map(Block::Table)
            .collect(),
    }];
    for (index, channel) in report.channels.iter().enumerate() {
        sections.push(section(channel, restorations.get(index).filter(|_| index < DRAWN), report));
    }
    sections.push(quality(report));
    let output =
        report.outputs.first().map_or_else(String::new, |output| format!("-o {}", shared::quoted(&output.path)));
    sections.push(shared::settings("compress", settings::COMPRESS, &report.path, &report.settings, &output));
    Page {
        title: format!("{} archived", report.path),
        asked: format!("{}: {} rows. Asked for: {}.", report.path, report.rows, report.asked),
        answers: std::iter::once(total(report))
            .chain(report.channels.iter().map(|channel| answer(channel, report)))
            .collect(),
        sections,
        caution: report.caution.to_owned(),
    }
}

/// What the whole archive took.
fn total(report: &ArchiveReport) -> Answer {
    Answer {
        name: String::new(),
        sentence: format!("{} bytes of {}.", report.bytes, report.source_bytes),
        figure: format!(
            "{} bits a sample: {} times smaller than the file, {} times smaller than 64-bit numbers.",
            figure(report.bits_per_sample, 4),
            figure(report.ratio_to_source, 3),
            figure(report.ratio_to_doubles, 3)
        ),
    }
}

/// One channel's coding, and its largest error against the bound.
fn answer(channel: &ArchivedReport, report: &ArchiveReport) -> Answer {
    let (unit, fidelity) = (&channel.unit, &channel.fidelity);
    let coded = channel.mode.map_or("holds no value", Mode::name);
    let sentence = format!(
        "{coded}, {} bits a sample, {} times smaller than 64-bit numbers.",
        figure(channel.bits_per_sample, 4),
        figure(channel.ratio_to_doubles, 3)
    );
    let largest = match place(channel, report) {
        Some(place) => format!("Largest error {} {unit} at {place}", figure(fidelity.max_error, 3)),
        None => "Every sample comes back as it was".to_owned(),
    };
    let against = |found: f64, bound: f64| {
        let keeps = if found <= bound { "within" } else { "beyond" };
        format!("{keeps} the bound of {} {unit}", figure(bound, 4))
    };
    let figure = match (channel.error, report.bounds_rms) {
        (Some(bound), true) => {
            format!("RMS error {} {unit}, {}. {largest}.", figure(fidelity.rmse, 3), against(fidelity.rmse, bound))
        }
        (Some(bound), false) => format!("{largest}, {}.", against(fidelity.max_error, bound)),
        (None, _) => format!("{largest}; no bound in numbers was asked for."),
    };
    let figure = if fidelity.max_error_row.is_none() { format!("{largest}.") } else { figure };
    Answer { name: channel.name.clone(), sentence, figure }
}

/// Where the largest error is: `12.5 mm (row 25)`; `None` where nothing is off.
fn place(channel: &ArchivedReport, report: &ArchiveReport) -> Option<String> {
    let row = channel.fidelity.max_error_row?;
    Some(match (channel.max_error_at, &report.axis_unit) {
        (Some(at), Some(unit)) => format!("{} {unit} (row {row})", figure(at, 8)),
        _ => format!("row {row}"),
    })
}

/// Whole archive.
fn whole(report: &ArchiveReport) -> Table {
    let count = |value: f64| Cell::Number(Some(value), 15);
    let rows = vec![
        vec![Cell::text("file"), count(report.source_bytes as f64), Cell::text("bytes")],
        vec![Cell::text("archive"), count(report.bytes as f64), Cell::text("bytes")],
        vec![
            Cell::text("samples of all channels"),
            count((report.rows * report.channels.len()) as f64),
            Cell::text(""),
        ],
        vec![Cell::text("size"), Cell::Number(Some(report.bits_per_sample), 4), Cell::text("bits a sample")],
        vec![Cell::text("smaller than the file"), Cell::Number(Some(report.ratio_to_source), 4), Cell::text("times")],
        vec![
            Cell::text("smaller than 64-bit numbers"),
            Cell::Number(Some(report.ratio_to_doubles), 4),
            Cell::text("times"),
        ],
    ];
    Table { caption: "Everything in the archive counts: axis, names, checksums".to_owned(), head: facts(), rows }
}

fn facts() -> Vec<String> {
    ["what", "value", "unit"].map(str::to_owned).into()
}

/// All channels side by side.
fn overview(report: &ArchiveReport) -> Table {
    let head = ["channel", "unit", "coded as", "bound", "RMS error", "largest error", "bits a sample", "PSNR [dB]"];
    let rows = report.channels.iter().map(|channel| {
        vec![
            Cell::text(channel.name.clone()),
            Cell::text(channel.unit.to_string()),
            Cell::text(channel.mode.map_or("\u{2013}", Mode::name)),
            Cell::Number(channel.error, 4),
            Cell::Number(Some(channel.fidelity.rmse), 4),
            Cell::Number(Some(channel.fidelity.max_error), 4),
            Cell::Number(Some(channel.bits_per_sample), 4),
            Cell::Number(channel.fidelity.psnr_db, 4),
        ]
    });
    Table {
        caption: "What each channel took and lost".to_owned(),
        head: head.map(str::to_owned).into(),
        rows: rows.collect(),
    }
}

fn section(channel: &ArchivedReport, restoration: Option<&Restoration>, report: &ArchiveReport) -> Section {
    let mut blocks = Vec::new();
    match restoration {
        Some(found) => blocks.push(Block::Figures(figures(channel, found, report))),
        None => blocks.push(Block::Text(shared::too_many())),
    }
    if channel.fidelity.max_error_row.is_none() {
        blocks.push(Block::Text("Nothing is lost, so there is no error to draw.".to_owned()));
    } else if report.bounds_rms {
        let text = "The bound holds for the root of the mean squared error: single errors may be larger.";
        blocks.push(Block::Text(text.to_owned()));
    }
    blocks.push(Block::Table(lost(channel, report)));
    blocks.push(Block::Table(taken(channel, report)));
    Section { heading: channel.name.clone(), blocks }
}

/// What comes back, and how far it is off.
fn lost(channel: &ArchivedReport, report: &ArchiveReport) -> Table {
    let (unit, fidelity) = (channel.unit.to_string(), &channel.fidelity);
    let row = |name: &str, value: Option<f64>, digits: usize, unit: &str| {
        vec![Cell::text(name), Cell::Number(value, digits), Cell::text(unit)]
    };
    let bound = if report.bounds_rms { "bound on the RMS error" } else { "bound on every error" };
    let axis = report.axis_unit.as_ref().map(ToString::to_string).unwrap_or_default();
    let mut rows = vec![
        row(bound, channel.error, 6, &unit),
        row("largest error", Some(fidelity.max_error), 6, &unit),
        row("at row, counted from 0", fidelity.max_error_row.map(|row| row as f64), 15, ""),
        row("at", channel.max_error_at, 8, &axis),
        row("RMS error", Some(fidelity.rmse), 6, &unit),
        row("PSNR: range over RMS error", fidelity.psnr_db, 4, "dB"),
        row("retained energy about the mean", fidelity.retained_energy, 7, ""),
        row("correlation of neighbouring errors", fidelity.error_correlation, 3, ""),
    ];
    if channel.parseval_rmse.is_some() {
        rows.push(row("RMS error by Parseval's theorem", channel.parseval_rmse, 6, &unit));
    }
    Table { caption: "What is lost, measured on the numbers of the restored file".to_owned(), head: facts(), rows }
}

/// How it is coded, and what that takes.
fn taken(channel: &ArchivedReport, report: &ArchiveReport) -> Table {
    let unit = channel.unit.to_string();
    let row = |name: &str, value: Option<f64>, digits: usize, unit: &str| {
        vec![Cell::text(name), Cell::Number(value, digits), Cell::text(unit)]
    };
    let words = |name: &str, text: &str| vec![Cell::text(name), Cell::text(text), Cell::text("")];
    let mut rows = vec![
        words("coded as", channel.mode.map_or("\u{2013}", Mode::name)),
        words("next best", channel.runner_up.map_or("\u{2013}", Mode::name)),
        row("which in the largest block would take", channel.runner_up_bytes.map(|b| b as f64), 15, "bytes"),
        row("blocks", Some(channel.blocks as f64), 15, ""),
        row("size", Some(channel.bytes as f64), 15, "bytes"),
        row("size of a sample", Some(channel.bits_per_sample), 4, "bits a sample"),
        row("smaller than 64-bit numbers", Some(channel.ratio_to_doubles), 4, "times"),
        row("noise, standard deviation", channel.noise, 4, &unit),
        row("keeping that noise takes about", channel.noise_bits, 3, "bits a sample"),
    ];
    if channel.kept.is_some() {
        rows.push(row("cosine coefficients kept", channel.kept.map(|kept| kept as f64), 15, ""));
        let along = report.axis_unit.as_ref().is_some_and(Unit::is_length);
        rows.push(row("highest frequency kept", channel.cut_off, 5, if along { "1/m" } else { "Hz" }));
    }
    Table { caption: "How it is coded, and what that takes".to_owned(), head: facts(), rows }
}

fn figures(channel: &ArchivedReport, found: &Restoration, report: &ArchiveReport) -> FigureSet {
    let unit = channel.unit.to_string();
    let drawn = |what: &str, description: String, lines: Vec<Line>, bands: Vec<Band>| Figure {
        title: format!("{}: {what}", channel.name),
        description,
        x: found.across.clone(),
        y: Quantity::linear(channel.name.clone(), unit.clone()),
        lines,
        bands,
        spans: Vec::new(),
    };
    let before_and_after = format!("Line chart of channel {}, as recorded and as restored over it.", channel.name);
    let mut figures = vec![drawn(
        "recorded, and restored over it",
        before_and_after,
        vec![line("recorded", RECORDED, &found.before), line("restored", RESTORED, &found.after)],
        Vec::new(),
    )];
    if let Some(worst) = &found.worst {
        let bounds = bounds(found);
        let with = if bounds.is_empty() { "" } else { ", with the bound as two lines" };
        let mut error = drawn(
            "restored less recorded",
            format!("Line chart of the error of channel {}{with}.", channel.name),
            std::iter::once(line("error", RECORDED, &found.error)).chain(bounds).collect(),
            Vec::new(),
        );
        error.y.name = format!("{} error", channel.name);
        figures.push(error);
        let place = place(channel, report).unwrap_or_default();
        figures.push(drawn(
            &format!("around its largest error, at {place}"),
            format!("Line chart of channel {} around its largest error, every row drawn.", channel.name),
            vec![line("recorded", RECORDED, &worst.before), line("restored", RESTORED, &worst.after)],
            corridor(found.limit, worst),
        ));
    }
    FigureSet { choice: None, figures }
}

/// Style of what was recorded, and of errors: solid.
const RECORDED: usize = 8;
/// Style of what comes back.
const RESTORED: usize = 4;
/// Style of bounds.
const BOUND: usize = 6;

fn line(name: &str, style: usize, points: &[[f64; 2]]) -> Line {
    Line { name: name.to_owned(), style, option: None, points: points.to_vec() }
}

/// The bound on both sides of no error.
fn bounds(found: &Restoration) -> Vec<Line> {
    let (bound, name) = match found.limit {
        Limit::Max(bound) => (bound, "bound"),
        Limit::Rms(bound) => (bound, "bound on the RMS"),
        Limit::Lossless | Limit::Keep(_) => return Vec::new(),
    };
    let (Some(first), Some(last)) = (found.error.first(), found.error.last()) else { return Vec::new() };
    let at = |side: &str, value: f64| line(&format!("{name}, {side}"), BOUND, &[[first[0], value], [last[0], value]]);
    vec![at("upper", bound), at("lower", -bound)]
}

/// Where restored samples may lie.
fn corridor(limit: Limit, worst: &Close) -> Vec<Band> {
    let Limit::Max(bound) = limit else { return Vec::new() };
    // Rows without a value have no corridor, and an outline has no breaks.
    let points = worst.before.iter().filter(|point| !point[1].is_nan());
    let points = points.map(|&[place, value]| [place, value - bound, value + bound]).collect();
    vec![Band { name: "recorded ± bound".to_owned(), style: BOUND, points }]
}

/// What was read, and every remark.
fn quality(report: &ArchiveReport) -> Section {
    let row = |name: &str, value: String| vec![Cell::text(name), Cell::text(value)];
    let mut rows = vec![
        row("file", report.path.clone()),
        row("bytes", report.source_bytes.to_string()),
        row("SHA-256", report.sha256.clone()),
        row("rows", report.rows.to_string()),
        row("axis", report.axis.clone().unwrap_or_else(|| "none: rows are counted from 0".to_owned())),
    ];
    for output in &report.outputs {
        rows.push(row("archive", output.path.clone()));
        rows.push(row("SHA-256 of the archive", output.sha256.clone()));
    }
    let table = Table { caption: "The record as read".to_owned(), head: vec!["what".into(), "value".into()], rows };
    let notes: Vec<_> = report.notes.iter().collect();
    Section { heading: "Input quality".to_owned(), blocks: vec![Block::Table(table), shared::remarks(&notes)] }
}
