//! A resolved plan as plain data: what a run would do.

use serde::Serialize;

use crate::error::Finding;
use crate::operator::{ChainDescription, CheckPoint};
use crate::report::{ExtensionReport, How, InputReport};
use crate::unit::Unit;

/// What `condition` would do, without doing it.
#[derive(Debug, Clone, Serialize)]
pub struct Plan {
    /// What was read.
    pub input: InputReport,
    /// Remarks so far.
    pub notes: Vec<Finding>,
    /// The resolved operators.
    pub chain: ChainDescription,
    /// Composite gain at and around each corner.
    pub gains: Vec<CheckPoint>,
    /// Assumption past the ends.
    pub extension: ExtensionReport,
    /// Spelling of the baseline, and who chose it.
    pub baseline: (String, How),
    /// Channels that would be conditioned, with the unit that comes out.
    pub channels: Vec<(String, Unit)>,
}
