//! `audit`: what is in a record, and whether a run would take it.

use std::io::Read;

use serde::Serialize;
use sha2::{Digest, Sha256};

use crate::audit;
use crate::codec;
use crate::error::{Error, Result};
use crate::job::{intake, restoration};
use crate::place::{Place, escape};
use crate::read::{self, Input};
use crate::record::{Format, RawRecord, Repair};
use crate::regularise::{self, RateGroup};
use crate::report::{ArchiveListing, AuditReport, AxisReport, ListedChannel, RecordReport, SCHEMA, Tool};
use crate::settings::{Fitness, Settings};
use crate::unit::Unit;

/// What a file turned out to be.
#[derive(Debug, Clone, Serialize)]
#[serde(untagged)]
pub enum Examined {
    /// A record, audited.
    Record(Box<AuditReport>),
    /// An archive, listed without decoding.
    Archive(Box<ArchiveListing>),
}

/// Audits a record, or tells what an archive holds.
///
/// # Errors
/// As `audit`; `Malformed` with the byte where an archive is damaged.
pub fn examine(input: Input, settings: &Settings) -> Result<Examined> {
    let mut first = Vec::new();
    let input = match input {
        Input::Path(path) => {
            if let Ok(file) = std::fs::File::open(&path)
                && path.is_file()
            {
                file.take(codec::MAGIC.len() as u64).read_to_end(&mut first)?;
            }
            Input::Path(path)
        }
        Input::Stream(mut stream) => {
            stream.by_ref().take(codec::MAGIC.len() as u64).read_to_end(&mut first)?;
            Input::Stream(Box::new(std::io::Cursor::new(first.clone()).chain(stream)))
        }
    };
    if codec::is_archive(&first) {
        return list(input, settings).map(|listing| Examined::Archive(Box::new(listing)));
    }
    audit(input, settings).map(|report| Examined::Record(Box::new(report)))
}

/// What an archive holds: its header and index, with every checksum checked.
fn list(input: Input, settings: &Settings) -> Result<ArchiveListing> {
    let (path, bytes) = restoration::bytes_of(input)?;
    let archive = codec::Archive::open(&bytes).map_err(|error| error.at(Place::file(&path)))?;
    let header = &archive.header;
    let channels = header.channels.iter().enumerate().map(|(stream, channel)| {
        let entries = || archive.entries.iter().filter(move |entry| entry.stream == stream);
        let mut modes: Vec<codec::Mode> = entries().map(|entry| entry.mode).collect();
        modes.sort_by_key(|mode| mode.number());
        modes.dedup();
        ListedChannel {
            name: channel.name.clone(),
            unit: Unit::parse(&channel.unit),
            bound: (!channel.bound.is_empty()).then(|| channel.bound.clone()),
            error: channel.error,
            blocks: entries().count(),
            bytes: entries().map(|entry| entry.bytes as u64).sum(),
            modes,
        }
    });
    let origin = header.origin.as_ref();
    Ok(ArchiveListing {
        schema: SCHEMA,
        tool: Tool::THIS,
        command: "audit",
        settings: settings.to_map(),
        sha256: Sha256::digest(&bytes).iter().map(|byte| format!("{byte:02x}")).collect(),
        bytes: bytes.len() as u64,
        format: "grain",
        rows: header.rows,
        axis: header.axis.as_ref().map(axis_in_words),
        channels: channels.collect(),
        notes: header.notes.clone(),
        source: origin.map(|origin| origin.name.clone()),
        source_sha256: origin.map(|origin| origin.sha256.clone()),
        source_bytes: origin.map(|origin| origin.bytes),
        made_by: origin.map(|origin| origin.tool.clone()),
        made_with: origin.map(|origin| origin.settings.clone()),
        path,
    })
}

/// `a row every 0.5 mm`.
pub(super) fn axis_in_words(axis: &codec::ArchivedAxis) -> String {
    let unit = escape(&axis.unit);
    match axis.rule {
        codec::Rule::Even(p, 1) => format!("a row every {} {unit}", p as f64 * axis.tick),
        codec::Rule::Even(p, q) => format!("a row every {p}/{q} of {} {unit}", axis.tick),
        codec::Rule::Coded => format!("uneven stamps in {unit}, kept exactly"),
        codec::Rule::Stated(p, 1) => format!("{p} rows a second or metre, as stated"),
        codec::Rule::Stated(p, q) => format!("{p}/{q} rows a second or metre, as stated"),
        codec::Rule::StatedDouble(rate) => format!("{rate} rows a second or metre, as stated"),
    }
}

/// Audits one file.
///
/// # Errors
/// Where the file cannot be read at all, and with `--strict` for the first remark.
pub fn audit(input: Input, settings: &Settings) -> Result<AuditReport> {
    let raw = read::read(input, &settings.read)?;
    let audit = audit::audit(&raw);
    intake::refuse_notes(settings, &audit.findings)?;
    let source = raw.source.clone();
    let unit_sources = unit_sources(&raw, settings);
    let groups = regularise::regularise_each(raw, &settings.regularise);
    let records: Vec<RecordReport> = groups.into_iter().map(|group| record_of(group, &source.path)).collect();
    let first = records.first();
    let (axis, refusal) = (first.and_then(|r| r.axis.clone()), first.and_then(|r| r.refusal.clone()));
    let clean = audit.findings.is_empty() && records.iter().all(|record| record.refusal.is_none());
    Ok(AuditReport {
        schema: SCHEMA,
        tool: Tool::THIS,
        command: "audit",
        settings: settings.to_map(),
        path: source.path,
        sha256: source.sha256,
        bytes: source.bytes,
        format: source.format,
        axis,
        refusal,
        records,
        unit_sources,
        requirement_met: clean || settings.fitness != Some(Fitness::Clean),
        audit,
    })
}

fn record_of(group: RateGroup, path: &str) -> RecordReport {
    let blank = RecordReport { channels: group.channels, axis: None, samples: 0, parts: 0, repaired: 0, refusal: None };
    match group.parts.map_err(|error| error.at(Place::file(path))) {
        Err(error) => RecordReport { refusal: Some(Error::to_string(&error)), ..blank },
        Ok(parts) => RecordReport {
            axis: parts.first().map(|part| AxisReport::new(part.record.axis())),
            samples: parts.iter().map(|part| part.record.len()).sum(),
            parts: parts.len(),
            repaired: parts.iter().flat_map(|part| part.repairs.iter().flatten()).map(Repair::count).sum(),
            ..blank
        },
    }
}

/// Where the unit of each channel came from.
fn unit_sources(raw: &RawRecord, settings: &Settings) -> Vec<Option<&'static str>> {
    let given = |name: &str| {
        let units = settings.read.units.iter().map(|(channel, _)| channel);
        let factors = settings.read.calibrate.iter().filter(|c| c.unit.is_some()).map(|c| &c.channel);
        units.chain(factors).any(|channel| channel == name)
    };
    let source = |channel: &crate::record::RawChannel| match raw.source.format {
        _ if given(&channel.name) => Some("option"),
        _ if channel.unit.is_unknown() => None,
        Format::Wav => Some("format"),
        _ => Some("header"),
    };
    raw.channels.iter().map(source).collect()
}
