//! The cosine series that fits samples at uneven positions best, read off on an even grid.

use std::f64::consts::PI;

use realfft::RealFftPlanner;
use rustfft::num_complex::Complex;

use super::fourier::quarter_turns;

/// Part of the number of samples that may be coefficients: the rest keeps the fit from chasing noise between samples.
const COEFFICIENTS: f64 = 0.95;
/// Relative size of the gradient at which the fit is done, and steps after which it stops anyway.
const DONE: f64 = 1e-10;
const STEPS: usize = 200;
/// What the Taylor series about the nearest grid point may leave out.
const LEFT_OUT: f64 = 1e-13;

/// Values at 0, 1 … `len` - 1 of the series sum over k < 0.95 of the number of samples of c_k cos(k pi (x + 1/2) / len) that has
/// the least sum of squared differences from the samples `y` at `x` (in grid steps, ascending, within half a step of the
/// grid's ends). Conjugate gradients on the normal equations (Hestenes and Stiefel 1952), each product by Taylor series about
/// the nearest grid points. `None` where a sample is not finite or lies farther out.
pub fn on_grid(x: &[f64], y: &[f64], len: usize) -> Option<Vec<f64>> {
    let out = |x: f64| !(-1.0..=len as f64).contains(&x);
    if len == 0 || x.len() != y.len() || x.iter().any(|&x| out(x)) || y.iter().any(|y| !y.is_finite()) {
        return None;
    }
    let mut fit = Fit::new(x, len);
    let scale = y.iter().fold(0.0_f64, |most, y| most.max(y.abs()));
    if scale == 0.0 {
        return Some(vec![0.0; len]);
    }
    let mut series = vec![0.0; fit.count];
    let mut rest: Vec<f64> = y.iter().map(|y| y / scale).collect();
    let mut gradient = fit.adjoint(&rest);
    let mut direction = gradient.clone();
    let square = |v: &[f64]| v.iter().map(|v| v * v).sum::<f64>();
    let first = square(&gradient);
    let mut before = first;
    for _ in 0..STEPS {
        if before <= DONE * DONE * first {
            break;
        }
        let along = fit.forward(&direction);
        let length = before / square(&along);
        if !length.is_finite() {
            break;
        }
        series.iter_mut().zip(&direction).for_each(|(c, d)| *c += length * d);
        rest.iter_mut().zip(&along).for_each(|(r, a)| *r -= length * a);
        gradient = fit.adjoint(&rest);
        let now = square(&gradient);
        direction.iter_mut().zip(&gradient).for_each(|(d, g)| *d = g + now / before * *d);
        before = now;
    }
    let mut values = fit.derivative(&series, 0);
    values.iter_mut().for_each(|v| *v *= scale);
    Some(values)
}

/// Positions as nearest grid points and distances from them.
struct Fit {
    nearest: Vec<usize>,
    distance: Vec<f64>,
    len: usize,
    /// Number of coefficients.
    count: usize,
    /// Terms of the Taylor series.
    terms: usize,
    planner: RealFftPlanner<f64>,
}

impl Fit {
    fn new(x: &[f64], len: usize) -> Fit {
        let nearest: Vec<usize> = x.iter().map(|x| (x.round().max(0.0) as usize).min(len - 1)).collect();
        let distance: Vec<f64> = x.iter().zip(&nearest).map(|(x, &n)| x - n as f64).collect();
        let farthest = distance.iter().fold(0.0_f64, |most, d| most.max(d.abs()));
        let (mut terms, mut term) = (1, 1.0);
        while term > LEFT_OUT && terms < 40 {
            term *= PI * farthest / terms as f64;
            terms += 1;
        }
        let count = ((COEFFICIENTS * x.len().min(len) as f64) as usize).max(1);
        Fit { nearest, distance, len, count, terms, planner: RealFftPlanner::new() }
    }

    /// i^`turns` (k pi / len)^`turns` at half a step from the mirror.
    fn factor(&self, k: usize, turns: usize) -> Complex<f64> {
        let angle = PI * k as f64 / self.len as f64;
        quarter_turns(turns as i32) * Complex::from_polar(angle.powi(turns as i32), angle / 2.0)
    }

    /// The derivative of that order of a series on the grid.
    fn derivative(&mut self, series: &[f64], order: usize) -> Vec<f64> {
        let inverse = self.planner.plan_fft_inverse(2 * self.len);
        let mut lines = inverse.make_input_vec();
        for (k, c) in series.iter().enumerate() {
            lines[k] = self.factor(k, order) * if k == 0 { *c } else { c / 2.0 };
        }
        lines[0].im = 0.0;
        let mut values = inverse.make_output_vec();
        // The lengths are the plan's own and the ends are real.
        let _ = inverse.process(&mut lines, &mut values);
        values.truncate(self.len);
        values
    }

