//! The main job: read, regularise, condition every channel, write the record back, and report.

use std::io::Write;
use std::path::Path;

use serde::Serialize;

use crate::basis::Planner;
use crate::error::{Error, Result};
use crate::job::edges;
use crate::job::intake::{self, Intake};
use crate::job::origin::{self, SourceRows, origin_of};
use crate::job::repairs;
use crate::job::target::{self, Opened, Target};
use crate::job::work::{self, Worked};
use crate::operator::Chain;
use crate::read::Input;
use crate::record::{Format, Repair};
use crate::report::{self, CAUTION, InputReport, OutputReport, Plan, PlannedChannel, Report, SCHEMA, Tool};
use crate::settings::Settings;
use crate::write::{self, Content, Digits, Pending, WaveEncoding};

/// Resolves what would be done, for each part of the record where gaps split it.
///
/// # Errors
/// Whatever stops reading or resolving.
pub fn plan(input: Input, settings: &Settings) -> Result<Vec<Plan>> {
    intake::take_parts(input, settings)?.iter().map(|intake| plan_one(intake, settings)).collect()
}

fn plan_one(intake: &Intake, settings: &Settings) -> Result<Plan> {
    let record = &intake.record;
    let axis = record.axis();
    let (chain, mut remarks) = Chain::resolve(&settings.requests, &settings.shape, axis, record.len())?;
    remarks.extend(repairs::near_ends(record, &intake.repairs, &chain, &intake.outline.source.path));
    intake::refuse_notes(settings, &remarks)?;
    let planner = Planner::new();
    let channels = record.channels().map(|channel| {
        let (chosen, _) = work::choose(channel, &chain, settings, &planner)?;
        let (extension, baseline) = work::stage_reports(&chosen, &chain, settings);
        let unit = channel.unit.turned(chain.turns(), axis.unit()).0;
        Ok(PlannedChannel { name: channel.name.to_owned(), unit, extension, baseline })
    });
    Ok(Plan {
        channels: channels.collect::<Result<_>>()?,
        input: InputReport::new(&intake.outline.source, axis).with_part(intake.segment),
        notes: record.findings().iter().cloned().chain(remarks).collect(),
        chain: chain.describe(axis),
        gains: chain.check_points(axis),
    })
}

/// Conditions a record and writes it, with its sidecar.
///
/// # Errors
/// Whatever stops it, gaps that split the record among it; nothing is then visible of the outputs.
pub fn condition(input: Input, target: Target<'_>, settings: &Settings) -> Result<Report> {
    let encoding = encoding_of(settings)?;
    let input_path = intake::path_of(&input);
    let named = target.path().map(Path::to_owned);
    let outputs = target.open(input_path.as_deref())?;
    let intake = intake::take(input, settings)?;
    let (report, json) = finish(intake, outputs, named.as_deref(), encoding, settings)?;
    write_json(json, &report)?;
    Ok(report)
}

/// Conditions every part of a record between its gaps, where `Gaps::Split` is set and there are any: part k of `clean.csv`
/// goes to `clean-k.csv`, each with its own sidecar. A record without gaps goes to `clean.csv` as ever. Where a further JSON is
/// asked for it holds a list of the reports.
///
/// # Errors
/// As `condition`; `Usage` where several parts would go to one stream.
pub fn condition_parts(input: Input, target: Target<'_>, settings: &Settings) -> Result<Vec<Report>> {
    let encoding = encoding_of(settings)?;
    let input_path = intake::path_of(&input);
    let named = target.path().map(Path::to_owned);
    let overwrite = target.overwrite();
    // Opened first all the same: what cannot be written is known before the work.
    let outputs = target.open(input_path.as_deref())?;
    let parts = intake::take_parts(input, settings)?;
    let count = parts.len();
    if count == 1 {
        let mut json = None;
        let mut reports = Vec::new();
        for (intake, outputs) in parts.into_iter().zip([outputs]) {
            let (report, pending) = finish(intake, outputs, named.as_deref(), encoding, settings)?;
            json = pending;
            reports.push(report);
        }
        write_json(json, &reports)?;
        return Ok(reports);
    }
    let json = outputs.json;
    let opened = target::open_parts(named.as_deref(), count, input_path.as_deref(), overwrite)?;
    let mut reports = Vec::with_capacity(count);
    let (mut records, mut sidecars) = (Vec::with_capacity(count), Vec::with_capacity(count));
    for (intake, (mut record, sidecar)) in parts.into_iter().zip(opened) {
        reports.push(work_on(intake, &mut record, named.as_deref(), encoding, settings)?);
        records.push(record);
        sidecars.push(sidecar);
    }
    for (report, written) in reports.iter_mut().zip(write::finish_all(records)) {
        let written = written?;
        report.outputs = vec![OutputReport { path: written.path, sha256: written.sha256 }];
    }
    for (report, sidecar) in reports.iter().zip(sidecars) {
        write_json(Some(sidecar), report)?;
    }
    write_json(json, &reports)?;
    Ok(reports)
}

