//! How fast coefficients fall: what the continuity of the extension promises.

use std::f64::consts::PI;

use endgrain::ends::Ends;

use crate::forward;

const N: usize = 4096;

fn sampled(f: &dyn Fn(f64) -> f64) -> Vec<f64> {
    (0..N).map(|n| f((n as f64 + 0.5) / N as f64)).collect()
}

const ALL: (usize, usize) = (9, 1);
const ODD_K: (usize, usize) = (9, 2);
const EVEN_K: (usize, usize) = (10, 2);

/// Slope of ln |coefficient| over ln k up to k = 199, harmonics by the length of the pair.
fn slope(ends: Ends, x: &[f64], (first, stride): (usize, usize)) -> f64 {
    let c = forward(ends, x);
    let size = |k: usize| match ends {
        Ends::Periodic => c[2 * k - 1].hypot(c[2 * k]),
        _ if ends == Ends::ODD => c[k - 1].abs(),
        _ => c[k].abs(),
    };
    let points: Vec<(f64, f64)> = (first..=199).step_by(stride).map(|k| ((k as f64).ln(), size(k).ln())).collect();
    let count = points.len() as f64;
    let (mean_u, mean_v) = points.iter().fold((0.0, 0.0), |(a, b), (u, v)| (a + u / count, b + v / count));
    let (uv, uu) =
        points.iter().fold((0.0, 0.0), |(a, b), (u, v)| (a + (u - mean_u) * (v - mean_v), b + (u - mean_u).powi(2)));
    uv / uu
}

fn assert_slope(ends: Ends, f: &dyn Fn(f64) -> f64, which: (usize, usize), expected: f64) {
    let found = slope(ends, &sampled(f), which);
    // The tolerance allows for sampling: at k = 199 of 4096 coefficients differ from the integrals by up to 1 %.
    assert!((found - expected).abs() < 0.02, "{}: slope {found}, expected {expected}", ends.transform());
}

/// NIST DLMF 24.8.5, 24.8.2, 24.8.4 and 24.8.1: one record, three extensions. Where every other coefficient vanishes only
/// the rest are fitted.
#[test]
fn ramp_and_parabola_fall_as_their_series() {
    let parabola = |x: f64| x * (1.0 - x);
    assert_slope(Ends::EVEN, &|x| x, ODD_K, -2.0);
    assert_slope(Ends::Periodic, &|x| x, ALL, -1.0);
    assert_slope(Ends::ODD, &|x| x, ALL, -1.0);
    assert_slope(Ends::ODD, &parabola, ODD_K, -3.0);
    assert_slope(Ends::Periodic, &parabola, ALL, -2.0);
}

/// NIST DLMF 1.8.7: an m-th derivative that jumps gives k^-(m+1). The odd extension of x^2 (1 - x)^2 jumps first in its
/// second derivative, the even and the periodic one in their third.
#[test]
fn decay_follows_from_continuity() {
    let f = |x: f64| (x * (1.0 - x)).powi(2);
    assert_slope(Ends::ODD, &f, ODD_K, -3.0);
    assert_slope(Ends::EVEN, &f, EVEN_K, -4.0);
    assert_slope(Ends::Periodic, &f, ALL, -4.0);
}

/// Values: SciPy. Claim: Lanczos, Discourse on Fourier Series (1966), and Jones and Hardy 1970, Mathematics of Computation
/// 24, 547 (both from memory): taking off the line through the end values raises the odd decay from k^-1 to k^-3.
#[test]
fn an_exponential_with_and_without_its_end_line() {
    let f = |t: f64| (PI * t).exp();
    assert_slope(Ends::Periodic, &f, ALL, -0.9985);
    assert_slope(Ends::EVEN, &f, ALL, -1.9991);
    assert_slope(Ends::ODD, &f, ALL, -0.9984);
    assert_slope(Ends::ODD, &|t| f(t) - (1.0 + (PI.exp() - 1.0) * t), ALL, -2.9983);
}
