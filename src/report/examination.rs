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
    /// What was found.
    #[serde(flatten)]
    pub audit: Audit,
}
