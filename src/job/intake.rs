//! The first half of every job: from a file to a regular record, with what is needed to write it back.

use std::path::PathBuf;

use crate::audit::{self, Audit};
use crate::error::{Error, Finding, Result};
use crate::place::Place;
use crate::read::{self, Input};
use crate::record::{RawRecord, Record, Repair};
use crate::regularise::{self, Regular, RowMap, Segment};
use crate::settings::Settings;

/// A record ready to be conditioned.
pub struct Intake {
    /// The regular record. Remarks of reader and audit stand in its findings.
    pub record: Record,
    /// Rows of the file that its samples came from.
    pub rows: RowMap,
    /// Samples of each channel that are not as they were read.
    pub repairs: Vec<Vec<Repair>>,
    /// Which part of the file it is, where gaps split that.
    pub segment: Option<Segment>,
    /// The raw record without its values: source, layout, names and units.
    pub outline: RawRecord,
}

/// Reads and regularises what must be one record.
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
    let outline = raw.outline();
    let place = Place::file(&outline.source.path);
    let regular = regularise::regularise(raw, &settings.regularise).map_err(|error| error.at(place))?;
    one(regular, outline, settings)
}

/// Reads and regularises; one entry for each part between gaps where these split the record.
pub fn take_parts(input: Input, settings: &Settings) -> Result<Vec<Intake>> {
    let raw = read::read(input, &settings.read)?;
    let outline = raw.outline();
    let place = Place::file(&outline.source.path);
    let parts = regularise::regularise_parts(raw, &settings.regularise).map_err(|error| error.at(place))?;
    parts.into_iter().map(|part| one(part, outline.clone(), settings)).collect()
}

fn one(regular: Regular, outline: RawRecord, settings: &Settings) -> Result<Intake> {
    let Regular { record, rows, repairs, segment, .. } = regular;
    refuse_notes(settings, record.findings())?;
    Ok(Intake { record, rows, repairs, segment, outline })
}

/// The input's path, where it is a file.
pub fn path_of(input: &Input) -> Option<PathBuf> {
    match input {
        Input::Path(path) => Some(path.clone()),
        Input::Stream(_) => None,
    }
}

/// Notes on a file that follow from an option, not from what the file is like.
const ASKED_FOR: &[&str] = &[
    "rate_overrides_stamps",
    "filled",
    "much_filled",
    "repair_near_end",
    "repeats_dropped",
    "segment",
    "rows_left_out",
    "short_stretch",
    "lost_rows",
    "truncated",
];

/// With `--strict` the first remark is an error: of the file where one is about the file, of the request otherwise.
pub fn refuse_notes(settings: &Settings, findings: &[Finding]) -> Result<()> {
    let of_the_file = findings.iter().find(|f| f.place.file.is_some() && !ASKED_FOR.contains(&f.code));
    let Some(finding) = of_the_file.or(findings.first()).filter(|_| settings.strict) else { return Ok(()) };
    let more = findings.len() - 1;
    let also = if more > 0 { format!(" (and {more} more)") } else { String::new() };
    let what = format!("{}{also}", finding.text);
    let (error, remedy) = match of_the_file {
        Some(_) => (Error::malformed(what), "--strict refuses what would otherwise be a note"),
        None => (Error::usage(what), "--strict refuses notes: give up the option that led to this one, or --strict"),
    };
    Err(error.at(finding.place.clone()).remedy(remedy))
}