/// Works on one record and writes it with its sidecar; the further JSON is left to the caller.
fn finish<'a>(
    intake: Intake,
    outputs: Opened<'a>,
    named: Option<&Path>,
    encoding: WaveEncoding,
    settings: &Settings,
) -> Result<(Report, Option<Pending<'a>>)> {
    let mut record = outputs.record;
    let mut report = work_on(intake, &mut record, named, encoding, settings)?;
    let written = record.finish()?;
    report.outputs = vec![OutputReport { path: written.path, sha256: written.sha256 }];
    write_json(outputs.sidecar, &report)?;
    Ok((report, outputs.json))
}

fn write_json<T: Serialize>(pending: Option<Pending<'_>>, value: &T) -> Result<()> {
    let Some(mut pending) = pending else { return Ok(()) };
    pending.write_all(report::to_json(value)?.as_bytes()).map_err(Error::from)?;
    pending.finish().map(|_| ())
}

/// Conditions one record and writes it into `output`, which is not finished yet.
fn work_on(
    intake: Intake,
    output: &mut Pending<'_>,
    named: Option<&Path>,
    encoding: WaveEncoding,
    settings: &Settings,
) -> Result<Report> {
    let Intake { record, rows, repairs, segment, outline } = intake;
    let format = format_of(settings, named, outline.source.format)?;
    let (chain, mut remarks) = Chain::resolve(&settings.requests, &settings.shape, record.axis(), record.len())?;
    remarks.extend(repairs::near_ends(&record, &repairs, &chain, &outline.source.path));
    intake::refuse_notes(settings, &remarks)?;
    let mut notes: Vec<_> = record.findings().iter().cloned().chain(remarks).collect();
    let input = InputReport::new(&outline.source, record.axis()).with_part(segment);
    let Worked { record, mut channels } = work::run(record, &chain, settings)?;
    for (channel, repairs) in channels.iter_mut().zip(&repairs) {
        intake::refuse_notes(settings, &channel.notes)?;
        channel.repaired = repairs.iter().map(Repair::count).sum();
        channel.repairs.clone_from(repairs);
    }
    let (record, rows, repairs) = edges::trimmed(record, rows, repairs, &channels, settings)?;
    let source_rows = SourceRows::of(&rows);
    let stamps = origin::stamps_of(&outline, &record, format, &rows)?;
    let origin = origin_of(&outline, &record, format, source_rows.as_ref(), stamps.as_deref())?;
    let (trusted, mended) =
        (edges::marks(&channels, record.len(), settings), repairs::marks(&record, &repairs, settings));
    let extra: Vec<_> =
        trusted.iter().map(edges::Mark::column).chain(mended.iter().map(repairs::Mark::column)).collect();
    let shown = edges::shown(&channels, settings);
    let content = Content {
        record: &record,
        origin: origin.as_ref(),
        extra: &extra,
        shown: shown.as_deref(),
        digits: settings.decimals.map_or(Digits::Shortest, Digits::Fixed),
        encoding,
    };
    let writer = write::writer(format);
    let remarks = (writer.check)(&content)?;
    intake::refuse_notes(settings, &remarks)?;
    notes.extend(remarks);
    write::put(writer, &content, output)?;
    let requirement_met = settings.require.is_none_or(|required| {
        channels.iter().all(|c| c.verdict.as_ref().and_then(|v| v.adequacy).is_some_and(|found| found <= required))
    });
    Ok(Report {
        schema: SCHEMA,
        tool: Tool::THIS,
        command: "condition",
        settings: settings.to_map(),
        input,
        notes,
        chain: chain.describe(record.axis()),
        channels,
        requirement_met,
        outputs: Vec::new(),
        caution: CAUTION,
    })
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
fn format_of(settings: &Settings, output: Option<&Path>, input: Format) -> Result<Format> {
    let packed =
        output.and_then(Path::extension).is_some_and(|e| ["gz", "zst"].iter().any(|p| e.eq_ignore_ascii_case(p)));
    if packed {
        return Err(
            Error::usage("outputs are not packed").remedy("leave .gz or .zst away, and pack the file afterwards")
        );
    }
    Ok(settings.format.or_else(|| write::writer_by_name(output?).ok().map(|writer| writer.format)).unwrap_or(input))
}
