//! Autoregression by Burg's recursion: what the past of a sequence says about its next value.
//!
//! Source: Burg 1975, Maximum entropy spectral analysis, thesis, Stanford; the recursion as in Kay 1988, Modern Spectral
//! Estimation, section 7.5.

use crate::numeric::sum;

/// The reflection coefficients of a sequence, up to some order, with the error variance that each order leaves.
#[derive(Debug, Clone, PartialEq)]
pub struct Burg {
    reflections: Vec<f64>,
    /// Mean squared one-step error of order 0, 1, ...
    variances: Vec<f64>,
}

impl Burg {
    /// Fits orders up to `order` (at most one less than the number of values). The values are taken as they are: remove
    /// a mean first.
    pub fn fit(values: &[f64], order: usize) -> Burg {
        let n = values.len();
        let order = order.min(n.saturating_sub(1));
        let mut reflections = Vec::with_capacity(order);
        let mut variances = Vec::with_capacity(order + 1);
        let mut variance = if n == 0 { 0.0 } else { sum::sum_of_squares(values) / n as f64 };
        variances.push(variance);
        let mut forward = values.to_vec();
        let mut backward = values.to_vec();
        let mut sums = if n > 1 { products(&forward[1..], &backward[..n - 1]) } else { (0.0, 0.0) };
        for stage in 1..=order {
            let (cross, energy) = sums;
            let k = if energy > 0.0 { (2.0 * cross / energy).clamp(-1.0, 1.0) } else { 0.0 };
            reflections.push(k);
            variance *= 1.0 - k * k;
            variances.push(variance);
            if stage < order {
                // Errors of this stage sit at stage..n forwards and 0..n-stage backwards.
                sums = advance(&mut forward[stage..], &mut backward[..n - stage], k);
            }
        }
        Burg { reflections, variances }
    }

    /// The same from the lag products c(d) = sum of x(t) x(t - d), d = 0 to at least `order`, in a time that does not
    /// grow with the number of values. `None` where rounding of the products (of size `rounded`, which exceeds c(0) when
    /// a mean was removed afterwards) could show in the result: the sequence is too smooth.
    ///
    /// Source: Vos 2013, A fast implementation of Burg's method. The reflection coefficient of the next stage is
    /// -(a J g)/(a g) with g = R a, where a is the error filter so far with a zero appended, J reverses, and R is the
    /// matrix of forward and backward products, which changes by two outer products and one row from stage to stage.
    pub fn from_products(values: &[f64], products: &[f64], order: usize, rounded: f64) -> Option<Burg> {
        let n = values.len();
        if order >= n || products.len() <= order || products[0].is_nan() || products[0] <= 0.0 {
            return None;
        }
        let mut reflections = Vec::with_capacity(order);
        let mut variance = products[0] / n as f64;
        let mut variances = vec![variance];
        let mut filter = vec![1.0];
        let mut r = vec![2.0 * products[1]];
        let mut g = vec![2.0 * products[0] - values[0] * values[0] - values[n - 1] * values[n - 1], 2.0 * products[1]];
        for stage in 0..order {
            let energy = dot(&filter, &g[..=stage]);
            let cross: f64 = filter.iter().zip(g.iter().rev()).map(|(a, g)| a * g).sum();
            let size: f64 = filter.iter().map(|a| a.abs()).sum();
            if energy.is_nan() || f64::EPSILON * rounded * size * size > LOST * energy {
                return None;
            }
            let k = (-cross / energy).clamp(-1.0, 1.0);
            reflections.push(-k);
            variance *= 1.0 - k * k;
            variances.push(variance);
            if stage + 1 == order {
                break;
            }
            filter.push(0.0);
            mix(&mut filter, k);
            mix(&mut g, k);
            // The first and the last pair of the old stage leave the sums.
            let (head, tail) = (&values[..=stage + 1], &values[n - 2 - stage..]);
            let by_head: f64 = filter.iter().zip(head.iter().rev()).map(|(a, x)| a * x).sum();
            let by_tail = dot(&filter, tail);
            for ((g, u), v) in g.iter_mut().zip(head.iter().rev()).zip(tail) {
                *g -= u * by_head + v * by_tail;
            }
            let (first, last) = (values[stage + 1], values[n - 2 - stage]);
            r.insert(0, 2.0 * products[stage + 2]);
            for l in 1..=stage + 1 {
                r[l] -= last * values[n - l] + first * values[l - 1];
            }
            g.push(dot(&r, &filter));
        }
        Some(Burg { reflections, variances })
    }

    /// The highest fitted order.
    pub fn order(&self) -> usize {
        self.reflections.len()
    }

    /// Mean squared one-step error that `order` leaves (the highest fitted order if that is lower).
    pub fn variance(&self, order: usize) -> f64 {
        self.variances[order.min(self.order())]
    }

