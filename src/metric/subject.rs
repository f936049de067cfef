//! What is measured: a record under one choice of ends, after its baseline is split off.

use crate::baseline::{Baseline, EndEstimates};
use crate::basis::Planner;
use crate::ends::Ends;
use crate::error::Result;
use crate::numeric::sum;

/// A record in the basis of its ends.
pub struct Subject<'a> {
    /// The record.
    pub samples: &'a [f64],
    /// What is assumed past its ends.
    pub ends: Ends,
    /// What was split off.
    pub baseline: &'a Baseline,
    /// Values and slopes at its ends.
    pub estimates: &'a EndEstimates,
    /// Orthonormal coefficients of the remainder.
    pub coefficients: Vec<f64>,
    /// Mean square of the record about its mean.
    pub variance: f64,
    /// The remainder is rounding: nothing is left to be seen in its coefficients.
    pub is_spent: bool,
}

impl<'a> Subject<'a> {
    /// Transforms the remainder of a record.
    ///
    /// # Errors
    /// `Unsupported` for a record of no samples.
    pub fn of(
        samples: &'a [f64],
        ends: Ends,
        baseline: &'a Baseline,
        estimates: &'a EndEstimates,
        planner: &Planner,
    ) -> Result<Subject<'a>> {
        let plan = planner.plan(ends, samples.len())?;
        let split = baseline.polynomial();
        let at = |n: usize| n as f64 + ends.first_position();
        let mut coefficients: Vec<f64> = samples.iter().enumerate().map(|(n, v)| v - split.at(at(n))).collect();
        // A few roundings of the largest sample are all that is left of a record that its baseline explains.
        let largest = samples.iter().map(|v| v.abs()).fold(0.0, f64::max);
        let is_spent = coefficients.iter().all(|r| r.abs() <= 16.0 * f64::EPSILON * largest);
        plan.forward(&mut coefficients, &mut vec![0.0; plan.scratch_len()]);
        let variance = sum::standard_deviation(samples).powi(2);
        Ok(Subject { samples, ends, baseline, estimates, coefficients, variance, is_spent })
    }

    /// Half cycles per record of basis function `k`.
    pub fn half_cycles(&self, k: usize) -> f64 {
        2.0 * self.ends.length(self.samples.len()) * self.ends.frequency(self.samples.len(), k)
    }
}
