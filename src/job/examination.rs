//! `audit`: what is in a record, and whether a run would take it.

use crate::audit;
use crate::error::{Error, Result};
use crate::job::intake;
use crate::place::Place;
use crate::read::{self, Input};
use crate::regularise;
use crate::report::{AuditReport, AxisReport, SCHEMA, Tool};
use crate::settings::Settings;

/// Audits one file.
///
/// # Errors
/// Where the file cannot be read at all, and with `--strict` for the first remark.
pub fn audit(input: Input, settings: &Settings) -> Result<AuditReport> {
    let raw = read::read(input, &settings.read)?;
    let audit = audit::audit(&raw);
    intake::refuse_notes(settings, &audit.findings)?;
    let source = raw.source.clone();
    let place = Place::file(&source.path);
    let regular = regularise::regularise(raw, &settings.regularise).map_err(|error| error.at(place));
    let (axis, refusal) = match &regular {
        Ok((record, _)) => (Some(AxisReport::new(record.axis())), None),
        Err(error) => (None, Some(Error::to_string(error))),
    };
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
        audit,
    })
}
