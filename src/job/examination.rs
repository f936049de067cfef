//! `audit`: what is in a record, and whether a run would take it.

use crate::audit;
use crate::error::{Error, Result};
use crate::job::intake;
use crate::place::Place;
use crate::read::{self, Input};
use crate::record::{Format, RawRecord, Repair};
use crate::regularise::{self, RateGroup};
use crate::report::{AuditReport, AxisReport, RecordReport, SCHEMA, Tool};
use crate::settings::{Fitness, Settings};

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