    /// The predictor of `order` (the highest fitted order if that is lower), by the step-up recursion.
    pub fn predictor(&self, order: usize) -> Predictor {
        let order = order.min(self.order());
        let mut weights: Vec<f64> = Vec::with_capacity(order);
        for m in 0..order {
            let k = self.reflections[m];
            for i in 0..m.div_ceil(2) {
                let (a, b) = (weights[i], weights[m - 1 - i]);
                weights[i] = a - k * b;
                weights[m - 1 - i] = b - k * a;
            }
            weights.push(k);
        }
        Predictor { weights }
    }
}

/// Largest share of the error energy that rounding of the lag products may amount to.
const LOST: f64 = 1e-6;

/// a + k J a in place, J reversing.
fn mix(a: &mut [f64], k: f64) {
    let n = a.len();
    for i in 0..n / 2 {
        let (low, high) = (a[i], a[n - 1 - i]);
        a[i] = low + k * high;
        a[n - 1 - i] = high + k * low;
    }
    if n % 2 == 1 {
        a[n / 2] *= 1.0 + k;
    }
}

/// Chunks whose two error sequences stay in the nearest cache between the update and the sums.
const CHUNK: usize = 1024;

/// One lattice stage in place: f' = f - k b, b' = b - k f; returns the sums that the next stage needs, over the pairs
/// (f' one later, b').
fn advance(forward: &mut [f64], backward: &mut [f64], k: f64) -> (f64, f64) {
    let n = forward.len();
    let (mut cross, mut energy) = (0.0, 0.0);
    let mut from = 0;
    while from < n {
        let to = (from + CHUNK).min(n);
        for (f, b) in forward[from..to].iter_mut().zip(&mut backward[from..to]) {
            let old = *f;
            *f -= k * *b;
            *b -= k * old;
        }
        // The pair across the border of two chunks belongs to the later one.
        let first = from.saturating_sub(1);
        let (c, e) = products(&forward[first + 1..to], &backward[first..to - 1]);
        cross += c;
        energy += e;
        from = to;
    }
    (cross, energy)
}

/// sum f b and sum f^2 + b^2.
fn products(forward: &[f64], backward: &[f64]) -> (f64, f64) {
    const LANES: usize = 4;
    let mut cross = [0.0; LANES];
    let mut energy = [0.0; LANES];
    let (f, b) = (forward.chunks_exact(LANES), backward.chunks_exact(LANES));
    let (f_rest, b_rest) = (f.remainder(), b.remainder());
    for (f, b) in f.zip(b) {
        for lane in 0..LANES {
            cross[lane] += f[lane] * b[lane];
            energy[lane] += f[lane] * f[lane] + b[lane] * b[lane];
        }
    }
    let mut total = (cross.iter().sum::<f64>(), energy.iter().sum::<f64>());
    for (f, b) in f_rest.iter().zip(b_rest) {
        total.0 += f * b;
        total.1 += f * f + b * b;
    }
    total
}

/// Predicts the next value as a weighted sum of the latest ones; `weights[0]` belongs to the latest.
#[derive(Debug, Clone, PartialEq)]
pub struct Predictor {
    /// One weight a lag, lag 1 first.
    pub weights: Vec<f64>,
}

impl Predictor {
    /// Continues `past` (oldest first) by `steps` values. Missing past counts as zero.
    pub fn continued(&self, past: &[f64], steps: usize) -> Vec<f64> {
        let order = self.weights.len();
        let known = past.len().min(order);
        let mut line = vec![0.0; order - known];
        line.extend_from_slice(&past[past.len() - known..]);
        let reversed: Vec<f64> = self.weights.iter().rev().copied().collect();
        for _ in 0..steps {
            let latest = &line[line.len() - order..];
            line.push(dot(&reversed, latest));
        }
        line.split_off(order)
    }

    /// Response to one unit of innovation: 1, then what follows from it, `len` values in all.
    pub fn impulse_response(&self, len: usize) -> Vec<f64> {
        let mut response = Vec::with_capacity(len);
        if len > 0 {
            response.push(1.0);
            response.extend(self.continued(&[1.0], len - 1));
        }
        response
    }
}

/// The inner product, in lanes that the compiler can vectorise.
pub(crate) fn dot(a: &[f64], b: &[f64]) -> f64 {
    const LANES: usize = 8;
    let mut lanes = [0.0; LANES];
    let (x, y) = (a.chunks_exact(LANES), b.chunks_exact(LANES));
    let (x_rest, y_rest) = (x.remainder(), y.remainder());
    for (x, y) in x.zip(y) {
        for lane in 0..LANES {
            lanes[lane] += x[lane] * y[lane];
        }
    }
    let rest: f64 = x_rest.iter().zip(y_rest).map(|(x, y)| x * y).sum();
    lanes.iter().sum::<f64>() + rest
}

