//! The main job: read, regularise, condition every channel, write the record back, and report.

use std::ffi::OsStr;
use std::io::Write;
use std::path::Path;

use crate::audit::Audit;
use crate::basis::Planner;
use crate::error::{Error, Finding, Result};
use crate::job::chain;
use crate::job::edges;
use crate::job::intake::{self, Intake};
use crate::job::judgement::{self, Judged, Page};
use crate::job::origin::{self, SourceRows, origin_of};
use crate::job::preparation;
use crate::job::repairs;
use crate::job::requirement;
use crate::job::running::{self, Running};
use crate::job::split;
use crate::job::target::{Opened, Target};
use crate::job::work::{self, Worked};
use crate::place::Place;
use crate::read::Input;
use crate::record::{Axis, Channel, ColumnRole, Format, Layout, RawRecord, Repair, Source};
use crate::regularise::RowMap;
use crate::report::page::{self, Passage};
use crate::report::{self, InputReport, OutputReport, Plan, PlannedChannel, Report, SCHEMA, Tool};
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
    let (chain, mut remarks) = chain::of(record, settings)?;
    remarks.extend(repairs::near_ends_of(intake, &chain));
    intake::refuse_notes(settings, &remarks)?;
    preparation::check(&chain, settings)?;
    let planner = Planner::new();
    let channels = record.channels().enumerate().map(|(index, channel)| {
        let prepared = preparation::prepare(channel, record.missing(index), &chain, settings, &planner)?;
        let channel = Channel { samples: &prepared.samples, ..channel };
        let chain = &*prepared.chain;
        let (chosen, judgement) = judgement::choose(channel, chain, settings, &planner, Page::Unwanted)?;
        let (extension, baseline) = work::stage_reports(&chosen, chain, settings);
        let unit = channel.unit.turned(chain.turns(), axis.unit()).0;
        let judged = Judged::of(channel, chain, settings, chosen, judgement, &planner)?;
        let verdict = judged.verdict(channel, &unit);
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
        input: InputReport::new(&intake.outline.source, axis).with_part(intake.segment),
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
    prepare(input, target, settings, &Bench::new(Audited::No))?.finish()
}

/// What many jobs share, or a job does on its own.
pub struct Bench {
    planner: Planner,
    audited: Audited,
}

/// Whether a job looks at the record before it conditions it.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Audited {
    /// It does: the audit goes with the result.
    Yes,
    /// It does not.
    No,
}

impl Bench {
    /// A bench without plans. Plans of every length that comes by are kept until it is dropped.
    pub fn new(audited: Audited) -> Bench {
        Bench { planner: Planner::new(), audited }
    }
}

/// A job whose outputs are written but not yet visible.
pub struct Prepared<'a> {
    /// What it found and did.
    pub report: Report,
    /// What is in the record, where that was asked for.
    pub audit: Option<Audit>,
    passages: Vec<Passage>,
    outputs: Opened<'a>,
}

impl<'a> Prepared<'a> {
    /// Makes the record, its sidecar, its JSON and its page appear, all or none.
    ///
    /// # Errors
    /// `Io` where one of them cannot be written.
    pub fn finish(self) -> Result<Report> {
        let durability = self.outputs.durability;
        let (report, outputs) = self.written()?;
        write::finish_together(outputs, durability)?;
        Ok(report)
    }

    /// The report, and all outputs with their content, still to be finished.
    fn written(self) -> Result<(Report, Vec<Pending<'a>>)> {
        let Opened { record, sidecar, json, page, .. } = self.outputs;
        let text = report::to_json(&self.report)?;
        let mut outputs = vec![record];
        for mut pending in [sidecar, json].into_iter().flatten() {
            pending.write_all(text.as_bytes()).map_err(|error| Error::from(error).at(Place::file(pending.label())))?;
            outputs.push(pending);
        }
        if let Some(files) = page {
            outputs.extend(files.fill(&self.report, &page::condition_page(&self.report, &self.passages))?);
        }
        Ok((self.report, outputs))
    }

    /// The report, the audit, and the record still to be finished.
    pub fn into_parts(self) -> (Report, Option<Audit>, Pending<'a>) {
        (self.report, self.audit, self.outputs.record)
    }
}

