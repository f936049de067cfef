//! The forecasters that are combined: six ways to continue a sequence from its own past.

use std::ops::Range;

use crate::numeric::analogue::{self, Search};
use crate::numeric::autoregression::{Burg, Predictor};
use crate::numeric::lag::LagTable;
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
    /// Fits to every stretch 0..stop of `past`, oldest first, each stop at least 2.
    pub fn to(past: &[f64], stops: &[usize]) -> Vec<Fits> {
        let recent = |stop: usize| stop - (stop / 2).max(16).min(stop);
        let borders = || stops.iter().flat_map(|&stop| [recent(stop), stop]);
        let centre = sum::mean(past);
        let values: Vec<f64> = past.iter().map(|v| v - centre).collect();
        let differences: Vec<f64> = past.windows(2).map(|w| w[1] - w[0]).collect();
        let tables = [
            LagTable::of(&values, LONGEST_ORDER, borders()),
            LagTable::of(&differences, LONGEST_ORDER, borders().map(|b| b.saturating_sub(1)).chain(borders())),
        ];
        let sequences = Sequences { centre, values: &values, differences: &differences, tables: &tables };
        stops.iter().map(|&stop| Fits::between(&sequences, recent(stop), stop)).collect()
    }

    fn between(sequences: &Sequences, recent: usize, stop: usize) -> Fits {
        let (long, long_values, long_products) = sequences.pair(0..stop);
        let (recent, ..) = sequences.pair(recent..stop);
        let order = (stop / 3).clamp(2, LONGEST_ORDER);
        let squares = covariance::from_products(&long_values, &long_products, order, RIDGE);
        Fits { recent, long, squares, len: stop }
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

/// One history less its mean, its first differences, and the lag products of both.
struct Sequences<'a> {
    centre: f64,
    values: &'a [f64],
    differences: &'a [f64],
    tables: &'a [LagTable; 2],
}

impl Sequences<'_> {
    /// The pair of models over one stretch, its values less their mean, and their lag products.
    fn pair(&self, stretch: Range<usize>) -> (Pair, Vec<f64>, Vec<f64>) {
        let len = stretch.len();
        let order = long_order(len);
        let mean = sum::mean(&self.values[stretch.clone()]);
        let centred: Vec<f64> = self.values[stretch.clone()].iter().map(|v| v - mean).collect();
        let products = self.tables[0].products(self.values, stretch.clone(), mean);
        // Removing the mean afterwards leaves the rounding of the products as they were.
        let rounded = products[0] + len as f64 * mean * mean;
        let changes = stretch.start..stretch.end - 1;
        let differences = &self.differences[changes.clone()];
        let change_products = self.tables[1].products(self.differences, changes, 0.0);
        let pair = Pair {
            len,
            mean: self.centre + mean,
            values: burg(&centred, &products, order, rounded),
            differences: burg(differences, &change_products, order, change_products[0]),
        };
        (pair, centred, products)
    }
}

/// Burg's recursion from lag products where they carry it, otherwise over the values.
fn burg(values: &[f64], products: &[f64], order: usize, rounded: f64) -> Burg {
    let order = order.min(values.len().saturating_sub(1));
    Burg::from_products(values, products, order, rounded).unwrap_or_else(|| Burg::fit(values, order))
}

impl Pair {
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
