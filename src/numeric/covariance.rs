//! Autoregression by least squares over forward and backward one-step errors, held back a little by a ridge.
//!
//! Source: the modified covariance method, Marple 1987, Digital Spectral Analysis, section 8.5.

use crate::numeric::autoregression::{Predictor, dot};

/// The predictor of `order` that minimises forward and backward squared errors plus `ridge` times the mean diagonal of
/// the normal matrix times the squared weights. Values are taken as they are: remove a mean first. All weights are zero
/// when the values say nothing (constant zero, or too few).
pub fn fit(values: &[f64], order: usize, ridge: f64) -> Predictor {
    let order = order.min(values.len().saturating_sub(1));
    let product = |lag: usize| dot(&values[lag..], &values[..values.len() - lag]);
    let products: Vec<f64> = if values.is_empty() { vec![0.0] } else { (0..=order).map(product).collect() };
    from_products(values, &products, order, ridge)
}

/// The same from the lag products c(d) = sum of x(t) x(t - d) over the whole sequence, d = 0 to at least `order`.
pub fn from_products(values: &[f64], products: &[f64], order: usize, ridge: f64) -> Predictor {
    let order = order.min(values.len().saturating_sub(1)).min(products.len().saturating_sub(1));
    if order == 0 {
        return Predictor { weights: Vec::new() };
    }
    let products = normal_products(values, products, order);
    let at = |i: usize, j: usize| products[i * (order + 1) + j];
    // Backward errors are forward errors of the reversed stretch: c(p - i, p - j).
    let both = |i: usize, j: usize| at(i, j) + at(order - i, order - j);
    let mut matrix = vec![0.0; order * order];
    let mut right = vec![0.0; order];
    let mut trace = 0.0;
    for i in 0..order {
        right[i] = both(i + 1, 0);
        trace += both(i + 1, i + 1);
        for j in 0..=i {
            matrix[i * order + j] = both(i + 1, j + 1);
        }
    }
    let lift = ridge * trace / order as f64;
    for i in 0..order {
        matrix[i * order + i] += lift;
    }
    if !solve(&mut matrix, &mut right) {
        right.fill(0.0);
    }
    Predictor { weights: right }
}

/// c(i, j) = sum over t = order..n of x(t-i) x(t-j), row by row. The first row is that of the whole sequence less its
/// first pairs; each further entry differs from its upper left neighbour by two products at the ends.
fn normal_products(x: &[f64], whole: &[f64], order: usize) -> Vec<f64> {
    let n = x.len();
    let width = order + 1;
    let mut c = vec![0.0; width * width];
    for j in 0..width {
        c[j] = whole[j] - dot(&x[j..order], &x[..order - j]);
        c[j * width] = c[j];
    }
    for i in 0..order {
        for j in i..order {
            let next = c[i * width + j] + x[order - 1 - i] * x[order - 1 - j] - x[n - 1 - i] * x[n - 1 - j];
            c[(i + 1) * width + j + 1] = next;
            c[(j + 1) * width + i + 1] = next;
        }
    }
    c
}

/// Cholesky factor of the lower triangle in place, then both triangular systems. False when the matrix is not positive.
fn solve(matrix: &mut [f64], right: &mut [f64]) -> bool {
    let n = right.len();
    for i in 0..n {
        let (above, rows) = matrix.split_at_mut(i * n);
        let row = &mut rows[..n];
        for j in 0..i {
            let other = &above[j * n..j * n + n];
            row[j] = (row[j] - dot(&row[..j], &other[..j])) / other[j];
        }
        let rest = row[i] - dot(&row[..i], &row[..i]);
        if rest.is_nan() || rest <= 0.0 {
            return false;
        }
        row[i] = rest.sqrt();
    }
    for i in 0..n {
        let row = &matrix[i * n..i * n + n];
        right[i] = (right[i] - dot(&row[..i], &right[..i])) / row[i];
    }
    for i in (0..n).rev() {
        right[i] /= matrix[i * n + i];
        let value = right[i];
        for (j, r) in right[..i].iter_mut().enumerate() {
            *r -= matrix[i * n + j] * value;
        }
    }
    true
}

#[cfg(test)]
mod tests {
    use super::*;
    use std::f64::consts::TAU;

    #[test]
    fn two_tones_are_continued_exactly_without_a_ridge() {
        // Four weights annihilate two tones: the residual is rounding alone, amplified by the condition of the matrix.
        let tones = |n: usize| (TAU * n as f64 / 11.3).sin() + 0.5 * (TAU * n as f64 / 5.7 + 1.0).cos();
        let past: Vec<f64> = (0..200).map(tones).collect();
        let ahead = fit(&past, 4, 0.0).continued(&past, 50);
        for (step, value) in ahead.iter().enumerate() {
            assert!((value - tones(200 + step)).abs() < 1e-9, "{step}");
        }
    }

    #[test]
    fn lag_products_equal_their_definition() {
        let x: Vec<f64> = (0..40).map(|n| ((n * n) % 17) as f64 - 8.0).collect();
        let order = 5;
        let whole: Vec<f64> = (0..=order).map(|d| x[d..].iter().zip(&x).map(|(a, b)| a * b).sum()).collect();
        let c = normal_products(&x, &whole, order);
        for i in 0..=order {
            for j in 0..=order {
                let sum: f64 = (order..40).map(|t| x[t - i] * x[t - j]).sum();
                // Integers: every sum is exact.
                assert_eq!(sum, c[i * 6 + j]);
            }
        }
    }

    #[test]
    fn a_ridge_shrinks_and_silence_says_nothing() {
        let past: Vec<f64> = (0..100).map(|n| (TAU * n as f64 / 11.3).sin()).collect();
        let size = |p: Predictor| p.weights.iter().map(|w| w * w).sum::<f64>();
        assert!(size(fit(&past, 8, 0.1)) < size(fit(&past, 8, 1e-6)));
        assert_eq!(fit(&[0.0; 20], 4, 1e-3).weights, vec![0.0; 4]);
        assert!(fit(&[1.0], 4, 1e-3).weights.is_empty());
    }
}
