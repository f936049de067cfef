//! The main job: read, regularise, condition every channel, write the record back, and report.

use std::io::Write;
use std::path::Path;

use crate::basis::Planner;
use crate::error::{Error, Finding, Result};
use crate::job::edges;
use crate::job::intake;
use crate::job::origin::{SourceRows, origin_of};
use crate::job::preparation::{self, prepare};
use crate::job::running::{self, Running};
use crate::job::target::Target;
use crate::job::work::{self, Worked};
use crate::operator::Chain;
use crate::read::Input;
use crate::record::{Axis, Channel, ColumnRole, Format, Layout, RawRecord};
use crate::regularise::RowMap;
use crate::report::{self, InputReport, OutputReport, Plan, PlannedChannel, Report, SCHEMA, Tool};
use crate::settings::Settings;
use crate::write::{self, Content, Digits, WaveEncoding};

/// Resolves what would be done.
///
/// # Errors
/// Whatever stops reading or resolving.
pub fn plan(input: Input, settings: &Settings) -> Result<Plan> {
    let intake = intake::take(input, settings)?;
    let record = &intake.record;
    let axis = record.axis();
    let (chain, remarks) = Chain::resolve(&settings.requests, &settings.shape, axis, record.len())?;
    preparation::check(&chain, settings)?;
    let planner = Planner::new();
    let channels = record.channels().enumerate().map(|(index, channel)| {
        let prepared = prepare(channel, record.missing(index), &chain, settings, &planner)?;
        let channel = Channel { samples: &prepared.samples, ..channel };
        let (chosen, judgement) = work::choose(channel, &prepared.chain, settings, &planner)?;
        let (extension, baseline) = work::stage_reports(&chosen, &prepared.chain, settings);
        let unit = channel.unit.turned(chain.turns(), axis.unit()).0;
        let edge = work::edge_of(&chosen, judgement.as_ref());
        let verdict = work::verdict_report(channel, &unit, settings, judgement.as_ref(), edge);
        Ok(PlannedChannel {
            name: channel.name.to_owned(),
            unit,
            extension,
            baseline,
            despike: prepared.despiked,
            smoothing: prepared.smoothing,
            verdict: verdict.map(|verdict| verdict.sentence),
            notes: prepared.notes,
        })
    });
    Ok(Plan {
        channels: channels.collect::<Result<_>>()?,
        input: InputReport::new(&intake.outline.source, axis),
        notes: record.findings().iter().cloned().chain(remarks).collect(),
        chain: chain.describe(axis),
        gains: chain.check_points(axis),
    })
}

/// Conditions a record and writes it, with its sidecar.
///
/// # Errors
/// Whatever stops it; nothing is then visible of the outputs.
pub fn condition(input: Input, target: Target<'_>, settings: &Settings) -> Result<Report> {
    let encoding = encoding_of(settings)?;
    let input_path = intake::path_of(&input);
    let named = target.path().map(Path::to_owned);
    let mut outputs = target.open(input_path.as_deref())?;

    let intake = intake::take(input, settings)?;
    let format = format_of(settings, named.as_deref(), intake.outline.source.format);
    let (chain, remarks) =
        Chain::resolve(&settings.requests, &settings.shape, intake.record.axis(), intake.record.len())?;
    intake::refuse_notes(settings, &remarks)?;
    preparation::check(&chain, settings)?;
    let mut notes: Vec<_> = intake.record.findings().iter().cloned().chain(remarks).collect();
    let input_report = InputReport::new(&intake.outline.source, intake.record.axis());
    let chain_report = chain.describe(intake.record.axis());
    refuse_columns(settings, format, intake.record.axis())?;
    let Worked { record, channels } = work::run(intake.record, &chain, settings)?;

    let rows = match chain.treatments().resampling {
        None => intake.rows,
        Some(grid) => {
            notes.extend(untouched(&intake.outline));
            RowMap::Regridded { count: grid.count }
        }
    };
    let (record, rows) = edges::trimmed(record, rows, &channels, settings)?;
    let rows = SourceRows::of(&rows);
    let origin = origin_of(&intake.outline, &record, format, rows.as_ref())?;
    let marks = edges::marks(&channels, record.len(), settings);
    let running = running::columns(&record, settings);
    let extra: Vec<_> = marks.iter().map(edges::Mark::column).chain(running.iter().map(Running::column)).collect();
    let shown = edges::shown(&channels, settings);
    let content = Content {
        record: &record,
        origin: origin.as_ref(),
        extra: &extra,
        shown: shown.as_deref(),
        digits: settings.decimals.map_or(Digits::Shortest, Digits::Fixed),
        encoding,
    };
    let (written, remarks) = write::save(write::writer(format), &content, outputs.record)?;
    notes.extend(remarks);
    let requirement_met = settings.require.is_none_or(|required| {
        channels.iter().all(|c| c.verdict.as_ref().and_then(|v| v.adequacy).is_some_and(|found| found <= required))
    });
    let report = Report {
        schema: SCHEMA,
        tool: Tool::THIS,
        command: "condition",
        settings: settings.to_map(),
        input: input_report,
        notes,
        chain: chain_report,
        channels,
        requirement_met,
        outputs: vec![OutputReport { path: written.path, sha256: written.sha256 }],
        caution: report::caution(&chain),
    };
    let json = report::to_json(&report)?;
    for mut pending in [outputs.sidecar.take(), outputs.json.take()].into_iter().flatten() {
        pending.write_all(json.as_bytes()).map_err(Error::from)?;
        pending.finish()?;
    }
    Ok(report)
}

/// A remark about columns of the source that have no place on another grid.
fn untouched(outline: &RawRecord) -> Option<Finding> {
    let Layout::Table(table) = &outline.layout else { return None };
    let count = table.columns.iter().filter(|role| **role == ColumnRole::Untouched).count();
    let text = format!("{count} columns that were not conditioned are left out: they have no place on the new grid");
    (count > 0).then(|| Finding::new("columns_left_out", text))
}

/// Running RMS needs a time axis, and a form with room for columns.
fn refuse_columns(settings: &Settings, format: Format, axis: &Axis) -> Result<()> {
    if settings.running_rms.is_none() {
        return Ok(());
    }
    if format == Format::Wav {
        return Err(Error::usage("--running-rms: a WAV file has no room for further columns").remedy("write CSV with --format csv"));
    }
    if !axis.is_time() {
        return Err(Error::usage(format!("--running-rms: the record's axis is a length in {}", axis.unit()))
            .remedy("leave it out"));
    }
    Ok(())
}

fn encoding_of(settings: &Settings) -> Result<WaveEncoding> {
    let Some(name) = &settings.encoding else { return Ok(WaveEncoding::Float32) };
    write::WAVE_ENCODINGS.iter().find(|(known, _)| known == name).map(|(_, encoding)| *encoding).ok_or_else(|| {
        let known: Vec<&str> = write::WAVE_ENCODINGS.iter().map(|(name, _)| *name).collect();
        Error::usage(format!("--encoding: not a sample type: {name:?}"))
            .remedy(format!("use one of {}", known.join(", ")))
    })
}

/// `--format`, else what the output's name says, else the input's own.
fn format_of(settings: &Settings, output: Option<&Path>, input: Format) -> Format {
    settings.format.or_else(|| write::writer_by_name(output?).ok().map(|writer| writer.format)).unwrap_or(input)
}
