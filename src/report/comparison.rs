//! The result of a comparison of extensions as plain data.

use serde::Serialize;
use serde_json::{Map, Value};

use crate::baseline::EndEstimates;
use crate::compare::EndStanding;
use crate::error::Finding;
use crate::operator::ChainDescription;
use crate::report::{InputReport, Tool, TrustedReport, VerdictReport};
use crate::unit::Unit;
use crate::verdict::{Adequacy, Edge, Unjudged};

/// Every extension side by side.
#[derive(Debug, Clone, Serialize)]
pub struct Comparison {
    /// Version of the layout.
    pub schema: u32,
    /// What made it.
    pub tool: Tool,
    /// `compare`.
    pub command: &'static str,
    /// Every setting as resolved.
    pub settings: Map<String, Value>,
    /// What was read.
    pub input: InputReport,
    /// Remarks.
    pub notes: Vec<Finding>,
    /// The resolved operators.
    pub chain: ChainDescription,
    /// One entry a channel.
    pub channels: Vec<ChannelComparison>,
    /// False where `--require` was not met by what `condition` would take.
    pub requirement_met: bool,
    /// The channels that would not meet it, and why.
    pub unmet: Vec<Finding>,
    /// What results of this kind may and may not be used for.
    pub caution: &'static str,
}

/// One channel under every extension.
#[derive(Debug, Clone, Serialize)]
pub struct ChannelComparison {
    /// Name.
    pub name: String,
    /// Unit of the output.
    pub unit: Unit,
    /// Unit of the record.
    pub unit_in: Unit,
    /// What `condition` would take.
    pub takes: String,
    /// The verdict; null where the chain has nothing to judge.
    pub verdict: Option<VerdictReport>,
    /// Why nothing is known about the edges of what `condition` would take; null where they were judged.
    pub not_judged: Option<Unjudged>,
    /// How each assertion stands against the record, end by end.
    pub assertions: Vec<EndStanding>,
    /// Remarks on this channel.
    pub notes: Vec<Finding>,
    /// Edges of what `condition` would take: one of the candidates, or a continuation of its own.
    pub used: Option<Edge>,
    /// One row an extension: the candidates, the forecast, and the references.
    pub candidates: Vec<Row>,
    /// Values, slopes and levels at the half-sample mirrors (slopes per step), with standard errors and the noise sigma.
    pub edge: Option<EndEstimates>,
    /// Differences of the end values and slopes, with standard errors.
    pub jump: Option<Jump>,
    /// Whether leakage speaks against repeating the record; null where it does not.
    pub veto: Option<Veto>,
    /// Trusted span of what `condition` would take.
    pub trusted: Option<TrustedReport>,
}

/// Leakage against an extension: measured on many records, an excess 3 dB above that of even means that periodic is truly
/// the worse of the two in 92 of 100 cases or more.
#[derive(Debug, Clone, Copy, PartialEq, Serialize)]
pub struct Veto {
    /// The extension that it speaks against.
    pub extension: &'static str,
    /// Its leakage excess above that of even, in decibels.
    pub excess_over_even_db: f64,
}

impl Veto {
    /// Smallest difference that tells anything.
    const LEAST_DB: f64 = 3.0;

    /// From the leakage excess of periodic and of even.
    pub fn of(periodic_db: f64, even_db: f64) -> Option<Veto> {
        let excess_over_even_db = periodic_db - even_db;
        (excess_over_even_db >= Self::LEAST_DB).then_some(Veto { extension: "periodic", excess_over_even_db })
    }
}

/// How the right end differs from the left: what a periodic extension would join.
#[derive(Debug, Clone, Copy, Serialize)]
pub struct Jump {
    /// Difference of the end values, in the unit of the record.
    pub value: f64,
    /// Its standard error.
    pub value_error: f64,
    /// Difference of the end slopes, per step.
    pub slope: f64,
    /// Its standard error.
    pub slope_error: f64,
}

impl Jump {
    /// From the end estimates.
    pub fn of(ends: &EndEstimates) -> Jump {
        Jump {
            value: ends.right.value - ends.left.value,
            value_error: ends.right.value_error.hypot(ends.left.value_error),
            slope: ends.right.slope - ends.left.slope,
            slope_error: ends.right.slope_error.hypot(ends.left.slope_error),
        }
    }
}

/// One extension.
#[derive(Debug, Clone, Serialize)]
pub struct Row {
    /// Name.
    pub name: &'static str,
    /// True for a row that is shown for reference and never picked.
    pub reference: bool,
    /// Predicted RMS error over both edge zones, in the unit of the output; null where nothing was judged.
    pub predicted_error: Option<f64>,
    /// The same relative to the output's standard deviation.
    pub relative_error: Option<f64>,
    /// What the error stays below in about 95 of 100 cases.
    pub bound: Option<f64>,
    /// Against the tolerance.
    pub adequacy: Option<Adequacy>,
    /// Its trusted span.
    pub trusted: Option<TrustedReport>,
    /// Explanations by name: jumps, leakage, decay; null where the extension has no basis of its own.
    pub metrics: Map<String, Value>,
}
