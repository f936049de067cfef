//! The coefficients of a record in the basis that belongs to its ends, with frequency, half-cycles and wavelength.

use crate::basis::{Planner, amplitude};
use crate::ends::{Ends, Parity};
use crate::error::Result;
use crate::numeric::polynomial::Polynomial;
use crate::numeric::sum;

/// A record in a basis; normalisation as in [`crate::basis`].
#[derive(Debug, Clone)]
pub struct Coefficients {
    /// The ends that were assumed.
    pub ends: Ends,
    /// Orthonormal coefficients, in the unit of the samples.
    pub values: Vec<f64>,
    /// Sum of w x^2 over the samples without the baseline: equals the sum of the squared coefficients.
    pub energy: f64,
}

/// One coefficient.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Coefficient {
    /// Its index from 0.
    pub index: usize,
    /// Frequency in cycles per sample.
    pub frequency: f64,
    /// Half-cycles between the mirrors, or twice the cycles in a period.
    pub half_cycles: f64,
    /// True for a cosine about the left mirror (of a periodic record: about the first sample).
    pub cosine: bool,
    /// The orthonormal coefficient.
    pub value: f64,
    /// The same as the amplitude of its cosine or sine.
    pub amplitude: f64,
}

impl Coefficients {
    /// Of `samples` without `baseline`, a polynomial in steps from the left mirror.
    ///
    /// # Errors
    /// `Unsupported` for a record of no samples.
    pub fn of(samples: &[f64], ends: Ends, baseline: &Polynomial, planner: &Planner) -> Result<Coefficients> {
        let len = samples.len();
        let first = ends.first_position();
        let mut values: Vec<f64> = samples.iter().enumerate().map(|(n, v)| v - baseline.at(n as f64 + first)).collect();
        let weighted: Vec<f64> = values.iter().enumerate().map(|(n, v)| ends.weight(len, n) * v * v).collect();
        let energy = sum::sum(&weighted);
        let plan = planner.plan(ends, len)?;
        plan.forward(&mut values, &mut vec![0.0; plan.scratch_len()]);
        Ok(Coefficients { ends, values, energy })
    }

    /// Coefficient `index`.
    pub fn at(&self, index: usize) -> Coefficient {
        let len = self.values.len();
        let frequency = self.ends.frequency(len, index);
        Coefficient {
            index,
            frequency,
            half_cycles: 2.0 * frequency * self.ends.length(len),
            cosine: match self.ends {
                Ends::Periodic => index == 0 || index % 2 == 1,
                Ends::Mirror { left, .. } => left == Parity::Even,
            },
            value: self.values[index],
            amplitude: self.values[index] * amplitude(self.ends, len, index),
        }
    }

    /// Share of the energy that a coefficient holds; 0 of a record without any.
    pub fn share(&self, index: usize) -> f64 {
        if self.energy > 0.0 { self.values[index] * self.values[index] / self.energy } else { 0.0 }
    }

    /// The coefficients of most energy, largest first; equal ones by index.
    pub fn largest(&self, count: usize) -> Vec<Coefficient> {
        let mut order: Vec<usize> = (0..self.values.len()).collect();
        order.sort_by(|&a, &b| self.values[b].abs().total_cmp(&self.values[a].abs()).then(a.cmp(&b)));
        order.truncate(count);
        order.into_iter().map(|index| self.at(index)).collect()
    }

    /// Relative difference between the energy of samples and coefficients: rounding only.
    pub fn parseval(&self) -> f64 {
        if self.energy > 0.0 { (sum::sum_of_squares(&self.values) - self.energy).abs() / self.energy } else { 0.0 }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn half_cycles_and_amplitude_of_a_cosine_between_even_mirrors() {
        // 17 half-cycles of amplitude 3 sampled midway: one coefficient, ortho value 3 sqrt(N/2); the real DFT leaks.
        let len = 200;
        let wave: Vec<f64> =
            (0..len).map(|n| 3.0 * (std::f64::consts::PI * 17.0 * (n as f64 + 0.5) / len as f64).cos()).collect();
        let nothing = Polynomial::zero(len as f64);
        let even = Coefficients::of(&wave, Ends::EVEN, &nothing, &Planner::new()).unwrap();
        let top = even.largest(2);
        assert_eq!((top[0].index, top[0].half_cycles, top[0].cosine), (17, 17.0, true));
        assert!((top[0].amplitude - 3.0).abs() < 1e-12 && (top[0].value - 3.0 * 10.0).abs() < 1e-12);
        assert!(top[1].value.abs() < 1e-12 && even.parseval() < 1e-14);
        let periodic = Coefficients::of(&wave, Ends::Periodic, &nothing, &Planner::new()).unwrap();
        assert!(periodic.largest(6)[5].value.abs() > 0.5, "an odd number of half-cycles leaks in a period");
    }
}
