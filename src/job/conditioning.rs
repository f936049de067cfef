//! The main job: read, regularise, condition every channel, write the record back, and report.

use std::io::Write;
use std::path::Path;

use crate::basis::Planner;
use crate::error::{Error, Result};
use crate::job::chain;
use crate::job::edges;
use crate::job::intake;
use crate::job::split;
use crate::job::origin::{SourceRows, origin_of};
use crate::job::target::Target;
use crate::job::work::{self, Worked};
use crate::read::Input;
use crate::record::Format;
use crate::report::{self, CAUTION, InputReport, OutputReport, Plan, PlannedChannel, Report, SCHEMA, Tool};
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
    let (chain, remarks) = chain::of(record, settings)?;
    let planner = Planner::new();
    let channels = record.channels().map(|channel| {
        let (chosen, _) = work::choose(channel, &chain, settings, &planner)?;
        let (extension, baseline) = work::stage_reports(&chosen, &chain, settings);
        let unit = channel.unit.turned(chain.turns(), axis.unit()).0;
        Ok(PlannedChannel { name: channel.name.to_owned(), unit, extension, baseline })
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
    let (chain, remarks) = chain::of(&intake.record, settings)?;
    if format == Format::Wav && (split::corner(settings).is_some() || !settings.beside.is_empty()) {
        return Err(Error::usage("--split and --beside write columns, and a WAV file has none").remedy("use --format csv"));
    }
    intake::refuse_notes(settings, &remarks)?;
    let mut notes: Vec<_> = intake.record.findings().iter().cloned().chain(remarks).collect();
    let input_report = InputReport::new(&intake.outline.source, intake.record.axis());
    let Worked { record, channels, columns } = work::run(intake.record, &chain, settings)?;

    let kept = edges::kept(&channels, record.len(), settings)?;
    let beside = edges::beside(&columns, &kept);
    let (record, rows) = edges::trimmed(record, intake.rows, &kept)?;
    let rows = SourceRows::of(&rows);
    let origin = origin_of(&intake.outline, &record, format, rows.as_ref())?;
    let marks = edges::marks(&channels, record.len(), settings);
    let extra: Vec<_> =
        beside.iter().map(edges::Beside::column).chain(marks.iter().map(edges::Mark::column)).collect();
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
        chain: chain.describe(record.axis()),
        channels,
        requirement_met,
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
