//! The result of an audit as plain data.

use serde::Serialize;

use crate::audit::Audit;
use crate::error::{Error, Kind};
use crate::report::{AxisReport, SCHEMA, Tool};

/// One file of an audit.
#[derive(Debug, Clone, Serialize)]
#[serde(untagged)]
pub enum Audited {
    /// It was read.
    Read(Box<AuditReport>),
    /// It could not be read at all.
    Refused(RefusedReport),
}

impl Audited {
    /// A file that could not be read.
    pub fn refused(path: &str, error: &Error) -> Audited {
        let (kind, text) = (error.kind(), error.to_string());
        Audited::Refused(RefusedReport {
            schema: SCHEMA,
            tool: Tool::THIS,
            command: "audit",
            path: path.to_owned(),
            kind,
            error: text,
        })
    }
}

/// A file that could not be read.
#[derive(Debug, Clone, Serialize)]
pub struct RefusedReport {
    /// Version of the layout.
    pub schema: u32,
    /// What made it.
    pub tool: Tool,
    /// `audit`.
    pub command: &'static str,
    /// Path as given.
    pub path: String,
    /// The kind of fault.
    pub kind: Kind,
    /// Where, what, and what would settle it.
    pub error: String,
}

/// One audited file.
#[derive(Debug, Clone, Serialize)]
pub struct AuditReport {
    /// Version of the layout.
    pub schema: u32,
    /// What made it.
    pub tool: Tool,
    /// `audit`.
    pub command: &'static str,
    /// Path as given.
    pub path: String,
    /// SHA-256 of the bytes as stored.
    pub sha256: String,
    /// Bytes as stored.
    pub bytes: u64,
    /// `csv` or `wav`.
    pub format: crate::record::Format,
    /// The axis a run would use; null where a run would refuse the record.
    pub axis: Option<AxisReport>,
    /// Why a run would refuse it; null where it would not.
    pub refusal: Option<String>,
    /// One entry for each rate in the file, in the order of its first channel.
    pub records: Vec<RecordReport>,
    /// Where each unit came from, by channel: `header`, `option`, `format` (full scale of a WAV file), or null.
    pub unit_sources: Vec<Option<&'static str>>,
    /// False where `--require clean` was not met.
    pub requirement_met: bool,
    /// What was found.
    #[serde(flatten)]
    pub audit: Audit,
}

/// The channels of a file that share one rate, as a run would take them.
#[derive(Debug, Clone, Serialize)]
pub struct RecordReport {
    /// Names of the channels.
    pub channels: Vec<String>,
    /// The axis a run would use; null where a run would refuse the record.
    pub axis: Option<AxisReport>,
    /// Samples a channel of that axis.
    pub samples: usize,
    /// Parts between gaps; more than 1 with `--gaps split` only.
    pub parts: usize,
    /// Samples of all channels that a run would fill in.
    pub repaired: usize,
    /// Why a run would refuse it; null where it would not.
    pub refusal: Option<String>,
}
