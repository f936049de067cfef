//! Lag products of a sequence over many overlapping stretches, each product formed once.

use crate::numeric::autoregression::dot;

/// Sums of x(t) x(t - d) for lags d = 0 to `highest`, from which those of any stretch between given borders follow.
pub struct LagTable {
    /// Ascending, from 0 to the length.
    borders: Vec<usize>,
    /// Lag by lag, one sum for each gap between borders, by the place of the later factor.
    sums: Vec<Vec<f64>>,
}

impl LagTable {
    /// The table for stretches that start and stop at `borders` (any order, repeats allowed).
    pub fn of(values: &[f64], highest: usize, borders: impl IntoIterator<Item = usize>) -> LagTable {
        let n = values.len();
        let mut borders: Vec<usize> = borders.into_iter().map(|b| b.min(n)).chain([0, n]).collect();
        borders.sort_unstable();
        borders.dedup();
        let sum = |lag: usize, from: usize, to: usize| {
            let from = from.max(lag);
            if from < to { dot(&values[from..to], &values[from - lag..to - lag]) } else { 0.0 }
        };
        let sums = (0..=highest).map(|lag| borders.windows(2).map(|b| sum(lag, b[0], b[1])).collect()).collect();
        LagTable { borders, sums }
    }

    /// Lag products c(d) = sum of (x(t) - mean)(x(t - d) - mean) over the pairs within `stretch`, which must start and
    /// stop at borders, for d = 0 to `highest` of the table. `values` is the sequence of the table.
    pub fn products(&self, values: &[f64], stretch: std::ops::Range<usize>, mean: f64) -> Vec<f64> {
        let (from, to) = (stretch.start, stretch.end);
        let gap = |border: usize| self.borders.partition_point(|b| *b < border);
        let gaps = gap(from)..gap(to);
        let stretch = &values[stretch];
        let n = stretch.len();
        let total: f64 = stretch.iter().sum();
        let (mut first, mut last) = (0.0, 0.0);
        let mut products = Vec::with_capacity(self.sums.len());
        for (lag, sums) in self.sums.iter().enumerate() {
            if lag >= n {
                products.push(0.0);
                continue;
            }
            let mut sum: f64 = sums[gaps.clone()].iter().sum();
            // Pairs whose earlier factor lies before the stretch.
            if from > 0 {
                let before = lag.min(from);
                let later = from + lag - before..from + lag;
                sum -= dot(&values[later], &values[from - before..from]);
            }
            if mean != 0.0 {
                // Sums of the later and of the earlier factors: all but the first, all but the last `lag` values.
                sum += mean * ((n - lag) as f64 * mean - (total - first) - (total - last));
            }
            products.push(sum);
            first += stretch[lag];
            last += stretch[n - 1 - lag];
        }
        debug_assert!(to <= values.len());
        products
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn every_stretch_gets_its_own_products() {
        let x: Vec<f64> = (0..60).map(|n| ((n * n * 7) % 23) as f64).collect();
        let table = LagTable::of(&x, 12, [20, 7, 41, 20]);
        for (from, to) in [(0, 60), (7, 60), (7, 41), (20, 41), (0, 20), (41, 60), (7, 20)] {
            for mean in [0.0, 3.0] {
                let found = table.products(&x, from..to, mean);
                for (lag, value) in found.iter().enumerate() {
                    let pairs = (from + lag).min(to)..to;
                    let expected: f64 = pairs.map(|t| (x[t] - mean) * (x[t - lag] - mean)).sum();
                    // Integers throughout: exact.
                    assert_eq!(*value, expected, "{from}..{to} lag {lag}");
                }
            }
        }
    }
}
