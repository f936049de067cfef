//! Smoothing against published figures, closed forms and a dense solution.

use std::f64::consts::TAU;

use super::*;
use crate::numeric::sum;

const SHORT: [f64; 8] = [0.0, 1.0, 0.0, 0.0, 2.0, 1.0, 3.0, 2.0];

fn even(len: usize) -> Smoother {
    Smoother::new(&Planner::new(), Ends::EVEN, len, 2).expect("a smoother")
}

/// Standard normal deviates, the same every time.
fn noise(len: usize, mut state: u64) -> Vec<f64> {
    let mut uniform = move || {
        state = state.wrapping_mul(6364136223846793005).wrapping_add(1442695040888963407);
        ((state >> 11) as f64 + 0.5) / (1u64 << 53) as f64
    };
    (0..len).map(|_| (-2.0 * uniform().ln()).sqrt() * (TAU * uniform()).cos()).collect()
}

/// (W + s P) z = W y with the penalty written out for even ends, by Gaussian elimination: the definition.
fn dense(y: &[f64], w: &[f64], strength: f64, order: usize) -> Vec<f64> {
    let n = y.len();
    // Second differences with the end sample repeated: tridiagonal -1, 2, -1 with 1 in both corners.
    let neumann = |i: usize, j: usize| -> f64 {
        if i == j {
            2.0 - f64::from(u8::from(i == 0)) - f64::from(u8::from(i + 1 == n))
        } else if i.abs_diff(j) == 1 {
            -1.0
        } else {
            0.0
        }
    };
    let mut penalty: Vec<Vec<f64>> = (0..n).map(|i| (0..n).map(|j| f64::from(u8::from(i == j))).collect()).collect();
    for _ in 0..order {
        let product = |i: usize, j: usize| (0..n).map(|k| penalty[i][k] * neumann(k, j)).sum();
        penalty = (0..n).map(|i| (0..n).map(|j| product(i, j)).collect()).collect();
    }
    let mut rows: Vec<Vec<f64>> = (0..n)
        .map(|i| {
            let mut row: Vec<f64> = penalty[i].iter().map(|p| strength * p).collect();
            row[i] += w[i];
            row.push(w[i] * y[i]);
            row
        })
        .collect();
    for c in 0..n {
        let pivot = (c..n).max_by(|&a, &b| rows[a][c].abs().total_cmp(&rows[b][c].abs())).unwrap();
        rows.swap(c, pivot);
        for r in 0..n {
            if r != c {
                let factor = rows[r][c] / rows[c][c];
                for k in c..=n {
                    rows[r][k] -= factor * rows[c][k];
                }
            }
        }
    }
    (0..n).map(|i| rows[i][n] / rows[i][i]).collect()
}

fn distance(a: &[f64], b: &[f64]) -> f64 {
    a.iter().zip(b).map(|(a, b)| (a - b).abs()).fold(0.0, f64::max)
}

#[test]
fn a_short_record_is_smoothed_to_the_published_figures() {
    // Garcia 2010, eqs 6 to 9, worked out by a direct solution of (I + s D'D) z = y.
    let z = [0.279061, 0.386031, 0.572065, 0.870655, 1.258084, 1.623571, 1.930527, 2.080005];
    let smoother = even(8);
    assert!(distance(&smoother.smooth(&SHORT, 10.0), &z) < 1e-6);
    assert!(distance(&dense(&SHORT, &[1.0; 8], 10.0, 2), &z) < 1e-6);
    for (strength, trace, score) in
        [(0.1, 5.978076, 1.805691), (1.0, 3.575937, 1.121794), (10.0, 2.151574, 0.848924), (100.0, 1.341577, 1.114301)]
    {
        assert!((smoother.freedom(strength) - trace).abs() < 1e-6, "{strength}");
        assert!((freedom(Ends::EVEN, 8, strength) - trace).abs() < 1e-6, "{strength}");
        assert!((smoother.score(&SHORT, strength) - score).abs() < 1e-6, "{strength}");
    }
    let found = smoother.validated(&SHORT);
    assert!((5.0..20.0).contains(&found.strength) && found.score <= 0.848924 + 1e-6, "{found:?}");
}

#[test]
fn leverage_tends_to_its_closed_form() {
    // Garcia 2010: h = sqrt(1 + sqrt(1 + 16 s))/(sqrt 2 sqrt(1 + 16 s)), the limit of long records.
    for (strength, leverage) in [(0.1, 0.708798), (1.0, 0.388175), (10.0, 0.206182), (100.0, 0.113174)] {
        let n = 1_000_000;
        // The end terms add half a sample's freedom each.
        assert!((freedom(Ends::EVEN, n, strength) / n as f64 - leverage).abs() < 2e-6, "{strength}");
    }
}

#[test]
fn gaps_are_solved_as_a_dense_system_is() {
    for (order, len, strength) in [(2, 40, 1.0), (2, 40, 1e4), (3, 40, 100.0), (1, 36, 0.5)] {
        let y: Vec<f64> = (0..len).map(|n| (0.3 * n as f64).sin() + 0.1 * (7.7 * n as f64).cos()).collect();
        let mut w = vec![1.0; len];
        w[7..12].fill(0.0);
        w[20] = 0.0;
        w[30] = 0.25;
        let smoother = Smoother::new(&Planner::new(), Ends::EVEN, len, order).unwrap();
        let found = smoother.weighted(&y, &w, strength, &bridged(&y, &w));
        let exact = dense(&y, &w, strength, order as usize);
        assert!(distance(&found, &exact) < 1e-8, "{order} {strength}: {}", distance(&found, &exact));
        // Nothing of a missing sample shows.
        let mut other = y.clone();
        other[7..12].fill(1e6);
        other[20] = -1e6;
        assert_eq!(smoother.weighted(&other, &w, strength, &bridged(&y, &w)), found);
    }
}

