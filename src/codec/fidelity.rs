//! How near restored samples come to the source: what a report of an archive states.

use serde::Serialize;

use super::request::range;

/// Errors of restored samples, in the channel's unit.
#[derive(Debug, Clone, Copy, PartialEq, Serialize)]
pub struct Fidelity {
    /// Root mean squared error.
    pub rmse: f64,
    /// Largest error.
    pub max_error: f64,
    /// Row of the largest error, from 0; `None` where there is no error.
    pub max_error_row: Option<usize>,
    /// 20 log10(range / RMSE); `None` where one of them is zero.
    pub psnr_db: Option<f64>,
    /// 1 - N RMSE^2 / sum (x - mean)^2: the mean counts for nothing; `None` for a constant channel.
    pub retained_energy: Option<f64>,
    /// Correlation of neighbouring errors; `None` where there is none to speak of.
    pub error_correlation: Option<f64>,
}

impl Fidelity {
    /// Of rows as read and as restored; rows without a value count for nothing.
    pub fn of(rows: &[f64], restored: &[f64]) -> Fidelity {
        let pairs = || rows.iter().zip(restored).enumerate().filter(|(_, (a, b))| !a.is_nan() && !b.is_nan());
        let count = pairs().count().max(1) as f64;
        let mean = pairs().map(|(_, (a, _))| a).sum::<f64>() / count;
        let (mut squares, mut energy, mut lagged, mut before) = (0.0, 0.0, 0.0, 0.0);
        let (mut max_error, mut max_error_row) = (0.0, None);
        for (row, (a, b)) in pairs() {
            let off = b - a;
            if off.abs() > max_error {
                (max_error, max_error_row) = (off.abs(), Some(row));
            }
            squares += off * off;
            lagged += off * before;
            energy += (a - mean) * (a - mean);
            before = off;
        }
        let rmse = (squares / count).sqrt();
        let valid: Vec<f64> = rows.iter().copied().filter(|v| !v.is_nan()).collect();
        let range = range(&valid);
        Fidelity {
            rmse,
            max_error,
            max_error_row,
            psnr_db: (rmse > 0.0 && range > 0.0).then(|| 20.0 * (range / rmse).log10()),
            retained_energy: (energy > 0.0).then(|| 1.0 - squares / energy),
            error_correlation: (squares > 0.0).then(|| lagged / squares),
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn figures_follow_their_definitions() {
        let rows = [0.0, 1.0, 2.0, 3.0, f64::NAN];
        let found = Fidelity::of(&rows, &[0.0, 1.0, 2.5, 3.0, f64::NAN]);
        // One error of 0.5 in four: RMSE 0.25; range 3; sum of squares about the mean 1.5 is 5.
        assert_eq!((found.rmse, found.max_error, found.max_error_row), (0.25, 0.5, Some(2)));
        assert!((found.psnr_db.unwrap() - 20.0 * 12_f64.log10()).abs() < 1e-12);
        assert!((found.retained_energy.unwrap() - 0.95).abs() < 1e-12);
    }
}
