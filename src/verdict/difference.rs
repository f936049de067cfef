//! By how much the output of one extension departs from that of the forecast, from each end inwards.

use crate::baseline::Side;

/// Differences at distances 0, `spacing`, 2 `spacing` ... samples from each end.
#[derive(Debug, Clone)]
pub(super) struct Difference {
    pub spacing: usize,
    /// Left and right.
    pub ends: [Vec<f64>; 2],
}

impl Difference {
    /// Between two whole outputs of one length, as far as `farthest` samples from each end.
    pub fn between(output: &[f64], forecast: &[f64], farthest: usize) -> Difference {
        let n = output.len();
        let left = (0..farthest).map(|j| output[j] - forecast[j]).collect();
        let right = (0..farthest).map(|j| output[n - 1 - j] - forecast[n - 1 - j]).collect();
        Difference { spacing: 1, ends: [left, right] }
    }

    /// No difference: the forecast itself.
    pub fn none() -> Difference {
        Difference { spacing: 1, ends: [Vec::new(), Vec::new()] }
    }

    /// Root mean square over both zones of `zone` samples together, by straight lines between neighbours.
    pub fn rms(&self, zone: usize) -> f64 {
        let total = self.squares(0, zone) + self.squares(1, zone);
        (total / (2 * zone.max(1)) as f64).sqrt()
    }

    /// Sum of squares over the first `zone` samples of one end.
    fn squares(&self, end: usize, zone: usize) -> f64 {
        let values = &self.ends[end];
        let step = self.spacing as f64;
        let mut total = 0.0;
        for (k, &a) in values.iter().enumerate().take(zone.div_ceil(self.spacing)) {
            let rise = (values.get(k + 1).unwrap_or(&a) - a) / step;
            // Sum of (a + rise s)^2 over s = 0 .. m - 1.
            let m = (zone - k * self.spacing).min(self.spacing) as f64;
            total += m * a * a + a * rise * m * (m - 1.0) + rise * rise * (m - 1.0) * m * (2.0 * m - 1.0) / 6.0;
        }
        total
    }

    /// The difference at distance `j` from an end, by a straight line between neighbours.
    pub fn at(&self, side: Side, j: usize) -> f64 {
        let end = &self.ends[side as usize];
        let (k, rest) = (j / self.spacing, j % self.spacing);
        let value = |k: usize| end.get(k).or(end.last()).copied().unwrap_or(0.0);
        value(k) + (value(k + 1) - value(k)) * rest as f64 / self.spacing as f64
    }
}
