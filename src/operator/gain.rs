//! What an operator does to each frequency: a real gain, and its exact action on polynomials.

use crate::numeric::polynomial::Polynomial;

/// A real gain per frequency, resolved to cycles per sample.
pub trait Gain: std::fmt::Debug + Send + Sync {
    /// Gain at `f` cycles per sample, 0..=0.5.
    fn at(&self, f: f64) -> f64;

    /// Taylor series of the gain at zero frequency.
    fn series(&self) -> Series;

    /// About how far the impulse response extends to each side, in samples: at least the 99.9 % reach, at most about
    /// twice that; infinite where the gain jumps. It sizes the grids on which reaches are measured.
    fn extent_samples(&self) -> f64;

    /// Highest frequency at which the gain has structure, in cycles per sample.
    fn highest(&self) -> f64;
}

/// G(w) = s0 + s2 w^2 + s4 w^4 + ..., w in radians per sample: an even gain near zero frequency.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Series {
    /// The gain at zero frequency.
    pub s0: f64,
    /// Coefficient of w^2.
    pub s2: f64,
    /// Coefficient of w^4.
    pub s4: f64,
}

impl Series {
    /// Gain 1 at every frequency.
    pub const ONE: Series = Series { s0: 1.0, s2: 0.0, s4: 0.0 };
    /// Gain 0 at every frequency.
    pub const ZERO: Series = Series { s0: 0.0, s2: 0.0, s4: 0.0 };

    /// The series of a gain s0 + c2 f^2 + c4 f^4 with f in cycles per sample.
    pub fn of_cycles(s0: f64, c2: f64, c4: f64) -> Series {
        let square = std::f64::consts::TAU * std::f64::consts::TAU;
        Series { s0, s2: c2 / square, s4: c4 / (square * square) }
    }

    /// The series of the product of two gains.
    #[must_use]
    pub fn times(self, other: Series) -> Series {
        Series {
            s0: self.s0 * other.s0,
            s2: self.s0 * other.s2 + self.s2 * other.s0,
            s4: self.s0 * other.s4 + self.s2 * other.s2 + self.s4 * other.s0,
        }
    }

    /// The series of 1 - G.
    #[must_use]
    pub fn complement(self) -> Series {
        Series { s0: 1.0 - self.s0, s2: -self.s2, s4: -self.s4 }
    }

    /// What the gain makes of the polynomial `b`: s0 b - s2 b'' + s4 b'''', exact up to degree 5, since d/dx acts as
    /// i w. `step` is the sampling step in the unit of b's own variable: 1 when b is in samples.
    pub fn carry(self, b: &Polynomial, step: f64) -> Polynomial {
        let second = b.derivative().derivative();
        let fourth = second.derivative().derivative();
        let square = step * step;
        b.scaled(self.s0).plus(&second.scaled(-self.s2 * square)).plus(&fourth.scaled(self.s4 * square * square))
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn polynomials_pass_a_three_point_mean_as_its_series_says() {
        // The kernel (1/4, 1/2, 1/4) has the gain (1 + cos w)/2 = 1 - w^2/4 + w^4/48; on powers of n the weighted mean
        // is plain arithmetic. Degree 5 at most: b'''' then has degree 1 and b^(6) vanishes.
        let series = Series { s0: 1.0, s2: -0.25, s4: 1.0 / 48.0 };
        let b = Polynomial::from_powers(20.0, &[3.0, -2.0, 0.5, 0.25, -0.02, 0.001]);
        let carried = series.carry(&b, 1.0);
        for n in 0..=20 {
            let n = f64::from(n);
            let mean = 0.25 * b.at(n - 1.0) + 0.5 * b.at(n) + 0.25 * b.at(n + 1.0);
            // Values reach 1e3; ten roundings each.
            assert!((carried.at(n) - mean).abs() < 1e-11, "{n}: {} {mean}", carried.at(n));
        }
        // The same record with stamps 0.01 apart.
        let stamped = Polynomial::from_powers(0.2, &[3.0, -200.0, 5e3, 2.5e5, -2e6, 1e7]);
        let carried = series.carry(&stamped, 0.01);
        for n in 0..=20 {
            let x = f64::from(n) * 0.01;
            let mean = 0.25 * stamped.at(x - 0.01) + 0.5 * stamped.at(x) + 0.25 * stamped.at(x + 0.01);
            assert!((carried.at(x) - mean).abs() < 1e-11);
        }
    }
}
