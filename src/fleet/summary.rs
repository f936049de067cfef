//! A merged batch as plain data: what its JSON and its page show.

use std::collections::BTreeMap;

use serde::Serialize;
use serde_json::{Map, Value};

use crate::fleet::ranking::Ranked;
use crate::report::Tool;

/// The overview of a batch. The same results give the same summary, in whatever order they were joined.
#[derive(Debug, Clone, Serialize)]
pub struct Summary {
    /// Version of the layout.
    pub schema: u32,
    /// What made it.
    pub tool: Tool,
    /// `merge`.
    pub command: &'static str,
    /// Records of the list.
    pub records: u64,
    /// Conditioned, their outputs as told.
    pub done: u64,
    /// Earlier records under another name.
    pub repeated: u64,
    /// Failed in every attempt.
    pub failed: u64,
    /// Conditioned, but below `--require`.
    pub below_requirement: u64,
    /// Without a result, or without the output that it tells of.
    pub missing: u64,
    /// Results beside the one that stands for the same record.
    pub doubled: u64,
    /// Results that no record of the list answers to.
    pub extra: u64,
    /// Failures by kind.
    pub failures: Vec<FailureGroup>,
    /// The first few of what is missing: number, name, reason.
    pub redo: Vec<(u64, String, &'static str)>,
    /// Channels by adequacy.
    pub adequacies: BTreeMap<String, u64>,
    /// Channels by extension and who chose it.
    pub extensions: BTreeMap<String, u64>,
    /// Records by the codes of their remarks.
    pub notes: BTreeMap<String, u64>,
    /// Remarks on the results themselves.
    pub remarks: Vec<String>,
    /// Edge errors over all judged channels.
    pub edge_error_percent_of_tolerance: Option<EdgeErrors>,
    /// The worst channels, worst first, at most 200.
    pub worst: Vec<Ranked>,
    /// The settings that all records share.
    pub settings: Map<String, Value>,
    /// Those in which they differ.
    pub differing_settings: Vec<String>,
    /// What results of this kind may and may not be used for.
    pub caution: &'static str,
}

/// Edge errors in per cent of their tolerance, each the value of some channel.
#[derive(Debug, Clone, Copy, PartialEq, Serialize)]
pub struct EdgeErrors {
    /// Half of the channels are at or below it.
    pub median: f64,
    /// 95 of 100 are.
    pub high: f64,
    /// All are.
    pub worst: f64,
}

/// Failures of one kind, with the first as an example.
#[derive(Debug, Clone, Default, PartialEq, Eq, Serialize)]
pub struct FailureGroup {
    /// The kind of fault.
    pub kind: String,
    /// How many.
    pub count: u64,
    /// The record.
    pub path: String,
    /// Where in it; empty where there is no place.
    pub place: String,
    /// What.
    pub text: String,
    /// What would settle it.
    pub remedy: Option<String>,
}
