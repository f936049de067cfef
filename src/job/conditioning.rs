//! The main job: read, regularise, condition every channel, write the record back, and report.

use std::io::Write;
use std::path::Path;

use rayon::prelude::*;

use crate::audit::level::Level;
use crate::baseline::BaselineKind;
use crate::basis::Planner;
use crate::condition::{self, ExtensionChoice, Outcome};
use crate::ends::Ends;
use crate::error::{Error, Finding, Result};
use crate::job::intake;
use crate::job::target::Target;
use crate::operator::Chain;
use crate::read::Input;
use crate::record::{Channel, Format, Layout, Record};
use crate::regularise::RowMap;
use crate::report::{
    self, BaselineReport, CAUTION, ChannelReport, ExtensionReport, How, InOut, InputReport, OutputReport, Plan,
    ReachReport, Report, SCHEMA, Tool,
};
use crate::settings::Settings;
use crate::write::{self, Content, Digits, Origin, Rows, WaveEncoding};

/// A channel this long is worked on alone: several at once would hold several times its transform memory.
const ALONE_FROM: usize = 1 << 20;

/// The stage as resolved for one run.
struct Resolved {
    ends: Ends,
    extension_how: How,
    baseline: BaselineKind,
    baseline_how: How,
    chain: Chain,
    findings: Vec<Finding>,
}