/// Conditions every part of a record between its gaps, where `Gaps::Split` is set and there are any: part k of `clean.csv`
/// goes to `clean-k.csv`, each with its own sidecar. A record without gaps goes to `clean.csv` as ever. Where a further JSON is
/// asked for it holds a list of the reports. All outputs appear, or none.
///
/// # Errors
/// As `condition`; `Usage` where several parts would go to one stream or page.
pub fn condition_parts(input: Input, target: Target<'_>, settings: &Settings) -> Result<Vec<Report>> {
    let bench = Bench::new(Audited::No);
    let input_path = intake::path_of(&input);
    let named = target.path().map(Path::to_owned);
    let sequel = target.sequel();
    // Opened first all the same: what cannot be written is known before the work.
    let mut outputs = target.open(input_path.as_deref())?;
    let (mut json, durability) = (outputs.json.take(), outputs.durability);
    let parts = intake::take_parts(input, settings)?;
    let opened = match parts.len() {
        1 => vec![outputs],
        count => {
            drop(outputs);
            sequel.open(count, input_path.as_deref())?
        }
    };
    let mut reports = Vec::with_capacity(parts.len());
    let mut pending = Vec::new();
    for (intake, outputs) in parts.into_iter().zip(opened) {
        let prepared = work_on(intake, None, outputs, named.as_deref(), settings, &bench)?;
        let (report, outputs) = prepared.written()?;
        reports.push(report);
        pending.extend(outputs);
    }
    if let Some(mut file) = json.take() {
        file.write_all(report::to_json(&reports)?.as_bytes())
            .map_err(|error| Error::from(error).at(Place::file(file.label())))?;
        pending.push(file);
    }
    write::finish_together(pending, durability)?;
    Ok(reports)
}

/// Conditions a record into outputs that are not yet visible.
///
/// # Errors
/// Whatever stops it; nothing is left behind.
pub fn prepare<'a>(input: Input, target: Target<'a>, settings: &Settings, bench: &Bench) -> Result<Prepared<'a>> {
    let input_path = intake::path_of(&input);
    let named = target.path().map(Path::to_owned);
    let outputs = target.open(input_path.as_deref())?;
    let (intake, audit) = match bench.audited {
        Audited::Yes => intake::take_audited(input, settings).map(|(intake, audit)| (intake, Some(audit)))?,
        Audited::No => (intake::take(input, settings)?, None),
    };
    work_on(intake, audit, outputs, named.as_deref(), settings, bench)
}

/// Conditions one record and writes it into `outputs`, which stay invisible.
fn work_on<'a>(
    intake: Intake,
    audit: Option<Audit>,
    mut outputs: Opened<'a>,
    named: Option<&Path>,
    settings: &Settings,
    bench: &Bench,
) -> Result<Prepared<'a>> {
    let encoding = encoding_of(settings)?;
    let Intake { record, rows, repairs, segment, outline } = intake;
    let format = format_of(settings, named, &outline.source)?;
    refuse_unread(settings, format)?;
    let (chain, remarks) = chain::of(&record, settings)?;
    intake::refuse_notes(settings, &remarks)?;
    preparation::check(&chain, settings)?;
    let mut notes: Vec<_> = record.findings().iter().cloned().chain(remarks).collect();
    let input_report = InputReport::new(&outline.source, record.axis()).with_part(segment);
    let chain_report = chain.describe(record.axis());
    refuse_columns(settings, format, record.axis())?;
    let wanted = if outputs.page.is_some() { Page::Wanted } else { Page::Unwanted };
    let len = record.len();
    let Worked { record, mut channels, columns, passages } =
        work::run(record, &chain, settings, &bench.planner, wanted)?;

    let mut repairs = repairs::with_spikes(repairs, &channels);
    let names = channels.iter().map(|channel| channel.name.as_str());
    let mut remarks = repairs::near_ends(names.zip(&repairs), len, &chain, &outline.source.path);
    for (channel, own) in channels.iter_mut().zip(&repairs) {
        intake::refuse_notes(settings, &channel.notes)?;
        channel.repaired = own.iter().map(Repair::count).sum();
        channel.repairs.clone_from(own);
    }
    let rows = match chain.treatments().resampling {
        None => rows,
        Some(grid) => {
            remarks.extend(untouched(&outline));
            repairs.clear(); // they have no place on the new grid
            RowMap::Regridded { count: grid.count }
        }
    };
    let kept = edges::kept(&channels, record.len(), settings)?;
    let beside = edges::beside(&columns, &kept);
    let (record, rows, repairs) = edges::trimmed(record, rows, repairs, &kept)?;
    let source_rows = SourceRows::of(&rows);
    let stamps = origin::stamps_of(&outline, &record, format, &rows)?;
    let origin = origin_of(&outline, &record, format, source_rows.as_ref(), stamps.as_deref())?;
    let trusted = edges::marks(&channels, record.len(), settings);
    let mended = repairs::marks(&record, &repairs, settings);
    let running = running::columns(&record, settings);
    let extra: Vec<_> = beside
        .iter()
        .map(edges::Beside::column)
        .chain(trusted.iter().map(edges::Mark::column))
        .chain(mended.iter().map(repairs::Mark::column))
        .chain(running.iter().map(Running::column))
        .collect();
    let shown = edges::shown(&channels, settings);
    let content = Content {
        record: &record,
        origin: origin.as_ref(),
        extra: &extra,
        shown: shown.as_deref(),
        digits: settings.decimals.map_or(Digits::Shortest, Digits::Fixed),
        encoding,
    };
    remarks.extend(write::fill(write::writer(format), &content, &mut outputs.record)?);
    intake::refuse_notes(settings, &remarks)?;
    notes.extend(remarks);
    let unmet = requirement::unmet(settings, &channels);
    let written = OutputReport { path: outputs.record.label().to_owned(), sha256: outputs.record.fingerprint() };
    let report = Report {
        schema: SCHEMA,
        tool: Tool::THIS,
        command: "condition",
        settings: settings.to_map_for(format),
        input: input_report,
        notes,
        chain: chain_report,
        channels,
        requirement_met: unmet.is_empty(),
        unmet,
        outputs: vec![written],
        caution: report::caution(&chain),
    };
    Ok(Prepared { report, audit, passages, outputs })
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
    let wanted = [
        ("--running-rms", settings.running_rms.is_some()),
        ("--split", split::is_wanted(settings)),
        ("--beside", !settings.beside.is_empty()),
    ];
    if let Some((option, _)) = wanted.iter().find(|(_, wanted)| *wanted && format == Format::Wav) {
        return Err(Error::usage(format!("{option}: a WAV file has no room for further columns"))
            .remedy("write CSV with --format csv"));
    }
    if settings.running_rms.is_some() && !axis.is_time() {
        return Err(Error::usage(format!("--running-rms: the record's axis is a length in {}", axis.unit()))
            .remedy("leave it out"));
    }
    Ok(())
}

