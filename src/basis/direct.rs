//! The bases by their definition, one cosine at a time: slow, never optimised, the yardstick of the fast transforms.

use super::{amplitude, angle};
use crate::ends::{Ends, Parity, Seat};
use crate::numeric::compensated::Compensated;

/// The basis functions of a record of `len` samples on its own sample positions.
pub struct Definition {
    ends: Ends,
    len: usize,
    /// cos(2 pi i / len of the table): every angle of the basis is a whole number of these steps.
    cosines: Vec<f64>,
}

impl Definition {
    /// The definition for `len` >= 1 samples.
    pub fn new(ends: Ends, len: usize) -> Self {
        // Angle = pi (half cycles) (position) / L; both factors are halves of integers, so a turn has 8 L steps. A single
        // sample between two even mirrors on it (L = 0) has the constant only, and any table will do.
        let steps = (8.0 * ends.length(len)).max(8.0) as usize;
        let cosines = (0..steps).map(|i| angle::of_turns(i as u64, steps as u64).0).collect();
        Self { ends, len, cosines }
    }

    /// Basis function `k` at sample `n`.
    pub fn function(&self, k: usize, n: usize) -> f64 {
        let (cosine, sine) = self.cosine_sine(k, n);
        amplitude(self.ends, self.len, k) * if self.is_cosine(k) { cosine } else { sine }
    }

    /// Basis function `k` after a quarter turn, at sample `n`.
    pub fn turned(&self, k: usize, n: usize) -> f64 {
        let (cosine, sine) = self.cosine_sine(k, n);
        amplitude(self.ends, self.len, k) * if self.is_cosine(k) { sine } else { cosine }
    }

    /// Coefficient `k` of the samples `x`.
    pub fn coefficient(&self, x: &[f64], k: usize) -> f64 {
        let term = |n: usize| self.ends.weight(self.len, n) * x[n] * self.function(k, n);
        (0..self.len).map(term).collect::<Compensated>().value()
    }

    /// Sample `n` of the series with coefficients `c`.
    pub fn sample(&self, c: &[f64], n: usize) -> f64 {
        (0..self.len).map(|k| c[k] * self.function(k, n)).collect::<Compensated>().value()
    }

    /// All coefficients of the samples `x`.
    pub fn forward(&self, x: &[f64]) -> Vec<f64> {
        (0..self.len).map(|k| self.coefficient(x, k)).collect()
    }

    /// All samples of the series with coefficients `c`.
    pub fn inverse(&self, c: &[f64]) -> Vec<f64> {
        (0..self.len).map(|n| self.sample(c, n)).collect()
    }

    /// All samples of the turned series with coefficients `c`.
    pub fn inverse_turned(&self, c: &[f64]) -> Vec<f64> {
        let sample = |n: usize| (0..self.len).map(|k| c[k] * self.turned(k, n)).collect::<Compensated>().value();
        (0..self.len).map(sample).collect()
    }

    fn is_cosine(&self, k: usize) -> bool {
        match self.ends {
            Ends::Periodic => k == 0 || !k.is_multiple_of(2),
            Ends::Mirror { left, .. } => left == Parity::Even,
        }
    }

    fn cosine_sine(&self, k: usize, n: usize) -> (f64, f64) {
        // Twice the half cycles over L, and twice the position, as the table in `ends` prints them.
        let (half_cycles2, position2) = match self.ends {
            Ends::Periodic => (4 * k.div_ceil(2), 2 * n),
            Ends::Mirror { left, right, seat } => {
                let half_cycles2 = match (left, right) {
                    (Parity::Even, Parity::Even) => 2 * k,
                    (Parity::Odd, Parity::Odd) => 2 * (k + 1),
                    _ => 2 * k + 1,
                };
                let position2 = match (seat, left) {
                    (Seat::Half, _) => 2 * n + 1,
                    (Seat::Whole, Parity::Even) => 2 * n,
                    (Seat::Whole, Parity::Odd) => 2 * (n + 1),
                };
                (half_cycles2, position2)
            }
        };
        // pi (h/2)(p/2)/L radians are h p / (8 L) turns.
        let steps = self.cosines.len();
        let at = (half_cycles2 * position2) % steps;
        let quarter_back = (at + steps - steps / 4) % steps;
        (self.cosines[at], self.cosines[quarter_back])
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn every_basis_is_orthonormal_under_its_weights() {
        for ends in Ends::all() {
            for len in 1..20 {
                let basis = Definition::new(ends, len);
                for j in 0..len {
                    for k in 0..len {
                        let product: f64 =
                            (0..len).map(|n| ends.weight(len, n) * basis.function(j, n) * basis.function(k, n)).sum();
                        let expected = if j == k { 1.0 } else { 0.0 };
                        // len terms of magnitude at most 2/len, each with a few roundings.
                        assert!((product - expected).abs() < 16.0 * f64::EPSILON, "{ends:?} {len} {j} {k}: {product}");
                    }
                }
            }
        }
    }
}
