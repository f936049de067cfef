//! Sums with a closed form, and the matrices that the bases diagonalise.

use std::f64::consts::PI;

use endgrain::ends::Ends;

use crate::{ODD_WHOLE, assert_close, forward, inverse, norm, unnormalised};

/// Closed form of a geometric sum (derivation; discrete twin of NIST DLMF 24.8.5).
#[test]
fn cosine_sums_of_a_ramp() {
    for n in [2, 3, 16, 45, 128] {
        let ramp: Vec<f64> = (0..n).map(|i| i as f64).collect();
        let sums: Vec<f64> = unnormalised(Ends::EVEN, &ramp).iter().map(|v| v / 2.0).collect();
        for k in 1..n {
            let half = PI * k as f64 / (2.0 * n as f64);
            let expected = if k % 2 == 0 { 0.0 } else { -2.0 * half.cos() / (4.0 * half.sin().powi(2)) };
            assert!((sums[k] - expected).abs() < 1e-12 * norm(&ramp), "n = {n}, k = {k}: {} {expected}", sums[k]);
        }
    }
}

/// Closed form (derivation; discrete twin of NIST DLMF 24.8.4, n = 1); the digits for N = 16 by the same formula.
#[test]
fn sine_sums_of_a_parabola() {
    for n in [2, 3, 16, 45, 128] {
        let parabola: Vec<f64> = (1..n).map(|j| (j * (n - j)) as f64).collect();
        let sums: Vec<f64> = unnormalised(ODD_WHOLE, &parabola).iter().map(|v| v / 2.0).collect();
        let expected: Vec<f64> = (1..n)
            .map(|k| {
                let half = PI * k as f64 / (2.0 * n as f64);
                if k % 2 == 0 { 0.0 } else { 1.0 / (half.tan() * 2.0 * half.sin().powi(2)) }
            })
            .collect();
        assert_close(&sums, &expected, 1e-12 * norm(&parabola), "DST-I of j(N-j)");
        if n == 16 {
            assert_close(&sums[..3], &[528.405857627808, 0.0, 19.560616064423], 528.0 * 1e-12, "N = 16");
        }
    }
}

/// Closed forms (derivation; discrete twins of NIST DLMF 24.8.4, n = 0).
#[test]
fn sine_sums_of_ones() {
    for n in [2, 3, 16, 45, 128] {
        let odd = |k: usize, value: f64| if k.is_multiple_of(2) { 0.0 } else { value };
        let half = |k: usize| PI * k as f64 / (2.0 * n as f64);
        let meshpoint: Vec<f64> = (1..n).map(|k| odd(k, 1.0 / half(k).tan())).collect();
        let midpoint: Vec<f64> = (1..=n).map(|k| odd(k, 1.0 / half(k).sin())).collect();
        let sums = |ends: Ends, len: usize| -> Vec<f64> {
            unnormalised(ends, &vec![1.0; len]).iter().map(|v| v / 2.0).collect()
        };
        // Relative to the largest, 2n/pi.
        assert_close(&sums(ODD_WHOLE, n - 1), &meshpoint, 1e-14 * n as f64, "DST-I of ones");
        assert_close(&sums(Ends::ODD, n), &midpoint, 1e-14 * n as f64, "DST-II of ones");
    }
}

/// Classical; discrete twin of NIST DLMF 24.8.2, n = 0.
#[test]
fn harmonics_of_a_ramp() {
    for n in [3_usize, 16, 45, 128] {
        let ramp: Vec<f64> = (0..n).map(|i| i as f64).collect();
        let c = forward(Ends::Periodic, &ramp);
        for k in 1..n.div_ceil(2) {
            // |X_k| = sqrt(N/2) times the length of the pair.
            let magnitude = (n as f64 / 2.0).sqrt() * c[2 * k - 1].hypot(c[2 * k]);
            let expected = n as f64 / (2.0 * (PI * k as f64 / n as f64).sin());
            assert!((magnitude - expected).abs() < 1e-12 * norm(&ramp), "n = {n}, k = {k}");
        }
        if n % 2 == 0 {
            // k = N/2: sin = 1.
            assert!(((n as f64).sqrt() * c[n - 1].abs() - n as f64 / 2.0).abs() < 1e-12 * norm(&ramp));
        }
    }
}

/// Strang 1999, SIAM Review 41, 135: zero slope at midpoints makes the DCT-II vectors the eigenvectors of the second
/// difference with corners 1; lambda_k = 2 - 2 cos(pi k/N).
#[test]
fn cosines_are_eigenvectors_with_free_ends() {
    let printed = [0.0, 0.15224093, 0.58578644, 1.23463314, 2.0, 2.76536686, 3.41421356, 3.84775907];
    second_difference(Ends::EVEN, 1.0, &|k, n| 2.0 - 2.0 * (PI * k as f64 / n as f64).cos());
    for (k, lambda) in printed.into_iter().enumerate() {
        let theta = 2.0 * PI * Ends::EVEN.frequency(8, k);
        assert!((2.0 - 2.0 * theta.cos() - lambda).abs() < 5e-9); // the source prints 8 decimals
    }
}

/// Strang 1999: zero value on the missing neighbours makes the DST-I vectors the eigenvectors of the second difference
/// with corners 2; lambda_k = 2 - 2 cos(pi (k + 1)/(N + 1)).
#[test]
fn sines_are_eigenvectors_with_fixed_ends() {
    second_difference(ODD_WHOLE, 2.0, &|k, n| 2.0 - 2.0 * (PI * (k + 1) as f64 / (n + 1) as f64).cos());
}

fn second_difference(ends: Ends, corner: f64, eigenvalue: &dyn Fn(usize, usize) -> f64) {
    for n in [2, 8, 13] {
        for k in 0..n {
            let mut unit = vec![0.0; n];
            unit[k] = 1.0;
            let v = inverse(ends, &unit);
            let product: Vec<f64> = (0..n)
                .map(|i| {
                    let diagonal = if i == 0 || i + 1 == n { corner } else { 2.0 };
                    let left = if i > 0 { v[i - 1] } else { 0.0 };
                    let right = if i + 1 < n { v[i + 1] } else { 0.0 };
                    diagonal * v[i] - left - right
                })
                .collect();
            let expected: Vec<f64> = v.iter().map(|v| eigenvalue(k, n) * v).collect();
            assert_close(&product, &expected, 1e-12, &format!("{}, n = {n}, k = {k}", ends.transform()));
        }
    }
}
