//! The main job: read, regularise, condition every channel, write the record back, and report.

use std::io::Write;
use std::path::Path;

use crate::audit::Audit;
use crate::basis::Planner;
use crate::error::{Error, Finding, Result};
use crate::job::chain;
use crate::job::edges;
use crate::job::intake;
use crate::job::judgement::{self, Judged, Page};
use crate::job::origin::{SourceRows, origin_of};
use crate::job::preparation;
use crate::job::requirement;
use crate::job::running::{self, Running};
use crate::job::split;
use crate::job::target::{Opened, Target};
use crate::job::work::{self, Worked};
use crate::place::Place;
use crate::read::Input;
use crate::record::{Axis, Channel, ColumnRole, Format, Layout, RawRecord, Source};
use crate::regularise::RowMap;
use crate::report::page::{self, Passage};
use crate::report::{self, InputReport, OutputReport, Plan, PlannedChannel, Report, SCHEMA, Tool};
use crate::settings::Settings;
use crate::write::{self, Content, Digits, Pending, WaveEncoding};

/// Resolves what would be done.
///
/// # Errors
/// Whatever stops reading or resolving.
pub fn plan(input: Input, settings: &Settings) -> Result<Plan> {
    let intake = intake::take(input, settings)?;
    let record = &intake.record;
    let axis = record.axis();
    let (chain, remarks) = chain::of(record, settings)?;
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
        let Opened { record, sidecar, json, page, durability } = self.outputs;
        let text = report::to_json(&self.report)?;
        let mut outputs = vec![record];
        for mut pending in [sidecar, json].into_iter().flatten() {
            pending.write_all(text.as_bytes()).map_err(|error| Error::from(error).at(Place::file(pending.label())))?;
            outputs.push(pending);
        }
        if let Some(files) = page {
            outputs.extend(files.fill(&self.report, &page::condition_page(&self.report, &self.passages))?);
        }
        write::finish_together(outputs, durability)?;
        Ok(self.report)
    }

    /// The report, the audit, and the record still to be finished.
    pub fn into_parts(self) -> (Report, Option<Audit>, Pending<'a>) {
        (self.report, self.audit, self.outputs.record)
    }
}

/// Conditions a record into outputs that are not yet visible.
///
/// # Errors
/// Whatever stops it; nothing is left behind.
pub fn prepare<'a>(input: Input, target: Target<'a>, settings: &Settings, bench: &Bench) -> Result<Prepared<'a>> {
    let encoding = encoding_of(settings)?;
    let input_path = intake::path_of(&input);
    let named = target.path().map(Path::to_owned);
    let mut outputs = target.open(input_path.as_deref())?;

    let (intake, audit) = match bench.audited {
        Audited::Yes => intake::take_audited(input, settings).map(|(intake, audit)| (intake, Some(audit)))?,
        Audited::No => (intake::take(input, settings)?, None),
    };
    let format = format_of(settings, named.as_deref(), &intake.outline.source)?;
    refuse_unread(settings, format)?;
    let (chain, remarks) = chain::of(&intake.record, settings)?;
    intake::refuse_notes(settings, &remarks)?;
    preparation::check(&chain, settings)?;
    let mut notes: Vec<_> = intake.record.findings().iter().cloned().chain(remarks).collect();
    let input_report = InputReport::new(&intake.outline.source, intake.record.axis());
    let chain_report = chain.describe(intake.record.axis());
    refuse_columns(settings, format, intake.record.axis())?;
    let wanted = if outputs.page.is_some() { Page::Wanted } else { Page::Unwanted };
    let Worked { record, channels, columns, passages } =
        work::run(intake.record, &chain, settings, &bench.planner, wanted)?;
    for channel in &channels {
        intake::refuse_notes(settings, &channel.notes)?;
    }

    let rows = match chain.treatments().resampling {
        None => intake.rows,
        Some(grid) => {
            notes.extend(untouched(&intake.outline));
            RowMap::Regridded { count: grid.count }
        }
    };
    let kept = edges::kept(&channels, record.len(), settings)?;
    let beside = edges::beside(&columns, &kept);
    let (record, rows) = edges::trimmed(record, rows, &kept)?;
    let rows = SourceRows::of(&rows);
    let origin = origin_of(&intake.outline, &record, format, rows.as_ref())?;
    let marks = edges::marks(&channels, record.len(), settings);
    let running = running::columns(&record, settings);
    let extra: Vec<_> = beside
        .iter()
        .map(edges::Beside::column)
        .chain(marks.iter().map(edges::Mark::column))
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
    let remarks = write::fill(write::writer(format), &content, &mut outputs.record)?;
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
