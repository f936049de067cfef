//! Fourier series from the tables: coefficients of sampled functions, carried to the limit of fine sampling.

use std::f64::consts::{FRAC_1_PI, PI};

use endgrain::basis::{amplitude, series};
use endgrain::ends::Ends;

use crate::{EVEN_WHOLE, ODD_WHOLE, forward, inverse};

/// Samples of f on 0..1 with mirrors 0 and 1, `length` steps apart.
fn sampled(ends: Ends, length: usize, f: &dyn Fn(f64) -> f64) -> Vec<f64> {
    let len = if ends == EVEN_WHOLE {
        length + 1
    } else if ends == ODD_WHOLE {
        length - 1
    } else {
        length
    };
    (0..len).map(|n| f((n as f64 + ends.first_position()) / length as f64)).collect()
}

/// The limit for fine sampling of a figure with an error in even powers of the step (midpoint and trapezoidal rule):
/// Romberg's extrapolation over 32 to 1024 steps.
fn limit(figure: &dyn Fn(usize) -> f64) -> f64 {
    let mut row: Vec<f64> = (5..=10).map(|e| figure(1 << e)).collect();
    let mut power = 1.0;
    while row.len() > 1 {
        power *= 4.0;
        row = row.windows(2).map(|pair| pair[1] + (pair[1] - pair[0]) / (power - 1.0)).collect();
    }
    row[0]
}

/// Factor of cos(k pi x) or sin(k pi x), k half cycles over the record.
fn factor(ends: Ends, f: &dyn Fn(f64) -> f64, k: usize) -> f64 {
    limit(&|length| {
        let x = sampled(ends, length, f);
        let index = if ends == Ends::ODD || ends == ODD_WHOLE { k - 1 } else { k };
        forward(ends, &x)[index] * amplitude(ends, x.len(), index)
    })
}

/// Factors of cos(2 pi k x) and sin(2 pi k x), phases counted from the start of the record.
fn pair(f: &dyn Fn(f64) -> f64, k: usize) -> (f64, f64) {
    let turned = |length: usize| {
        let c = forward(Ends::Periodic, &sampled(Ends::Periodic, length, f));
        let scale = amplitude(Ends::Periodic, length, k);
        let (a, b) = (scale * c[2 * k - 1], scale * c[2 * k]);
        // The basis counts phases from sample 0, half a step into the record.
        let (sin, cos) = (PI * k as f64 / length as f64).sin_cos();
        (a * cos - b * sin, a * sin + b * cos)
    };
    (limit(&|length| turned(length).0), limit(&|length| turned(length).1))
}

fn assert_near(found: f64, expected: f64, tolerance: f64, what: &str) {
    assert!((found - expected).abs() <= tolerance, "{what}: {found} is not {expected} within {tolerance:e}");
}

/// NIST DLMF 24.8.5, n = 1: x - 1/2 = -(4/pi^2) sum over odd k of cos(k pi x)/k^2.
#[test]
fn ramp_in_cosines() {
    for ends in [Ends::EVEN, EVEN_WHOLE] {
        assert_near(factor(ends, &|x| x, 0), 0.5, 1e-12, "mean");
        assert_near(factor(ends, &|x| x, 1), -0.4052847346, 1e-9, "k = 1");
        for k in 1..10 {
            let expected = if k % 2 == 0 { 0.0 } else { -4.0 / (PI * k as f64).powi(2) };
            assert_near(factor(ends, &|x| x, k), expected, 1e-9, "k-th cosine");
        }
    }
}

/// NIST DLMF 24.8.2, n = 0: x - 1/2 = -(1/pi) sum of sin(2 pi k x)/k for 0 < x < 1.
#[test]
fn ramp_in_harmonics() {
    assert_near(pair(&|x| x, 1).1, -FRAC_1_PI, 1e-9, "k = 1"); // 0.3183098862
    for k in 1..8 {
        let (cosine, sine) = pair(&|x| x, k);
        assert_near(cosine, 0.0, 1e-9, "cosine");
        assert_near(sine, -1.0 / (PI * k as f64), 1e-9, "sine");
    }
}