pub(super) fn encoding_of(settings: &Settings) -> Result<WaveEncoding> {
    let Some(name) = &settings.encoding else { return Ok(WaveEncoding::Float32) };
    write::WAVE_ENCODINGS.iter().find(|(known, _)| known == name).map(|(_, encoding)| *encoding).ok_or_else(|| {
        let known: Vec<&str> = write::WAVE_ENCODINGS.iter().map(|(name, _)| *name).collect();
        Error::usage(format!("--encoding: not a sample type: {name:?}"))
            .remedy(format!("use one of {}", known.join(", ")))
    })
}

/// Refuses what this format of the output does not read: an option that does nothing hides a mistake.
fn refuse_unread(settings: &Settings, format: Format) -> Result<()> {
    let name = write::writer(format).name;
    let unread = match format {
        Format::Csv => settings.encoding.as_ref().map(|_| ("--encoding", "a sample type of WAV", "--decimals")),
        Format::Wav => settings.decimals.map(|_| ("--decimals", "the digits of CSV", "--encoding")),
    };
    let Some((option, what, other)) = unread else { return Ok(()) };
    Err(Error::usage(format!("{option} tells {what}, but the output is {name}"))
        .remedy(format!("leave it out, use {other}, or choose the output with --format")))
}

/// `--format`, else what the output's name says, else the input's own; a name that says something else is refused.
fn format_of(settings: &Settings, output: Option<&Path>, input: &Source) -> Result<Format> {
    let packed = |extension: &OsStr| ["gz", "gzip", "zst", "zstd"].iter().any(|p| extension.eq_ignore_ascii_case(p));
    if output.and_then(Path::extension).is_some_and(packed) {
        return Err(
            Error::usage("outputs are not packed").remedy("leave .gz or .zst away, and pack the file afterwards")
        );
    }
    if let Some(format) = settings.format {
        return Ok(format);
    }
    let Some(extension) = output.and_then(Path::extension) else { return Ok(input.format) };
    match output.map(write::writer_by_name) {
        Some(Ok(writer)) => Ok(writer.format),
        Some(Err(_)) if Path::new(&input.path).extension() == Some(extension) => Ok(input.format),
        Some(Err(error)) => Err(error),
        None => Ok(input.format),
    }
}
