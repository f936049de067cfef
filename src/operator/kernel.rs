//! The impulse response that belongs to a gain: what one sample spreads over its neighbours.

use std::cell::RefCell;
use std::sync::Arc;

use realfft::num_complex::Complex;
use realfft::{ComplexToReal, RealFftPlanner};

use crate::ends::Parity;

use super::turn;

/// Half of the impulse response of gain x (i w)^turns on a periodic grid of `grid` samples (made even, at least 2):
/// h(0), h(1), ..., h(grid/2) per unit sample. Turns 0 and +-2 give an even response, h(-n) = h(n); turns +-1 an odd one,
/// h(-n) = -h(n) with h(0) = 0. `gain` is asked at k/grid cycles per sample, k = 0..=grid/2. An integral whose gain does
/// not vanish at zero frequency has no response that dies away: its zero-frequency term is left out.
pub fn impulse_response(gain: impl Fn(f64) -> f64, turns: i32, grid: usize) -> Vec<f64> {
    let half = (grid / 2).max(1);
    let (values, parity) = sampled(gain, turns, half);
    transformed(&values, parity)
}

/// Gain x |w|^turns with its sign at k/(2 half), k = 0..=half, and the parity of the impulse response.
pub(super) fn sampled(gain: impl Fn(f64) -> f64, turns: i32, half: usize) -> (Vec<f64>, Parity) {
    let grid = 2.0 * half as f64;
    let (_, parity) = turn::factor(1.0, turns);
    let mut values: Vec<f64> = (0..=half)
        .map(|k| {
            let f = k as f64 / grid;
            gain(f) * turn::factor(f, turns).0
        })
        .collect();
    if turns < 0 {
        // G(w)/w^2 at zero frequency is a limit; a gain that vanishes there does so as w^2 or faster, with an error of
        // the order of this fraction of a grid line, squared.
        let f = 2.0_f64.powi(-20) / grid;
        values[0] = if gain(0.0) == 0.0 { gain(f) * turn::factor(f, turns).0 } else { 0.0 };
    }
    (values, parity)
}

/// The response h(0), ..., h(half) of a spectrum given at half + 1 lines, real (even) or imaginary (odd).
pub(super) fn transformed(values: &[f64], parity: Parity) -> Vec<f64> {
    let half = values.len().saturating_sub(1);
    let grid = 2 * half;
    if grid == 0 {
        return values.to_vec();
    }
    let mut spectrum: Vec<Complex<f64>> = match parity {
        Parity::Even => values.iter().map(|&v| Complex::new(v, 0.0)).collect(),
        Parity::Odd => values.iter().map(|&v| Complex::new(0.0, v)).collect(),
    };
    if parity == Parity::Odd {
        // An odd response has no mean and, sampled, no Nyquist line.
        spectrum[0] = Complex::default();
        spectrum[half] = Complex::default();
    }
    let plan = plan(grid);
    let mut response = plan.make_output_vec();
    let outcome = plan.process(&mut spectrum, &mut response);
    debug_assert!(outcome.is_ok(), "lengths follow from the plan");
    response.truncate(half + 1);
    let scale = (grid as f64).recip();
    response.iter_mut().for_each(|h| *h *= scale);
    response
}

thread_local! {
    /// Plans of short grids: making one costs as much as using it several times, and many small logs ask for the same.
    static PLANS: RefCell<RealFftPlanner<f64>> = RefCell::new(RealFftPlanner::new());
}

/// Grids up to this size are kept.
const KEPT: usize = 1 << 14;

fn plan(grid: usize) -> Arc<dyn ComplexToReal<f64>> {
    match grid {
        0..=KEPT => PLANS.with_borrow_mut(|plans| plans.plan_fft_inverse(grid)),
        _ => RealFftPlanner::new().plan_fft_inverse(grid),
    }
}

#[cfg(test)]
mod tests {
    use std::f64::consts::{LN_2, PI};

    use super::*;

    #[test]
    fn a_gaussian_gain_has_a_gaussian_response() {
        // Fourier pair: 2^-(f/fc)^2 <-> fc sqrt(pi/ln 2) exp(-(pi fc n)^2/ln 2).
        let corner = 0.02_f64;
        let response = impulse_response(|f| (-(f / corner).powi(2)).exp2(), 0, 4096);
        assert_eq!(response.len(), 2049);
        let peak = corner * (PI / LN_2).sqrt();
        for (n, &h) in response.iter().enumerate() {
            let exact = peak * (-(PI * corner * n as f64).powi(2) / LN_2).exp();
            // Rounding of 12 butterfly stages on sums of about 80 lines.
            assert!((h - exact).abs() < 1e-16, "{n}: {h} {exact}");
        }
    }

    #[test]
    fn turned_responses_are_derivatives_of_the_plain_one() {
        let corner = 0.02_f64;
        let gain = |f: f64| (-(f / corner).powi(2)).exp2();
        let s = (PI * corner).powi(2) / LN_2;
        let peak = corner * (PI / LN_2).sqrt();
        let (first, second) = (impulse_response(gain, 1, 4096), impulse_response(gain, 2, 4096));
        for n in 0..200 {
            let x = n as f64;
            let plain = peak * (-s * x * x).exp();
            assert!((first[n] + 2.0 * s * x * plain).abs() < 1e-17, "{n}");
            assert!((second[n] - (4.0 * s * s * x * x - 2.0 * s) * plain).abs() < 1e-17, "{n}");
        }
        // Integrals undo derivatives: gain w^2 x (i w)^-2 = -1 x gain, gain w^2 x (i w)^-1 = -i w gain.
        let squared = |f: f64| gain(f) * (2.0 * PI * f).powi(2);
        let (undone, half) = (impulse_response(squared, -2, 4096), impulse_response(squared, -1, 4096));
        for n in 0..200 {
            let plain = peak * (-s * (n as f64).powi(2)).exp();
            // The limit at zero frequency is good to (2^-20)^2 of the gain's own curvature: below rounding.
            assert!((undone[n] + plain).abs() < 1e-16, "{n}: {} {plain}", undone[n]);
            assert!((half[n] + first[n]).abs() < 1e-17, "{n}");
        }
    }

    #[test]
    fn the_area_outside_a_cut_kernel_is_that_of_the_standard() {
        // ISO 16610-21:2011, Annex A: cut at Lc corners to each side, the Gaussian loses 3.2795, 0.76254, 0.13654 % of
        // its area (recomputed from the error function).
        let lambda = 20_000.0_f64;
        let response = impulse_response(|f| (-(f * lambda).powi(2)).exp2(), 0, 1 << 18);
        for (share, percent) in [(0.4, 3.2795), (0.5, 0.76254), (0.6, 0.13654)] {
            let cut = (share * lambda) as usize;
            // Half of the sample on the cut lies outside.
            let outside: f64 = 2.0 * response[cut + 1..].iter().sum::<f64>() + response[cut];
            assert!((100.0 * outside - percent).abs() < 1e-4, "{share}: {}", 100.0 * outside);
        }
    }

    #[test]
    fn the_smallest_grids_do_not_fail() {
        for grid in 0..6 {
            for turns in -2..=2 {
                assert_eq!(impulse_response(|_| 1.0, turns, grid).len(), (grid / 2).max(1) + 1);
            }
        }
        assert_eq!(impulse_response(|_| 1.0, 0, 8), [1.0, 0.0, 0.0, 0.0, 0.0]);
    }
}