    /// The series at the positions.
    fn forward(&mut self, series: &[f64]) -> Vec<f64> {
        let mut sum = vec![0.0; self.nearest.len()];
        let mut powers = vec![1.0; self.nearest.len()];
        for order in 0..self.terms {
            let values = self.derivative(series, order);
            for (i, &n) in self.nearest.iter().enumerate() {
                sum[i] += powers[i] * values[n];
                powers[i] *= self.distance[i] / (order + 1) as f64;
            }
        }
        sum
    }

    /// For each coefficient the sum of `rest` times its cosine at the positions.
    fn adjoint(&mut self, rest: &[f64]) -> Vec<f64> {
        let forward = self.planner.plan_fft_forward(2 * self.len);
        let mut sums = vec![0.0; self.count];
        let mut weighted = rest.to_vec();
        let mut lines = forward.make_output_vec();
        for order in 0..self.terms {
            let mut grid = vec![0.0; 2 * self.len];
            for (i, &n) in self.nearest.iter().enumerate() {
                grid[n] += weighted[i];
                weighted[i] *= self.distance[i] / (order + 1) as f64;
            }
            let _ = forward.process(&mut grid, &mut lines);
            for (k, sum) in sums.iter_mut().enumerate() {
                *sum += (self.factor(k, order) * lines[k].conj()).re;
            }
        }
        sums
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn jittered(len: usize, jitter: f64) -> Vec<f64> {
        let mut seed = 11_u64;
        let mut uniform = || {
            seed = seed.wrapping_mul(6_364_136_223_846_793_005).wrapping_add(1_442_695_040_888_963_407);
            (seed >> 11) as f64 / (1_u64 << 53) as f64
        };
        (0..len).map(|n| n as f64 + jitter * (2.0 * uniform() - 1.0)).collect()
    }

    #[test]
    fn products_equal_their_definition() {
        let x = jittered(23, 0.45);
        let mut fit = Fit::new(&x, 23);
        let cosine = |k: usize, x: f64| (PI * k as f64 * (x + 0.5) / 23.0).cos();
        let series: Vec<f64> = (0..fit.count).map(|k| 1.0 / (k as f64 + 1.0) - 0.3).collect();
        for (i, value) in fit.forward(&series).into_iter().enumerate() {
            let plain: f64 = series.iter().enumerate().map(|(k, c)| c * cosine(k, x[i])).sum();
            assert!((value - plain).abs() < 1e-11, "{i}: {value} {plain}"); // 22 terms of Taylor remainders of 1e-13
        }
        let rest: Vec<f64> = (0..23).map(|i| (f64::from(i) * 1.7).sin()).collect();
        for (k, value) in fit.adjoint(&rest).into_iter().enumerate() {
            let plain: f64 = rest.iter().zip(&x).map(|(r, &x)| r * cosine(k, x)).sum();
            assert!((value - plain).abs() < 1e-11, "{k}: {value} {plain}");
        }
    }

    #[test]
    fn content_that_a_spline_loses_is_kept() {
        // Cosines of the basis itself, up to 0.45 of the rate: exact but for rounding and the stopping rule.
        let len = 400;
        let truth = |x: f64| {
            [(12, 1.0), (150, 0.5), (360, 0.7)]
                .iter()
                .map(|&(k, a)| a * (PI * f64::from(k) * (x + 0.5) / len as f64).cos())
                .sum::<f64>()
        };
        let x = jittered(len, 0.2);
        let y: Vec<f64> = x.iter().map(|&x| truth(x)).collect();
        let found = on_grid(&x, &y, len).expect("sound samples");
        let worst = (0..len).map(|n| (found[n] - truth(n as f64)).abs()).fold(0.0, f64::max);
        assert!(worst < 1e-7, "{worst}");
        // The same with samples missing: the fit still passes through the others.
        let kept = |n: &usize| !n.is_multiple_of(37);
        let (fewer_x, fewer_y): (Vec<f64>, Vec<f64>) = (0..len).filter(kept).map(|n| (x[n], y[n])).unzip();
        let found = on_grid(&fewer_x, &fewer_y, len).expect("sound samples");
        let worst = (0..len).filter(kept).map(|n| (found[n] - truth(n as f64)).abs()).fold(0.0, f64::max);
        assert!(worst < 1e-3, "{worst}");
    }

    #[test]
    fn odd_input_does_no_harm() {
        assert_eq!(on_grid(&[0.0], &[2.0], 0), None);
        assert_eq!(on_grid(&[0.0, f64::NAN], &[2.0, 1.0], 2), None);
        assert_eq!(on_grid(&[0.0, 1.0], &[0.0, 0.0], 2), Some(vec![0.0, 0.0]));
        assert!(on_grid(&[0.1], &[3.0], 1).is_some_and(|v| (v[0] - 3.0).abs() < 1e-9));
    }
}
