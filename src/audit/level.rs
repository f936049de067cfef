//! Offset, RMS, peak, crest factor and kurtosis of a channel.

use serde::Serialize;

use crate::numeric::sum::{sum, sum_of};

/// Levels of a channel over its finite samples, in its unit.
#[derive(Debug, Clone, Copy, PartialEq, Serialize)]
pub struct Level {
    /// Mean: the offset.
    pub mean: f64,
    /// Root mean square, offset included.
    pub rms: f64,
    /// Standard deviation about the mean (divisor n).
    pub deviation: f64,
    /// Smallest value.
    pub low: f64,
    /// Largest value.
    pub high: f64,
    /// Largest distance from the mean.
    pub peak: f64,
    /// Peak over standard deviation: 1.414 for a sine. `None` for a constant channel.
    pub crest_factor: Option<f64>,
    /// Fourth moment over the square of the second, about the mean: 3 for normal noise, 1.5 for a sine. `None` for a
    /// constant channel.
    pub kurtosis: Option<f64>,
}

impl Level {
    /// Of finite values; `None` without any.
    pub fn of(values: &[f64]) -> Option<Level> {
        let count = values.len() as f64;
        let low = values.iter().copied().reduce(f64::min)?;
        let high = values.iter().copied().reduce(f64::max)?;
        // Values near the largest float overflow when squared: everything is formed in parts of the largest.
        let unit = low.abs().max(high.abs());
        if unit == 0.0 || low == high {
            let constant = Level {
                mean: low,
                rms: low.abs(),
                deviation: 0.0,
                low,
                high,
                peak: 0.0,
                crest_factor: None,
                kurtosis: None,
            };
            return Some(constant);
        }
        let centre = if unit < 1e300 { sum(values) / count / unit } else { sum_of(values, |v| v / unit) / count };
        let square = sum_of(values, |v| (v / unit) * (v / unit)) / count;
        let second = sum_of(values, |v| (v / unit - centre).powi(2)) / count;
        let fourth = sum_of(values, |v| (v / unit - centre).powi(4)) / count;
        let peak = (high / unit - centre).max(centre - low / unit);
        let varies = second > 0.0;
        Some(Level {
            mean: centre * unit,
            rms: square.sqrt() * unit,
            deviation: second.sqrt() * unit,
            low,
            high,
            peak: peak * unit,
            crest_factor: varies.then(|| peak / second.sqrt()),
            kurtosis: varies.then(|| fourth / (second * second)).filter(|k| k.is_finite()),
        })
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_sine_over_whole_periods() {
        let values: Vec<f64> =
            (0..1000).map(|n| 5.0 + 2.0 * (f64::from(n) * std::f64::consts::TAU / 40.0).sin()).collect();
        let Some(level) = Level::of(&values) else { panic!("there are values") };
        // Closed forms: mean 5, deviation sqrt 2, crest sqrt 2, kurtosis 3/2.
        assert!((level.mean - 5.0).abs() < 1e-12);
        assert!((level.rms - 27f64.sqrt()).abs() < 1e-12);
        assert!((level.deviation - 2f64.sqrt()).abs() < 1e-12);
        assert!((level.crest_factor.unwrap_or(0.0) - 2f64.sqrt()).abs() < 1e-12);
        assert!((level.kurtosis.unwrap_or(0.0) - 1.5).abs() < 1e-12);
    }

    #[test]
    fn huge_and_constant_values_stay_finite() {
        let Some(huge) = Level::of(&[1e308, -1e308, 1e308, -1e308]) else { panic!("there are values") };
        assert!((huge.rms / 1e308 - 1.0).abs() < 1e-12 && huge.crest_factor == Some(1.0));
        assert_eq!(Level::of(&[2.0, 2.0]).and_then(|l| l.crest_factor), None);
        assert_eq!(Level::of(&[]), None);
    }
}
