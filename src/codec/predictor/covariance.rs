//! Least squares over a fading past: the weights that would have foretold the record so far best.

/// Weight of the ridge that keeps the equations solvable, in squared steps.
const RIDGE: f64 = 1.0;

/// The prediction of sample n + 1 from samples n, n - 1, ...: history, lag sums and weights.
///
/// With r_n(d) = sum over m <= n of fade^(n - m) v_m v_(m - d) and samples before the first taken as 0, the weights w_i of
/// v_(n + 1 - i) solve sum_j R_ij w_j = r_n(i), i and j from 1 to the order, where
/// R_ij = r_(n - s)(|i - j|) with s = min(i, j), and the ridge is added for i = j.
#[derive(Debug)]
pub struct Covariance {
    order: usize,
    fade: f64,
    /// The newest sample first; order + 1 of them.
    history: Vec<f64>,
    /// r_n, r_(n - 1), ...: a ring of order + 1 rows of order + 1 lags, the newest at `newest`.
    sums: Vec<f64>,
    newest: usize,
    weights: Vec<f64>,
    matrix: Vec<f64>,
    factor: Vec<f64>,
    count: u64,
}

impl Covariance {
    pub fn new(order: usize, memory: u8) -> Covariance {
        let fade = 1.0 - 1.0 / f64::from(1_u32 << memory);
        Covariance {
            order,
            fade,
            history: vec![0.0; order + 1],
            sums: vec![0.0; (order + 1) * (order + 1)],
            newest: 0,
            weights: vec![0.0; order],
            matrix: vec![0.0; order * order],
            factor: vec![0.0; order],
            count: 0,
        }
    }

    /// Sum of weight x sample, newest first.
    pub fn next(&self) -> f64 {
        let mut sum = 0.0;
        for (weight, sample) in self.weights.iter().zip(&self.history) {
            sum += weight * sample;
        }
        sum
    }

    pub fn learn(&mut self, sample: f64) {
        if self.order == 0 {
            return;
        }
        let width = self.order + 1;
        self.history.copy_within(0..self.order, 1);
        self.history[0] = sample;
        let before = self.newest;
        self.newest = (before + self.order) % width;
        for lag in 0..width {
            self.sums[self.newest * width + lag] =
                self.sums[before * width + lag] * self.fade + sample * self.history[lag];
        }
        self.count += 1;
        // Every sample at first, later as often as the order makes it worth its while.
        let every = if self.count < 4 * self.order as u64 { 1 } else { (self.order as u64 / 2).max(1) };
        if self.count.is_multiple_of(every) {
            self.solve();
        }
    }

    /// Factors R = L D L' column by column, in place; then solves forward, divides, and solves backward.
    fn solve(&mut self) {
        let (order, width) = (self.order, self.order + 1);
        for i in 0..order {
            for j in 0..=i {
                let row = (self.newest + j + 1) % width * width;
                let ridge = if i == j { RIDGE } else { 0.0 };
                self.matrix[i * order + j] = self.sums[row + i - j] + ridge;
            }
        }
        let w = &mut self.weights;
        w.copy_from_slice(&self.sums[self.newest * width + 1..][..order]);
        for k in 0..order {
            let pivot = self.matrix[k * order + k];
            // Rounding alone can bring a pivot below the ridge.
            let pivot = if pivot > RIDGE / 1024.0 { pivot } else { RIDGE };
            self.matrix[k * order + k] = pivot;
            for i in k + 1..order {
                self.factor[i] = self.matrix[i * order + k] / pivot;
            }
            for i in k + 1..order {
                let whole = self.matrix[i * order + k];
                let row = &mut self.matrix[i * order + k + 1..=i * order + i];
                for (cell, factor) in row.iter_mut().zip(&self.factor[k + 1..=i]) {
                    *cell -= whole * factor;
                }
                self.matrix[i * order + k] = self.factor[i];
                w[i] -= self.factor[i] * w[k];
            }
        }
        for k in (0..order).rev() {
            w[k] /= self.matrix[k * order + k];
        }
        for k in (0..order).rev() {
            for i in 0..k {
                w[i] -= self.matrix[k * order + i] * w[k];
            }
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_sinusoid_is_foretold_by_two_weights() {
        // v_(n+1) = 2 cos(w) v_n - v_(n-1): amplitude 1e6 steps against a ridge of one.
        let mut prediction = Covariance::new(2, 10);
        let wave = |n: usize| 1e6 * (0.1 * n as f64).sin();
        (0..2000).for_each(|n| prediction.learn(wave(n)));
        assert!((prediction.weights[0] - 2.0 * 0.1_f64.cos()).abs() < 1e-5, "{:?}", prediction.weights);
        assert!((prediction.next() - wave(2000)).abs() < 1.0);
    }
}
