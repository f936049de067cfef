//! The result of an audit as plain data.

use serde::Serialize;
use serde_json::{Map, Value};

use crate::audit::Audit;
use crate::report::{AxisReport, Tool};

/// One audited file.
#[derive(Debug, Clone, Serialize)]
pub struct AuditReport {
    /// Version of the layout.
    pub schema: u32,
    /// What made it.
    pub tool: Tool,
    /// `audit`.
    pub command: &'static str,
    /// Every setting as resolved.
    pub settings: Map<String, Value>,
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
