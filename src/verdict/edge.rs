//! What one extension costs at the edges: predicted error, its bound, whether that is tolerable, and the trusted span.

use serde::Serialize;

use crate::baseline::Side;
use crate::forecast::Forecast;

use super::difference::Difference;

/// The bound is this many predicted errors of the forecast, so that the poorest operator and length of the trial records
/// are still covered in 95 of 100 cases.
const BOUND: f64 = 2.6;
/// The share of a symmetric extension's own distance from the forecast that counts with the predicted error.
const DISTANCE_SHARE: f64 = 0.5;
/// Standard deviations added to the distance from the forecast when the ends are trimmed.
const TRUST: f64 = 2.5;
/// The same where the forecast itself is the extension.
const TRUST_FORECAST: f64 = 3.0;
/// An error is outside tolerance when this share of it already is.
const OUTSIDE: f64 = 0.5;

/// Whether an edge error is tolerable.
#[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord, Serialize)]
#[serde(rename_all = "snake_case")]
pub enum Adequacy {
    /// The bound is within the tolerance.
    Within,
    /// Neither clearly within nor clearly outside.
    Borderline,
    /// Half the predicted error already exceeds the tolerance.
    Outside,
}

/// First and last sample whose error stays within tolerance; `None` where no sample does.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Serialize)]
pub struct Trusted {
    /// First trusted sample.
    pub first: usize,
    /// Last trusted sample.
    pub last: usize,
}

/// One extension at the edges, in the unit of the output.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct Edge {
    /// Name of the extension.
    pub name: &'static str,
    /// Predicted RMS error over both edge zones.
    pub predicted_error: f64,
    /// The same relative to the output's standard deviation.
    pub relative_error: f64,
    /// What the error stays below in about 95 of 100 cases, events outside the record excepted.
    pub bound: f64,
    /// Against the tolerance.
    pub adequacy: Adequacy,
    /// The span whose every sample is expected to be within tolerance.
    pub trusted: Option<Trusted>,
}

/// What all extensions of one record and operator share.
pub(super) struct Scene<'a> {
    pub forecast: &'a Forecast,
    pub len: usize,
    pub zone: usize,
    pub trimmable: usize,
    /// The reach is the whole record or more.
    pub reach_exceeds_record: bool,
    /// RMS distance from even to forecast over the zones.
    pub even_distance: f64,
    pub output_deviation: f64,
    pub tolerance: f64,
}

impl Scene<'_> {
    /// Predicted RMS error of the forecast, at least 1e-4 of the output's standard deviation.
    pub fn forecast_error(&self) -> f64 {
        self.forecast.predicted_error().max(1e-4 * self.output_deviation)
    }

    /// One extension, from its difference to the forecast; `None` for the forecast itself.
    pub fn edge(&self, name: &'static str, difference: Option<&Difference>) -> Edge {
        let distance = difference.map_or(0.0, |d| d.rms(self.zone));
        let own = self.forecast_error();
        let predicted_error = own.hypot(distance);
        // Where the reach exceeds the record, the error far outside counts as well: it is of the size by which even and
        // forecast differ.
        let far = if self.reach_exceeds_record { self.even_distance } else { 0.0 };
        let bound = BOUND * own.hypot(far).hypot(DISTANCE_SHARE * distance);
        let adequacy = if bound <= self.tolerance {
            Adequacy::Within
        } else if OUTSIDE * predicted_error > self.tolerance {
            Adequacy::Outside
        } else {
            Adequacy::Borderline
        };
        Edge {
            name,
            predicted_error,
            relative_error: predicted_error / self.output_deviation,
            bound,
            adequacy,
            trusted: self.trusted(difference),
        }
    }

    /// Each end is trimmed up to the last place whose bound exceeds the tolerance, at most over the reach.
    fn trusted(&self, difference: Option<&Difference>) -> Option<Trusted> {
        let trim = |side: Side| {
            let profile = self.forecast.profile(side);
            let bound = |j: usize| {
                let deviation = profile.get(j).copied().unwrap_or(0.0).sqrt();
                match difference {
                    Some(difference) => difference.at(side, j).abs() + TRUST * deviation,
                    None => TRUST_FORECAST * deviation,
                }
            };
            (0..self.trimmable).rev().find(|&j| bound(j) > self.tolerance).map_or(0, |j| j + 1)
        };
        let (first, right) = (trim(Side::Left), trim(Side::Right));
        (first + right < self.len).then(|| Trusted { first, last: self.len - 1 - right })
    }
}