#[cfg(test)]
mod tests {
    use super::*;
    use std::f64::consts::TAU;

    /// White noise of variance 1 by a plain multiplicative generator: the sum of twelve uniforms less six.
    fn noise(len: usize) -> Vec<f64> {
        let mut state = 12345u64;
        let mut uniform = || {
            state = state.wrapping_mul(6364136223846793005).wrapping_add(1442695040888963407);
            (state >> 11) as f64 / (1u64 << 53) as f64
        };
        (0..len).map(|_| (0..12).map(|_| uniform()).sum::<f64>() - 6.0).collect()
    }

    #[test]
    fn two_known_processes_are_recovered() {
        for weights in [vec![0.9], vec![1.2, -0.7]] {
            let mut line: Vec<f64> = vec![0.0; 2];
            for e in noise(50_000) {
                let n = line.len();
                line.push(e + weights.iter().enumerate().map(|(i, w)| w * line[n - 1 - i]).sum::<f64>());
            }
            let burg = Burg::fit(&line, weights.len());
            let found = burg.predictor(weights.len());
            for (w, f) in weights.iter().zip(&found.weights) {
                // Standard error of an autoregressive weight is at most 1/sqrt(n) = 0.0045; four of them.
                assert!((w - f).abs() < 0.018, "{w} {f}");
            }
            // The innovations have variance 1; standard error sqrt(2/n) = 0.0063.
            assert!((burg.variance(2) - 1.0).abs() < 0.026);
        }
    }

    #[test]
    fn a_tone_is_continued() {
        // Burg's frequency bias on a noiseless tone falls as 1/n and vanishes for high orders: a tenth of a per cent here.
        let tone = |n: usize| (TAU * n as f64 / 17.0 + 0.4).sin();
        let past: Vec<f64> = (0..1000).map(tone).collect();
        let ahead = Burg::fit(&past, 128).predictor(128).continued(&past, 17);
        for (step, value) in ahead.iter().enumerate() {
            assert!((value - tone(1000 + step)).abs() < 1e-3, "{step}: {value} {}", tone(1000 + step));
        }
    }

    #[test]
    fn the_lattice_equals_its_definition() {
        let x = noise(200);
        let (mut f, mut b) = (x.clone(), x.clone());
        let burg = Burg::fit(&x, 6);
        for stage in 1..=6 {
            let pairs = |f: &[f64], b: &[f64]| (stage..200).map(|t| (f[t], b[t - 1])).collect::<Vec<_>>();
            let both = pairs(&f, &b);
            let cross: f64 = both.iter().map(|(f, b)| f * b).sum();
            let energy: f64 = both.iter().map(|(f, b)| f * f + b * b).sum();
            let k = 2.0 * cross / energy;
            assert!((k - burg.reflections[stage - 1]).abs() < 1e-13);
            let (old_f, old_b) = (f.clone(), b.clone());
            for t in stage..200 {
                f[t] = old_f[t] - k * old_b[t - 1];
                b[t] = old_b[t - 1] - k * old_f[t];
            }
        }
    }

    #[test]
    fn lag_products_give_the_same_or_nothing() {
        let tone: Vec<f64> = (0..2000).map(|n| (TAU * n as f64 / 170.0).sin()).collect();
        let product = |x: &[f64], d: usize| x[d..].iter().zip(x).map(|(a, b)| a * b).sum::<f64>();
        for (share, known) in [(1.0, true), (1e-2, true), (1e-4, true), (1e-6, false), (0.0, false)] {
            let x: Vec<f64> = tone.iter().zip(noise(2000)).map(|(t, e)| t + share * e).collect();
            let products: Vec<f64> = (0..=128).map(|d| product(&x, d)).collect();
            let slow = Burg::fit(&x, 128);
            let fast = Burg::from_products(&x, &products, 128, products[0]);
            assert_eq!(fast.is_some(), known, "{share}");
            for (a, b) in fast.iter().flat_map(|f| f.reflections.iter().zip(&slow.reflections)) {
                // Rounding may amount to 1e-6 of the error energy at every stage; a few stages add up.
                assert!((a - b).abs() < 5e-6, "{share}: {a} {b}");
            }
        }
        assert!(Burg::from_products(&[0.0; 9], &[0.0; 9], 4, 0.0).is_none());
    }

    #[test]
    fn constants_and_short_sequences_are_no_trouble() {
        for len in 0..5 {
            let burg = Burg::fit(&vec![0.0; len], 3);
            assert_eq!(burg.order(), 3.min(len.saturating_sub(1)));
            assert!(burg.predictor(3).continued(&vec![0.0; len], 4).iter().all(|v| *v == 0.0));
        }
    }
}
