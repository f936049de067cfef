//! Multiplying coefficients is filtering the extension: by hand for a three-point kernel, and for random kernels.

use std::f64::consts::PI;

use endgrain::ends::Ends;
use proptest::prelude::*;

use crate::{EVEN_ODD_WHOLE, EVEN_WHOLE, ODD_EVEN_WHOLE, ODD_WHOLE, assert_close, forward, inverse, norm};

/// The record, continued past its ends, convolved with the even kernel of which `half` is the right half.
fn convolved(ends: Ends, x: &[f64], half: &[f64]) -> Vec<f64> {
    let value = |i: i64| ends.fold(x.len(), i).map_or(0.0, |(n, sign)| sign * x[n]);
    let at = |n: i64| -> f64 {
        let sides = |(j, h): (usize, &f64)| h * (value(n - j as i64) + value(n + j as i64));
        half[0] * value(n) + half.iter().enumerate().skip(1).map(sides).sum::<f64>()
    };
    (0..x.len() as i64).map(at).collect()
}

/// The same by coefficients: each times the kernel's response h_0 + 2 sum h_j cos(j theta_k).
fn multiplied(ends: Ends, x: &[f64], half: &[f64]) -> Vec<f64> {
    let mut c = forward(ends, x);
    for (k, c) in c.iter_mut().enumerate() {
        let theta = 2.0 * PI * ends.frequency(x.len(), k);
        let sides = |(j, h): (usize, &f64)| 2.0 * h * (j as f64 * theta).cos();
        *c *= half[0] + half.iter().enumerate().skip(1).map(sides).sum::<f64>();
    }
    inverse(ends, &c)
}

/// Worked on paper: 1, 2, 3, 4 extended in each way, kernel 1/4, 1/2, 1/4. That both routes agree is Martucci 1994, IEEE
/// Trans. Signal Processing 42, 1038 (symmetric convolution); Strang 1999, SIAM Review 41, 135 (end conditions).
#[test]
fn three_point_kernel_by_hand() {
    let x = [1.0, 2.0, 3.0, 4.0];
    let rows = [
        (Ends::Periodic, [2.0, 2.0, 3.0, 3.0]),
        (Ends::EVEN, [1.25, 2.0, 3.0, 3.75]),
        (Ends::ODD, [0.75, 2.0, 3.0, 1.75]),
        (Ends::EVEN_ODD, [1.25, 2.0, 3.0, 1.75]),
        (Ends::ODD_EVEN, [0.75, 2.0, 3.0, 3.75]),
        (EVEN_WHOLE, [1.5, 2.0, 3.0, 3.5]),
        (ODD_WHOLE, [1.0, 2.0, 3.0, 2.75]),
        (EVEN_ODD_WHOLE, [1.5, 2.0, 3.0, 2.75]),
        (ODD_EVEN_WHOLE, [1.0, 2.0, 3.0, 3.5]),
    ];
    assert_eq!(rows.len(), Ends::all().count());
    for (ends, expected) in rows {
        assert_close(&convolved(ends, &x, &[0.5, 0.25]), &expected, 0.0, ends.transform());
        assert_close(&multiplied(ends, &x, &[0.5, 0.25]), &expected, 1e-14, ends.transform());
    }
}

/// The kernel's response is 1/2 + 1/2 cos theta on these grids: Martucci 1994, table of frequency grids (from memory).
#[test]
fn frequency_grids() {
    let n = 12;
    let grids: [(Ends, &dyn Fn(f64) -> f64); 8] = [
        (Ends::EVEN, &|k| k / 12.0),
        (Ends::ODD, &|k| (k + 1.0) / 12.0),
        (Ends::EVEN_ODD, &|k| (k + 0.5) / 12.0),
        (Ends::ODD_EVEN, &|k| (k + 0.5) / 12.0),
        (EVEN_WHOLE, &|k| k / 11.0),
        (ODD_WHOLE, &|k| (k + 1.0) / 13.0),
        (EVEN_ODD_WHOLE, &|k| (k + 0.5) / 12.0),
        (ODD_EVEN_WHOLE, &|k| (k + 0.5) / 12.0),
    ];
    for (ends, theta_over_pi) in grids {
        for k in 0..n {
            let mut unit = vec![0.0; n];
            unit[k] = 1.0;
            let v = inverse(ends, &unit);
            let response = 0.5 + 0.5 * (PI * theta_over_pi(k as f64)).cos();
            let expected: Vec<f64> = v.iter().map(|v| response * v).collect();
            // Each basis function is an eigenvector of the convolution: three roundings of values below 1.
            assert_close(&convolved(ends, &v, &[0.5, 0.25]), &expected, 1e-14, ends.transform());
        }
    }
}

proptest! {
    #[test]
    fn coefficient_products_are_convolutions_of_the_extension(
        which in 0..9_usize,
        x in prop::collection::vec(-1.0..1.0, 1..40),
        half in prop::collection::vec(-1.0..1.0, 1..100),
    ) {
        let ends = Ends::all().nth(which).unwrap();
        let (direct, product) = (convolved(ends, &x, &half), multiplied(ends, &x, &half));
        let gain: f64 = 2.0 * half.iter().map(|h: &f64| h.abs()).sum::<f64>();
        assert_close(&product, &direct, 1e-12 * gain * norm(&x), ends.transform());
    }
}
