//! An integral as plain data: the constants that its end conditions asked for, and how uncertain noise leaves it.

use serde::Serialize;

use crate::audit::endstate::EndState;
use crate::unit::Unit;

/// The integral of one channel. "First" is the velocity of an acceleration record, "second" its displacement.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct IntegralReport {
    /// Integrals: 1 or 2.
    pub times: i32,
    /// End conditions as written.
    pub conditions: String,
    /// What the record does at its ends; null where it is too short or constant.
    pub end_state: Option<EndState>,
    /// Value of the first integral at the start.
    pub initial_first: Amount,
    /// Value of the second integral at the start; null for a single integral.
    pub initial_second: Option<Amount>,
    /// Offset of the sensor that was taken off.
    pub offset: Amount,
    /// Drift of the sensor that was taken off, per unit of the axis about the middle.
    pub drift: Amount,
    /// Value of the first integral at the end, before a high-pass.
    pub final_first: Amount,
    /// Value of the second integral at the end, before a high-pass; null for a single integral.
    pub final_second: Option<Amount>,
    /// Standard deviation of the white noise a sample that the uncertainty rests on.
    pub noise: Amount,
    /// One-sided density of that noise, square root, per root of a cycle per second or metre.
    pub noise_density: f64,
    /// Standard deviation of the result from that noise alone.
    pub sigma: SigmaReport,
    /// The high-pass that leaves the wanted standard deviation away from the ends; null where there is no noise.
    pub corner: Option<CornerReport>,
    /// Largest value of the result.
    pub peak: f64,
    /// Share of the result's mean square that is slower than one cycle in the record: the end conditions decide it.
    pub slow_share: f64,
    /// Largest difference between the result and the integral of the corrected record, whose free constants are fitted.
    pub reintegration_difference: f64,
    /// The same relative to the peak.
    pub reintegration_relative: f64,
}

/// A value and its unit.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct Amount {
    /// The value.
    pub value: f64,
    /// Its unit.
    pub unit: Unit,
}

/// A standard deviation along the record, in the unit of the result.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct SigmaReport {
    /// Largest.
    pub largest: f64,
    /// Its stamp, in the axis unit.
    pub at: f64,
    /// At the first sample.
    pub first: f64,
    /// In the middle.
    pub middle: f64,
    /// At the last sample.
    pub last: f64,
    /// The largest relative to the peak of the result.
    pub relative: f64,
}

/// A high-pass corner for a wanted standard deviation.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct CornerReport {
    /// The wanted standard deviation, in the unit of the result.
    pub sigma: f64,
    /// The corner, in `unit`, for the shape of the run.
    pub frequency: f64,
    /// `Hz` or `1/m`.
    pub unit: &'static str,
}
