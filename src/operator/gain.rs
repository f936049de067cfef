//! What an operator does to each frequency: a gain, real unless it shifts phases, and its exact action on polynomials.

use realfft::num_complex::Complex;

use crate::numeric::polynomial::Polynomial;

/// A gain per frequency, resolved to cycles per sample.
pub trait Gain: std::fmt::Debug + Send + Sync {
    /// Gain at `f` cycles per sample, 0..=0.5: with its sign where it is real, its magnitude where it shifts phases.
    fn at(&self, f: f64) -> f64;

    /// The complex response at `f` cycles per sample: what becomes of e^(i w n). That of the reversed sign of `f` is its
    /// conjugate.
    fn response(&self, f: f64) -> Complex<f64> {
        Complex::new(self.at(f), 0.0)
    }

    /// True where the response is real everywhere: zero phase.
    fn is_real(&self) -> bool {
        true
    }

    /// Taylor series of the gain at zero frequency.
    fn series(&self) -> Series;

    /// SHA-256 of the file that the gain was read from, where it was.
    fn fingerprint(&self) -> Option<&str> {
        None
    }

    /// About how far the impulse response extends to each side, in samples: at least the 99.9 % reach, at most about
    /// twice that; infinite where the gain jumps. It sizes the grids on which reaches are measured.
    fn extent_samples(&self) -> f64;

    /// Highest frequency at which the gain has structure, in cycles per sample.
    fn highest(&self) -> f64;
}

/// G(w) = s0 + s2 w^2 + s4 w^4 + odd_0 (i w) + odd_1 (i w)^3 + odd_2 (i w)^5 + ..., w in radians per sample: a gain near
/// zero frequency. Gains without phase are even.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Series {
    /// The gain at zero frequency.
    pub s0: f64,
    /// Coefficient of w^2.
    pub s2: f64,
    /// Coefficient of w^4.
    pub s4: f64,
    /// Coefficients of (i w), (i w)^3, (i w)^5.
    pub odd: [f64; 3],
}

/// How many powers of i w a series has.
const POWERS: usize = 6;

impl Series {
    /// Gain 1 at every frequency.
    pub const ONE: Series = Series { s0: 1.0, s2: 0.0, s4: 0.0, odd: [0.0; 3] };
    /// Gain 0 at every frequency.
    pub const ZERO: Series = Series { s0: 0.0, s2: 0.0, s4: 0.0, odd: [0.0; 3] };

    /// The series of a gain s0 + c2 f^2 + c4 f^4 with f in cycles per sample.
    pub fn of_cycles(s0: f64, c2: f64, c4: f64) -> Series {
        let square = std::f64::consts::TAU * std::f64::consts::TAU;
        Series { s0, s2: c2 / square, s4: c4 / (square * square), odd: [0.0; 3] }
    }

    /// The series of numerator over denominator, both polynomials in i w (per sample), lowest power first; the
    /// denominator's constant must not be zero.
    pub fn of_quotient(numerator: &[f64], denominator: &[f64]) -> Series {
        let power = |p: &[f64], k: usize| p.get(k).copied().unwrap_or(0.0);
        let mut quotient = [0.0; POWERS];
        for k in 0..POWERS {
            let taken: f64 = (0..k).map(|j| quotient[j] * power(denominator, k - j)).sum();
            quotient[k] = (power(numerator, k) - taken) / power(denominator, 0);
        }
        Series::of_powers(quotient)
    }

    /// Coefficients of (i w)^k: what multiplies the k-th derivative of a polynomial.
    fn powers(self) -> [f64; POWERS] {
        [self.s0, self.odd[0], -self.s2, self.odd[1], self.s4, self.odd[2]]
    }

    fn of_powers(p: [f64; POWERS]) -> Series {
        Series { s0: p[0], s2: -p[2], s4: p[4], odd: [p[1], p[3], p[5]] }
    }

    /// The series of the product of two gains.
    #[must_use]
    pub fn times(self, other: Series) -> Series {
        let (a, b) = (self.powers(), other.powers());
        Series::of_powers(std::array::from_fn(|k| (0..=k).map(|j| a[j] * b[k - j]).sum()))
    }

    /// The series of 1 - G.
    #[must_use]
    pub fn complement(self) -> Series {
        let mut powers = self.powers().map(|p| -p);
        powers[0] = 1.0 - self.s0;
        Series::of_powers(powers)
    }

    /// What the gain makes of the polynomial `b`: the k-th power of i w takes the k-th derivative, exact up to degree 5.
    /// `step` is the sampling step in the unit of b's own variable: 1 when b is in samples.
    pub fn carry(self, b: &Polynomial, step: f64) -> Polynomial {
        let mut carried = b.scaled(self.s0);
        let mut derivative = b.clone();
        for (k, power) in self.powers().into_iter().enumerate().skip(1) {
            derivative = derivative.derivative();
            if power != 0.0 {
                carried = carried.plus(&derivative.scaled(power * step.powi(k as i32)));
            }
        }
        carried
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_delayed_mean_carries_polynomials_by_its_quotient() {
        // (x[n] + x[n-1])/2 = (1 + e^-p)/2 with p = i w: by hand 1 - p/2 + p^2/4 - p^3/12 + p^4/48 - p^5/240.
        let mean = [1.0, -0.5, 0.25, -1.0 / 12.0, 1.0 / 48.0, -1.0 / 240.0];
        let b = Polynomial::from_powers(20.0, &[3.0, -2.0, 0.5, 0.25, -0.02, 0.001]);
        let carried = Series::of_quotient(&mean, &[1.0]).carry(&b, 1.0);
        // A quotient with the denominator 1 + 2p undoes a product with it.
        let product: Vec<f64> = (0..7)
            .map(|k| mean.get(k).unwrap_or(&0.0) + 2.0 * k.checked_sub(1).and_then(|j| mean.get(j)).unwrap_or(&0.0))
            .collect();
        let again = Series::of_quotient(&product, &[1.0, 2.0]).carry(&b, 1.0);
        for n in 1..=20 {
            let n = f64::from(n);
            let exact = 0.5 * (b.at(n) + b.at(n - 1.0));
            assert!((carried.at(n) - exact).abs() < 1e-11 && (again.at(n) - exact).abs() < 1e-10, "{n}");
        }
    }

    #[test]
    fn polynomials_pass_a_three_point_mean_as_its_series_says() {
        // The kernel (1/4, 1/2, 1/4) has the gain (1 + cos w)/2 = 1 - w^2/4 + w^4/48; on powers of n the weighted mean
        // is plain arithmetic. Degree 5 at most: b'''' then has degree 1 and b^(6) vanishes.
        let series = Series { s0: 1.0, s2: -0.25, s4: 1.0 / 48.0, odd: [0.0; 3] };
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