/// Carslaw, Fourier Series and Integrals; CRC Standard Mathematical Tables (pages from memory): x on (0, pi) is
/// sum of 2 (-1)^(n+1) sin(n x)/n.
#[test]
fn ramp_in_sines() {
    for ends in [Ends::ODD, ODD_WHOLE] {
        for (n, expected) in [(1, 2.0), (2, -1.0), (3, 2.0 / 3.0), (4, -0.5)] {
            // 1e-12 is of the source's table; pi times x on 0..1.
            assert_near(factor(ends, &|x| PI * x, n), expected, 1e-12, ends.transform());
        }
    }
}

/// NIST DLMF 24.8.4, n = 1: x(1 - x) = (8/pi^3) sum over odd k of sin(k pi x)/k^3.
#[test]
fn parabola_in_sines() {
    for ends in [Ends::ODD, ODD_WHOLE] {
        let f = |x: f64| x * (1.0 - x);
        assert_near(factor(ends, &f, 1), 0.2580122755, 1e-9, "k = 1");
        for k in 1..8 {
            let expected = if k % 2 == 0 { 0.0 } else { 8.0 / (PI * k as f64).powi(3) };
            assert_near(factor(ends, &f, k), expected, 1e-9, "k-th sine");
        }
    }
}

/// NIST DLMF 24.8.1, n = 1: x(1 - x) = 1/6 - (1/pi^2) sum of cos(2 pi k x)/k^2.
#[test]
fn parabola_in_harmonics() {
    let f = |x: f64| x * (1.0 - x);
    assert_near(pair(&f, 1).0, -0.1013211836, 1e-9, "k = 1");
    for k in 1..8 {
        let (cosine, sine) = pair(&f, k);
        assert_near(cosine, -1.0 / (PI * k as f64).powi(2), 1e-9, "cosine");
        assert_near(sine, 0.0, 1e-9, "sine");
    }
}

/// NIST DLMF 24.8.1, rescaled: x(pi - x) on (0, pi) is pi^2/6 - sum of cos(2 m x)/m^2.
#[test]
fn parabola_in_cosines() {
    let f = |x: f64| PI * PI * x * (1.0 - x);
    for ends in [Ends::EVEN, EVEN_WHOLE] {
        assert_near(factor(ends, &f, 0), PI * PI / 6.0, 1e-12, "mean");
        for k in 1..9 {
            let m = k as f64 / 2.0;
            let expected = if k % 2 == 0 { -1.0 / (m * m) } else { 0.0 };
            assert_near(factor(ends, &f, k), expected, 1e-12, "k-th cosine");
        }
    }
}

/// NIST DLMF 24.8.4, n = 0, and 6.16.1: 1 = (4/pi) sum over odd k of sin(k pi x)/k for 0 < x < 1.
#[test]
fn square_wave_in_sines() {
    for ends in [Ends::ODD, ODD_WHOLE] {
        for (k, printed) in [(1, 1.273239545), (2, 0.0), (3, 0.4244131816)] {
            let expected = if k % 2 == 0 { 0.0 } else { 4.0 / (PI * k as f64) };
            // Ten digits are printed; the closed form carries the rest.
            assert_near(printed, expected, 5e-10, "table");
            assert_near(factor(ends, &|_| 1.0, k), expected, 1e-12, "k-th sine");
        }
    }
}

/// Mean square of the coefficients but the constant.
fn mean_square(ends: Ends, f: &dyn Fn(f64) -> f64, from: usize) -> f64 {
    limit(&|length| {
        let c = forward(ends, &sampled(ends, length, f));
        c[from..].iter().map(|v| v * v).sum::<f64>() / length as f64
    })
}

