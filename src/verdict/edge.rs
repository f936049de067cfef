//! What one extension costs at the edges: predicted error, its bound, whether that is tolerable, and the trusted span.

use std::borrow::Cow;

use serde::Serialize;

use crate::baseline::Side;

use super::difference::Difference;

/// The bound is this many predicted errors of the forecast, so that the poorest operator and length of the trial records
/// are still covered in 95 of 100 cases.
const BOUND: f64 = 2.6;
/// The share of a symmetric extension's own distance from the forecast that counts with the predicted error.
const DISTANCE_SHARE: f64 = 0.5;
/// Standard deviations added to the distance from the forecast when the ends are trimmed.
const TRUST: f64 = 2.5;
/// The same where the forecast itself is the extension.
const TRUST_FORECAST: f64 = 3.5;
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

impl Adequacy {
    /// In words.
    pub fn word(self) -> &'static str {
        match self {
            Adequacy::Within => "within tolerance",
            Adequacy::Borderline => "borderline",
            Adequacy::Outside => "outside tolerance",
        }
    }

    /// A bound that is not finite keeps nothing within any tolerance, however large.
    fn of(predicted_error: f64, bound: f64, tolerance: f64) -> Adequacy {
        if bound.is_finite() && bound <= tolerance {
            Adequacy::Within
        } else if !bound.is_finite() || OUTSIDE * predicted_error > tolerance {
            Adequacy::Outside
        } else {
            Adequacy::Borderline
        }
    }
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
    pub name: Cow<'static, str>,
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

/// What all extensions of one record and operator share: enough to judge any further one from its output.
#[derive(Debug, Clone, PartialEq)]
pub struct Scene {
    /// Predicted RMS error of the forecast over both zones.
    pub(super) forecast_error: f64,
    /// Standard deviation of the output under the forecast, by distance from the left and the right end.
    pub(super) deviations: [Vec<f64>; 2],
    pub(super) len: usize,
    pub(super) zone: usize,
    pub(super) trimmable: usize,
    /// The reach is the whole record or more.
    pub(super) reach_exceeds_record: bool,
    /// RMS distance from even to forecast over the zones.
    pub(super) even_distance: f64,
    pub(super) output_deviation: f64,
    pub(super) tolerance: f64,
}

impl Scene {
    /// The edges of any continuation, from the whole output under it and under the forecast, both as long as the record.
    pub fn judge(&self, name: impl Into<Cow<'static, str>>, output: &[f64], foretold: &[f64]) -> Edge {
        let difference = Difference::between(output, foretold, self.trimmable.max(self.zone));
        self.edge(name, Some(&difference))
    }

    /// Standard deviation that the forecast gives the output, by distance from the left and the right end.
    pub fn deviations(&self) -> &[Vec<f64>; 2] {
        &self.deviations
    }

    /// One extension, from its difference to the forecast; `None` for the forecast itself.
    pub(super) fn edge(&self, name: impl Into<Cow<'static, str>>, difference: Option<&Difference>) -> Edge {
        let distance = difference.map_or(0.0, |d| d.rms(self.zone));
        let own = self.forecast_error;
        let predicted_error = own.hypot(distance);
        // Where the reach exceeds the record, the error far outside counts as well: it is of the size by which even and
        // forecast differ.
        let far = if self.reach_exceeds_record { self.even_distance } else { 0.0 };
        let bound = BOUND * own.hypot(far).hypot(DISTANCE_SHARE * distance);
        Edge {
            name: name.into(),
            predicted_error,
            relative_error: predicted_error / self.output_deviation,
            bound,
            adequacy: Adequacy::of(predicted_error, bound, self.tolerance),
            trusted: self.trusted(difference),
        }
    }

    /// Each end is trimmed up to the last place whose bound exceeds the tolerance, at most over the reach.
    fn trusted(&self, difference: Option<&Difference>) -> Option<Trusted> {
        let trim = |side: Side| {
            let deviations = &self.deviations[side as usize];
            let bound = |j: usize| {
                let deviation = deviations.get(j).copied().unwrap_or(0.0);
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

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn an_infinite_bound_is_within_no_tolerance() {
        for (predicted, bound) in [(f64::INFINITY, f64::INFINITY), (1.0, f64::INFINITY), (f64::NAN, f64::NAN)] {
            assert_eq!(Adequacy::of(predicted, bound, f64::INFINITY), Adequacy::Outside);
        }
        assert_eq!(Adequacy::of(1.0, 2.6, f64::INFINITY), Adequacy::Within);
        assert_eq!(Adequacy::of(1.0, 2.6, 2.0), Adequacy::Borderline);
    }
}
