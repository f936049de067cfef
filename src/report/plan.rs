//! A resolved plan as plain data: what a run would do.

use serde::Serialize;

use crate::error::Finding;
use crate::operator::{ChainDescription, CheckPoint};
use crate::report::{DespikeReport, ExtensionReport, InputReport, SmoothReport};
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
    /// Channels that would be conditioned.
    pub channels: Vec<PlannedChannel>,
}

/// One channel of a plan.
#[derive(Debug, Clone, Serialize)]
pub struct PlannedChannel {
    /// Name.
    pub name: String,
    /// Unit that comes out.
    pub unit: Unit,
    /// Assumption past the ends.
    pub extension: ExtensionReport,
    /// Spelling of the baseline.
    pub baseline: String,
    /// Spikes that would be replaced.
    pub despike: Option<DespikeReport>,
    /// Smoothing, its strength found.
    pub smoothing: Option<SmoothReport>,
    /// The verdict in one sentence; null where nothing is judged.
    pub verdict: Option<String>,
    /// Remarks on this channel.
    pub notes: Vec<Finding>,
}