/// Resolves what would be done.
///
/// # Errors
/// Whatever stops reading or resolving.
pub fn plan(input: Input, settings: &Settings) -> Result<Plan> {
    let intake = intake::take(input, settings)?;
    let resolved = resolve(&intake.record, settings)?;
    let axis = intake.record.axis();
    let turns = resolved.chain.turns();
    Ok(Plan {
        input: InputReport::new(&intake.outline.source, axis),
        notes: notes_of(&intake.record, &resolved),
        chain: resolved.chain.describe(axis),
        gains: resolved.chain.check_points(axis),
        extension: extension_report(&resolved),
        baseline: (resolved.baseline.to_string(), resolved.baseline_how),
        channels: intake.record.channels().map(|c| (c.name.to_owned(), c.unit.turned(turns, axis.unit()).0)).collect(),
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
    let resolved = resolve(&intake.record, settings)?;
    intake::refuse_notes(settings, &resolved.findings)?;
    let mut notes = notes_of(&intake.record, &resolved);
    let input_report = InputReport::new(&intake.outline.source, intake.record.axis());
    let (record, channels) = run(intake.record, &resolved)?;

    let digits = settings.decimals.map_or(Digits::Shortest, Digits::Fixed);
    let rows = source_rows(&intake.rows);
    let origin = origin_of(&intake.outline, &record, format, rows.as_ref())?;
    let content = Content { record: &record, origin: origin.as_ref(), extra: &[], digits, encoding };
    let (written, remarks) = write::save(write::writer(format), &content, outputs.record)?;
    notes.extend(remarks);
    let report = Report {
        schema: SCHEMA,
        tool: Tool::THIS,
        command: "condition",
        settings: settings.to_map(),
        input: input_report,
        notes,
        chain: resolved.chain.describe(record.axis()),
        channels,
        outputs: vec![OutputReport { path: written.path, sha256: written.sha256 }],
        caution: CAUTION,
    };
    let json = report::to_json(&report)?;
    for mut pending in [outputs.sidecar.take(), outputs.json.take()].into_iter().flatten() {
        pending.write_all(json.as_bytes()).map_err(Error::from)?;
        pending.finish()?;
    }
    Ok(report)
}

fn resolve(record: &Record, settings: &Settings) -> Result<Resolved> {
    let (chain, findings) = Chain::resolve(&settings.requests, &settings.shape, record.axis(), record.len())?;
    let (named, extension_how) = match settings.stage.extension {
        Some(ExtensionChoice::Fixed(ends)) => (ends, How::Asked),
        None => (Ends::EVEN, How::Default),
    };
    let ends = named.seated(settings.stage.seat);
    let (baseline, baseline_how) = match settings.stage.baseline {
        Some(kind) => (kind, How::Asked),
        None => (condition::default_baseline(ends, &chain), How::Default),
    };
    Ok(Resolved { ends, extension_how, baseline, baseline_how, chain, findings })
}

/// Conditions all channels; rows of the sample array are replaced one by one.
fn run(record: Record, resolved: &Resolved) -> Result<(Record, Vec<ChannelReport>)> {
    let (axis, names, units, mut samples, _) = record.into_parts();
    let len = axis.len();
    let planner = Planner::new();
    let Some(flat) = samples.as_slice_mut() else { unreachable!("a record's samples are contiguous") };
    let work = |(index, row): (usize, &mut [f64])| -> Result<ChannelReport> {
        let channel = Channel { name: &names[index], unit: &units[index], axis: &axis, samples: row };
        let before = Level::of(row);
        let outcome = condition::condition(channel, &resolved.chain, resolved.ends, resolved.baseline, &planner)?;
        if let Some(n) = outcome.output.iter().position(|v| !v.is_finite()) {
            let place = crate::place::Place { sample: Some(n as u64), ..crate::place::Place::channel(&names[index]) };
            return Err(Error::unsupported("the result is too large for a double")
                .at(place)
                .remedy("scale the channel with --calibrate"));
        }
        let report = channel_report(channel, &outcome, resolved, before);
        row.copy_from_slice(&outcome.output);
        Ok(report)
    };
    let reports: Result<Vec<ChannelReport>> = if len >= ALONE_FROM {
        flat.chunks_mut(len).enumerate().map(work).collect()
    } else {
        flat.par_chunks_mut(len).enumerate().map(work).collect()
    };
    let reports = reports?;
    let units = reports.iter().map(|report| report.unit.clone()).collect();
    Ok((Record::new(axis, names, units, samples)?, reports))
}

fn channel_report(
    channel: Channel<'_>,
    outcome: &Outcome,
    resolved: &Resolved,
    before: Option<Level>,
) -> ChannelReport {
    let after = Level::of(&outcome.output);
    let polynomial = outcome.baseline.polynomial();
    let reaches = resolved.chain.reaches();
    ChannelReport {
        name: channel.name.to_owned(),
        unit: outcome.unit.clone(),
        unit_in: channel.unit.clone(),
        notes: Vec::new(),
        baseline: BaselineReport {
            kind: resolved.baseline.to_string(),
            how: resolved.baseline_how,
            coefficients: polynomial.coefficients().to_vec(),
            centre: polynomial.centre(),
            half_width: polynomial.half_width(),
            fit_width: matches!(resolved.baseline, BaselineKind::Level(_) | BaselineKind::Line | BaselineKind::Slopes)
                .then_some(outcome.scale.shortest_wavelength / 2.0),
            fit_width_assumed: resolved.chain.shortest_wavelength_samples().is_none(),
        },
        extension: extension_report(resolved),
        reach: ReachReport {
            samples: reaches.reach.samples(),
            axis: reaches.reach.samples().map(|samples| samples * channel.axis.step()),
            numeric_samples: reaches.numeric,
        },
        rms: InOut { before: before.map(|l| l.rms), after: after.map(|l| l.rms) },
        level: InOut { before, after },
        parseval: outcome.parseval,
    }
}

fn extension_report(resolved: &Resolved) -> ExtensionReport {
    ExtensionReport {
        kind: resolved.ends.name().to_owned(),
        seat: match resolved.ends.seat() {
            crate::ends::Seat::Half => "half-sample",
            crate::ends::Seat::Whole => "whole-sample",
        },
        transform: resolved.ends.transform(),
        how: resolved.extension_how,
    }
}

fn notes_of(record: &Record, resolved: &Resolved) -> Vec<Finding> {
    record.findings().iter().chain(&resolved.findings).cloned().collect()
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

/// The row map in the writer's terms; `None` where no sample stands on a row of the file.
fn source_rows(rows: &RowMap) -> Option<SourceRows> {
    match rows {
        RowMap::Even { first, every: 1, .. } => Some(SourceRows::From(*first as u64)),
        RowMap::Regridded { .. } => None,
        other => Some(SourceRows::Each((0..other.len()).map(|n| other.row(n).map(|row| row as u64)).collect())),
    }
}

enum SourceRows {
    From(u64),
    Each(Vec<Option<u64>>),
}

/// The table to write back into, where input and output are both tables.
fn origin_of<'a>(
    outline: &crate::record::RawRecord,
    record: &Record,
    format: Format,
    rows: Option<&'a SourceRows>,
) -> Result<Option<Origin<'a>>> {
    let (Layout::Table(_), Format::Csv, Some(rows)) = (&outline.layout, format, rows) else { return Ok(None) };
    let channels: Vec<Option<usize>> =
        record.channels().map(|channel| outline.channels.iter().position(|raw| raw.name == channel.name)).collect();
    let rows = match rows {
        SourceRows::From(first) => Rows::From(*first),
        SourceRows::Each(list) => Rows::Each(list),
    };
    Ok(Some(Origin::new(outline, &channels, rows)?))
}