#[test]
fn a_gap_filled_by_the_fit_is_smoothed_to_the_same_fit() {
    // The minimum over z with weight 0 in the gap is a fixed point of filling and smoothing: what lets a filled record run
    // through a whole chain.
    let y: Vec<f64> = (0..200).map(|n| (0.1 * n as f64).sin()).zip(noise(200, 5)).map(|(a, e)| a + 0.1 * e).collect();
    let mut w = vec![1.0; 200];
    w[60..75].fill(0.0);
    let smoother = even(200);
    let fit = smoother.weighted(&y, &w, 50.0, &bridged(&y, &w));
    let filled: Vec<f64> = (0..200).map(|n| if w[n] > 0.0 { y[n] } else { fit[n] }).collect();
    assert!(distance(&smoother.smooth(&filled, 50.0), &fit) < 1e-8);
}

#[test]
fn smoothing_is_linear_and_leaves_constants_alone() {
    let (a, b) = (noise(300, 1), noise(300, 2));
    for ends in [Ends::EVEN, Ends::ODD, Ends::Periodic, Ends::EVEN_ODD] {
        let smoother = Smoother::new(&Planner::new(), ends, 300, 2).unwrap();
        let both: Vec<f64> = a.iter().zip(&b).map(|(a, b)| 2.0 * a - 3.0 * b).collect();
        let apart: Vec<f64> =
            smoother.smooth(&a, 30.0).iter().zip(smoother.smooth(&b, 30.0)).map(|(a, b)| 2.0 * a - 3.0 * b).collect();
        assert!(distance(&smoother.smooth(&both, 30.0), &apart) < 1e-13);
    }
    assert!(distance(&even(50).smooth(&[7.5; 50], 1e6), &[7.5; 50]) < 1e-13);
}

#[test]
fn a_wave_keeps_the_gain_of_its_frequency() {
    // A cosine of k half-cycles between even mirrors is an eigenvector: 1/(1 + s (2 - 2 cos(k pi/N))^2).
    let (len, k, strength) = (128, 9, 77.0);
    let angle = std::f64::consts::PI * f64::from(k) / len as f64;
    let wave: Vec<f64> = (0..len).map(|n| (angle * (n as f64 + 0.5)).cos()).collect();
    let kept = 1.0 / (1.0 + strength * (2.0 - 2.0 * angle.cos()).powi(2));
    let expected: Vec<f64> = wave.iter().map(|v| kept * v).collect();
    assert!(distance(&even(len).smooth(&wave, strength), &expected) < 1e-13);
}

#[test]
fn outliers_and_gaps_do_not_spoil_a_robust_fit() {
    // Slow tones of RMS 1 with noise 0.1 and 3 % of outliers. Cross-validation without weights follows the outliers: the
    // robust fit must come within half of its error, and near what the same fit makes of the record without outliers.
    let len = 2000;
    let truth: Vec<f64> =
        (0..len).map(|n| (TAU * 0.004 * n as f64).sin() + (TAU * 0.0091 * n as f64 + 1.0).sin()).collect();
    let mut y: Vec<f64> = truth.iter().zip(noise(len, 9)).map(|(t, e)| t + 0.1 * e).collect();
    let clean = y.clone();
    for n in (0..len).step_by(33) {
        y[n] += if n % 2 == 0 { 3.0 } else { -4.0 };
    }
    let smoother = even(len);
    let rms = |z: &[f64]| sum::rms(&z.iter().zip(&truth).map(|(a, b)| a - b).collect::<Vec<_>>());
    let plain = rms(&smoother.smooth(&y, smoother.validated(&y).strength));
    let undisturbed = rms(&smoother.smooth(&clean, smoother.validated(&clean).strength));
    let robust = smoother.robust(&y, None, None);
    assert!(rms(&robust.values) < 0.5 * plain, "{} {plain}", rms(&robust.values));
    assert!(rms(&robust.values) < 1.3 * undisturbed, "{} {undisturbed}", rms(&robust.values));
    for n in (0..len).step_by(33) {
        assert_eq!(robust.weights[n], 0.0);
    }
    // With gaps besides: no more than a third is lost.
    let mut base = vec![1.0; len];
    for from in [300, 900, 1500] {
        base[from..from + 20].fill(0.0);
        y[from..from + 20].fill(1e3);
    }
    let gappy = smoother.robust(&y, Some(&base), None);
    assert!(rms(&gappy.values) < 1.33 * rms(&robust.values), "{} {}", rms(&gappy.values), rms(&robust.values));
}

#[test]
fn clean_records_show_no_noise_to_smooth() {
    let y: Vec<f64> = (0..500).map(|n| (TAU * 0.0123 * n as f64).cos() + (TAU * 0.11 * n as f64).sin()).collect();
    let found = even(500).validated(&y);
    assert!(found.at_weakest, "{found:?}");
    // White noise alone: hardly any freedom is left.
    let smoother = even(500);
    assert!(smoother.freedom(smoother.validated(&noise(500, 3)).strength) < 25.0);
}

#[test]
fn the_smallest_and_flattest_records_do_not_fail() {
    for len in 1..5 {
        for ends in Ends::all() {
            let smoother = Smoother::new(&Planner::new(), ends, len, 2).unwrap();
            for y in [vec![0.0; len], vec![2.0; len], noise(len, 4)] {
                let found = smoother.validated(&y);
                assert!(smoother.smooth(&y, found.strength).iter().all(|v| v.is_finite()), "{ends:?} {y:?} {found:?}");
                assert!(smoother.robust(&y, None, None).values.iter().all(|v| v.is_finite()), "{ends:?} {y:?}");
            }
        }
    }
}
