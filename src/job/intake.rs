//! The first half of every job: from a file to a regular record, with what is needed to write it back.

use std::path::PathBuf;

use crate::audit::{self, Audit};
use crate::error::{Error, Finding, Result};
use crate::place::Place;
use crate::read::{self, Input};
use crate::record::{RawChannel, RawRecord, Record};
use crate::regularise::{self, RowMap};
use crate::settings::Settings;

/// A record ready to be conditioned.
pub struct Intake {
    /// The regular record. Remarks of reader and audit stand in its findings.
    pub record: Record,
    /// Rows of the file that its samples came from.
    pub rows: RowMap,
    /// The raw record without its values: source, layout, names and units.
    pub outline: RawRecord,
}

/// Reads and regularises.
pub fn take(input: Input, settings: &Settings) -> Result<Intake> {
    settle(read::read(input, &settings.read)?, settings)
}

/// Reads, audits and regularises.
pub fn take_audited(input: Input, settings: &Settings) -> Result<(Intake, Audit)> {
    let raw = read::read(input, &settings.read)?;
    let audit = audit::audit(&raw);
    Ok((settle(raw, settings)?, audit))
}

fn settle(raw: RawRecord, settings: &Settings) -> Result<Intake> {
    let outline = outline_of(&raw);
    let place = Place::file(&outline.source.path);
    let (record, rows) = regularise::regularise(raw, &settings.regularise).map_err(|error| error.at(place))?;
    refuse_notes(settings, record.findings())?;
    Ok(Intake { record, rows, outline })
}

/// The input's path, where it is a file.
pub fn path_of(input: &Input) -> Option<PathBuf> {
    match input {
        Input::Path(path) => Some(path.clone()),
        Input::Stream(_) => None,
    }
}

/// With `--strict` the first remark is an error.
pub fn refuse_notes(settings: &Settings, findings: &[Finding]) -> Result<()> {
    let Some(finding) = findings.first().filter(|_| settings.strict) else { return Ok(()) };
    let more = findings.len() - 1;
    let also = if more > 0 { format!(" (and {more} more)") } else { String::new() };
    Err(Error::malformed(format!("{}{also}", finding.text))
        .at(finding.place.clone())
        .remedy("--strict refuses what would otherwise be a note"))
}

/// Everything of a raw record but its numbers, which are large.
fn outline_of(raw: &RawRecord) -> RawRecord {
    let channels = raw.channels.iter().map(|channel| RawChannel {
        name: channel.name.clone(),
        unit: channel.unit.clone(),
        values: Vec::new(),
        missing: Vec::new(),
        missing_spelling: None,
        full_scale: channel.full_scale,
    });
    RawRecord {
        source: raw.source.clone(),
        channels: channels.collect(),
        stamps: None,
        stated_rate: raw.stated_rate.clone(),
        metadata: raw.metadata.clone(),
        findings: Vec::new(),
        layout: raw.layout.clone(),
    }
}
