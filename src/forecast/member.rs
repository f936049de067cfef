//! The forecasters that are combined: six ways to continue a sequence from its own past.

use crate::numeric::analogue::{self, Search};
use crate::numeric::autoregression::{Burg, Predictor};
use crate::numeric::{covariance, sum};

/// How many forecasters there are.
pub const COUNT: usize = 6;

/// Their names, in the order of all arrays here.
pub const NAMES: [&str; COUNT] = [
    "long autoregression",
    "short autoregression",
    "recent autoregression",
    "least squares",
    "five analogues",
    "three long analogues",
];

/// Longest order of any autoregression.
pub const LONGEST_ORDER: usize = 128;

/// Share of the mean diagonal that is added to the diagonal of the least-squares equations.
const RIDGE: f64 = 1e-3;

/// The models fitted to one sequence; from them each forecaster continues it.
pub struct Fits {
    long: Pair,
    recent: Pair,
    squares: Predictor,
    /// Values seen.
    len: usize,
}

/// Burg's recursion over the values less their mean, and over the first differences.
struct Pair {
    /// The pair looks at this many latest values.
    len: usize,
    mean: f64,
    values: Burg,
    differences: Burg,
}

impl Fits {
    /// Fits to `past`, oldest first, at least two values.
    pub fn to(past: &[f64]) -> Fits {
        let n = past.len();
        let recent = &past[n - (n / 2).max(16).min(n)..];
        let long = Pair::to(past);
        let centred: Vec<f64> = past.iter().map(|v| v - long.mean).collect();
        let squares = covariance::fit(&centred, (n / 3).clamp(2, LONGEST_ORDER), RIDGE);
        Fits { recent: Pair::to(recent), long, squares, len: n }
    }

    /// The continuation of every forecaster by `steps` values, in the order of `NAMES`. `past` is what was fitted to.
    pub fn continued(&self, past: &[f64], steps: usize) -> [Vec<f64>; COUNT] {
        let n = self.len;
        let search = |divisor: usize, neighbours| Search { width: (n / divisor).max(4), neighbours };
        [
            self.long.continued(past, steps, long_order(n)),
            self.long.continued(past, steps, (n / 16).clamp(2, 32)),
            self.recent.continued(past, steps, long_order(self.recent.len)),
            self.squares_continued(past, steps),
            analogue::continued(past, search(16, 5), steps),
            analogue::continued(past, search(8, 3), steps),
        ]
    }

    /// The long autoregression and its error variance, corrected for the weights that were fitted.
    pub fn innovations(&self) -> (Predictor, f64) {
        let order = long_order(self.len).min(self.long.values.order());
        let share = order as f64 / self.len as f64;
        (self.long.values.predictor(order), self.long.values.variance(order) * (1.0 + share) / (1.0 - share))
    }

    fn squares_continued(&self, past: &[f64], steps: usize) -> Vec<f64> {
        let mean = self.long.mean;
        let order = self.squares.weights.len();
        let latest: Vec<f64> = past[past.len() - order..].iter().map(|v| v - mean).collect();
        // Least squares may give a growing model; three times the largest deviation seen is the limit.
        let limit = 3.0 * past.iter().map(|v| (v - mean).abs()).fold(0.0, f64::max);
        let ahead = self.squares.continued(&latest, steps);
        ahead.iter().map(|v| mean + if v.is_nan() { 0.0 } else { v.clamp(-limit, limit) }).collect()
    }
}

/// The order of a long autoregression over n values: a quarter of them, at most 128.
fn long_order(n: usize) -> usize {
    (n / 4).clamp(2, LONGEST_ORDER)
}

impl Pair {
    fn to(past: &[f64]) -> Pair {
        let order = long_order(past.len());
        let mean = sum::mean(past);
        let centred: Vec<f64> = past.iter().map(|v| v - mean).collect();
        let steps: Vec<f64> = past.windows(2).map(|w| w[1] - w[0]).collect();
        Pair { len: past.len(), mean, values: Burg::fit(&centred, order), differences: Burg::fit(&steps, order) }
    }

    /// Mean of the two continuations; `past` ends with the values fitted to.
    fn continued(&self, past: &[f64], steps: usize, order: usize) -> Vec<f64> {
        let past = &past[past.len() - self.len..];
        let latest = &past[past.len().saturating_sub(order + 1)..];
        let centred: Vec<f64> = latest.iter().map(|v| v - self.mean).collect();
        let changes: Vec<f64> = latest.windows(2).map(|w| w[1] - w[0]).collect();
        let values = self.values.predictor(order).continued(&centred, steps);
        let differences = self.differences.predictor(order).continued(&changes, steps);
        let mut level = past.last().copied().unwrap_or(0.0);
        values
            .iter()
            .zip(&differences)
            .map(|(value, change)| {
                level += change;
                0.5 * (self.mean + value + level)
            })
            .collect()
    }
}
