//! Confidence limits of a density and of the ratio of two, from the chi-square and the F distribution.

use std::collections::HashMap;

use statrs::distribution::{ChiSquared, ContinuousCDF, FisherSnedecor};

use crate::error::{Error, Result};

/// Limits at one confidence level; quantiles are kept, since lines share their degrees of freedom.
#[derive(Debug)]
pub struct Limits {
    level: f64,
    known: HashMap<u64, (f64, f64)>,
}

impl Limits {
    /// Limits that hold with probability `level`, equal tails.
    ///
    /// # Errors
    /// `Usage` unless 0 < `level` < 1.
    pub fn new(level: f64) -> Result<Limits> {
        if level > 0.0 && level < 1.0 {
            return Ok(Limits { level, known: HashMap::new() });
        }
        Err(Error::usage(format!("a confidence of {level} is none"))
            .remedy("give a share between 0 and 1, such as 95%"))
    }

    /// The level, 0 to 1.
    pub fn level(&self) -> f64 {
        self.level
    }

    /// Factors from an estimate with `freedom` degrees of freedom to its lower and upper limit: nu/chi2 at the upper and
    /// the lower tail.
    pub fn factors(&mut self, freedom: f64) -> (f64, f64) {
        let tail = (1.0 - self.level) / 2.0;
        *self.known.entry(freedom.to_bits()).or_insert_with(|| {
            let Some(distribution) = ChiSquared::new(freedom).ok() else { return (0.0, f64::INFINITY) };
            (freedom / distribution.inverse_cdf(1.0 - tail), freedom / distribution.inverse_cdf(tail))
        })
    }
}

/// Factors from the ratio of two independent estimates to its lower and upper limit at confidence `level` (0 to 1).
pub fn ratio_limits(level: f64, numerator_freedom: f64, denominator_freedom: f64) -> (f64, f64) {
    let tail = (1.0 - level) / 2.0;
    let quantile = |a: f64, b: f64| FisherSnedecor::new(a, b).map_or(f64::INFINITY, |f| f.inverse_cdf(1.0 - tail));
    (quantile(numerator_freedom, denominator_freedom).recip(), quantile(denominator_freedom, numerator_freedom))
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn factors_are_those_of_the_tables() {
        // Bendat and Piersol, Random Data; Jenkins and Watts 1968: nu/chi2 for 95 %. Digits from SciPy 1.17.1.
        let table = [
            (2.0, 0.27109, 39.49789),
            (4.0, 0.35896, 8.25732),
            (8.0, 0.45624, 3.67018),
            (20.0, 0.58532, 2.08534),
            (64.0, 0.72724, 1.46199),
            (200.0, 0.82968, 1.22904),
        ];
        let mut limits = Limits::new(0.95).unwrap();
        for (freedom, lower, upper) in table {
            let (low, high) = limits.factors(freedom);
            assert!((low - lower).abs() < 1e-5 && (high - upper).abs() < 1e-5, "{freedom}: {low} {high}");
        }
        // Far more degrees of freedom than any table: the normal limit 1 -/+ 1.959964 sqrt(2/nu).
        let (low, high) = limits.factors(2e8);
        assert!((low - (1.0 - 1.959964e-4)).abs() < 1e-7 && (high - (1.0 + 1.959964e-4)).abs() < 1e-7, "{low} {high}");
    }

    #[test]
    fn a_ratio_has_the_limits_of_the_f_distribution() {
        // F(0.975; 20, 20) = 2.464484 (SciPy 1.17.1); Bendat and Piersol print 2.46.
        let (low, high) = ratio_limits(0.95, 20.0, 20.0);
        assert!((high - 2.464484).abs() < 1e-5 && (low - 1.0 / 2.464484).abs() < 1e-5, "{low} {high}");
        assert!(Limits::new(1.0).is_err() && Limits::new(f64::NAN).is_err());
    }
}