/// NIST DLMF 1.8.5 (Parseval), 25.6.1; Abramowitz and Stegun 23.2.24 and 23.2.25 (numbers of 25.6.1 and of A&S from
/// memory). The mean square is half the sum of the squared factors.
#[test]
fn sums_of_inverse_powers_by_energy() {
    // Sines of x on (0, pi): 2/n.
    let second = mean_square(Ends::ODD, &|x| PI * x, 0) / 2.0;
    assert_near(second, 1.6449340668482264, 1e-12, "sum of 1/n^2");
    // Cosines of x^2 on (0, pi): 4/n^2.
    let fourth = mean_square(Ends::EVEN, &|x| (PI * x).powi(2), 1) / 8.0;
    assert_near(fourth, 1.0823232337111382, 1e-12, "sum of 1/n^4");
    // Cosines of x on (0, pi): 4/(pi n^2), odd n.
    let odd_fourth = mean_square(Ends::EVEN, &|x| PI * x, 1) * PI * PI / 8.0;
    assert_near(odd_fourth, 1.0146780316041921, 1e-12, "sum of 1/n^4, odd n");
    // Sines of x(pi - x): 8/(pi n^3), odd n; all n by the factor 64/63.
    let odd_sixth = mean_square(Ends::ODD, &|x| PI * PI * x * (1.0 - x), 0) * PI * PI / 32.0;
    assert_near(odd_sixth, 1.0014470766409421, 1e-12, "sum of 1/n^6, odd n");
    assert_near(odd_sixth * 64.0 / 63.0, 1.0173430619844491, 1e-12, "sum of 1/n^6");
}

/// NIST DLMF 1.8.5 with 24.8.5 and 24.8.2: the first cosine holds 96/pi^4 of a ramp's variance, the first harmonic 6/pi^2,
/// the first sine 6/pi^2 of its mean square. The sampled figures for N = 64: numpy and SciPy.
#[test]
fn energy_in_the_first_term_of_a_ramp() {
    let share = |ends: Ends, n: usize, from: usize, terms: usize| {
        let c = forward(ends, &sampled(ends, n, &|x| x));
        let energy = |c: &[f64]| c.iter().map(|v| v * v).sum::<f64>();
        energy(&c[from..from + terms]) / energy(&c[from..])
    };
    assert_near(share(Ends::EVEN, 4096, 1, 1), 96.0 / PI.powi(4), 1e-4, "even, N = 4096");
    assert_near(share(Ends::EVEN, 64, 1, 1), 0.98557699, 5e-9, "even, N = 64");
    assert_near(share(Ends::Periodic, 64, 1, 2), 0.60856419, 5e-9, "periodic, N = 64");
    assert_near(limit(&|n| share(Ends::EVEN, n, 1, 1)), 0.985534296, 5e-10, "even");
    assert_near(limit(&|n| share(Ends::Periodic, n, 1, 2)), 0.607927102, 5e-10, "periodic");
    assert_near(limit(&|n| share(Ends::ODD, n, 0, 1)), 0.607927102, 5e-10, "odd");
}

/// NIST DLMF 6.16(i): the partial sums of a square wave overshoot to (2/pi) Si(pi). The sampled figure: SciPy.
#[test]
fn overshoot_of_a_square_wave() {
    const WILBRAHAM_GIBBS: f64 = 1.1789797444721673;
    // m odd sines, at the first maximum x = L/2m: a midpoint sum of (2/pi) sin(t)/t over 0..pi.
    let summit = limit(&|m| {
        let len = 2 * m;
        let mut c = vec![0.0; len];
        for k in (0..len).step_by(2) {
            c[k] = 4.0 / (PI * (k + 1) as f64) / amplitude(ODD_WHOLE, len, k);
        }
        series::value_at(ODD_WHOLE, len, &c, ODD_WHOLE.length(len) / (2.0 * m as f64))
    });
    assert_near(summit, WILBRAHAM_GIBBS, 1e-12, "limit of the summits");

    let mut c = forward(Ends::ODD, &[1.0; 4096]);
    c[256..].fill(0.0);
    let maximum = inverse(Ends::ODD, &c).into_iter().fold(0.0, f64::max);
    assert_near(maximum, 1.17833361, 5e-9, "256 of 4096 sines");
    assert_near(maximum, WILBRAHAM_GIBBS, 2e-3, "256 of 4096 sines");
}

/// NIST DLMF 1.8.11: at a jump the series takes the mean of both sides, here (f(0+) + f(1-))/2.
#[test]
fn a_periodic_ramp_takes_the_mean_at_the_seam() {
    for n in [1, 2, 9, 64] {
        let c = forward(Ends::Periodic, &sampled(Ends::Periodic, n, &|x| x));
        for seam in [0.0, n as f64] {
            // n terms below 1, each with a few roundings of its phase.
            let tolerance = 8.0 * f64::EPSILON * (n as f64).sqrt();
            assert_near(series::value_at(Ends::Periodic, n, &c, seam), 0.5, tolerance, "seam");
        }
    }
}
