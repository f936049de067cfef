//! One period of a periodic sequence by its Fourier transform: filtering, impulse responses, energy in a band.

use std::cell::RefCell;

use realfft::RealFftPlanner;
use rustfft::num_complex::Complex;

/// Plans are kept for this many calls at most, so that a run over records of every length does not hoard memory.
const PLANS_KEPT: usize = 64;

thread_local! {
    static PLANNER: RefCell<(RealFftPlanner<f64>, usize)> = RefCell::new((RealFftPlanner::new(), 0));
}

fn with_planner<T>(action: impl FnOnce(&mut RealFftPlanner<f64>) -> T) -> T {
    PLANNER.with(|cell| {
        let (planner, calls) = &mut *cell.borrow_mut();
        *calls += 1;
        if *calls > 64 * PLANS_KEPT {
            *planner = RealFftPlanner::new();
            *calls = 0;
        }
        action(planner)
    })
}

/// Multiplies the spectrum of one period by `gain(f)` i^`turns`, f in cycles per sample from 0 to 1/2.
pub fn filter(period: &mut [f64], gain: impl Fn(f64) -> f64, turns: i32) {
    let len = period.len();
    if len == 0 {
        return;
    }
    with_planner(|planner| {
        let forward = planner.plan_fft_forward(len);
        let inverse = planner.plan_fft_inverse(len);
        let mut spectrum = forward.make_output_vec();
        // The lengths are the plan's own, the only thing these calls can reject.
        if forward.process(period, &mut spectrum).is_err() {
            return;
        }
        let turn = quarter_turns(turns);
        for (k, value) in spectrum.iter_mut().enumerate() {
            *value *= turn * (gain(k as f64 / len as f64) / len as f64);
        }
        real_ends(&mut spectrum, len);
        let _ = inverse.process(&mut spectrum, period);
    });
}

/// The impulse response of `gain(f)` i^`turns` on a periodic grid of `grid` samples: lags 0 to grid/2.
pub fn impulse_response(grid: usize, gain: impl Fn(f64) -> f64, turns: i32) -> Vec<f64> {
    with_planner(|planner| {
        let inverse = planner.plan_fft_inverse(grid);
        let turn = quarter_turns(turns);
        let line = |k: usize| turn * (gain(k as f64 / grid as f64) / grid as f64);
        let mut spectrum: Vec<Complex<f64>> = (0..grid / 2 + 1).map(line).collect();
        real_ends(&mut spectrum, grid);
        let mut response = vec![0.0; grid];
        // The lengths are the plan's own, the only thing this call can reject.
        let _ = inverse.process(&mut spectrum, &mut response);
        response.truncate(grid / 2 + 1);
        response
    })
}

/// The impulse response of a complex `response(f)` on a periodic grid of `grid` samples: lags 0, 1, ..., then, counted back
/// from the end, -1, -2, ...
pub fn two_sided_response(grid: usize, response: impl Fn(f64) -> Complex<f64>) -> Vec<f64> {
    with_planner(|planner| {
        let inverse = planner.plan_fft_inverse(grid);
        let line = |k: usize| response(k as f64 / grid as f64) / grid as f64;
        let mut spectrum: Vec<Complex<f64>> = (0..grid / 2 + 1).map(line).collect();
        real_ends(&mut spectrum, grid);
        let mut out = vec![0.0; grid];
        // The lengths are the plan's own, the only thing this call can reject.
        let _ = inverse.process(&mut spectrum, &mut out);
        out
    })
}

/// Mean square that each line of one period stands for, from the constant to half the period; their sum is the mean square
/// of the period (Parseval).
pub fn energies(period: &[f64]) -> Vec<f64> {
    let len = period.len();
    if len == 0 {
        return Vec::new();
    }
    with_planner(|planner| {
        let forward = planner.plan_fft_forward(len);
        let mut spectrum = forward.make_output_vec();
        let _ = forward.process(&mut period.to_vec(), &mut spectrum);
        // Every line but the constant and the Nyquist line stands for a pair.
        let share = |k: usize| if k == 0 || 2 * k == len { 1.0 } else { 2.0 };
        let square = len as f64 * len as f64;
        spectrum.iter().enumerate().map(|(k, c)| share(k) * c.norm_sqr() / square).collect()
    })
}

/// Mean square of the part of one period that lies above `frequency`, in cycles per sample.
pub fn energy_above(period: &[f64], frequency: f64) -> f64 {
    let lines = energies(period);
    let above = |k: usize| k as f64 > frequency * period.len() as f64;
    lines.iter().enumerate().filter(|(k, _)| above(*k)).map(|(_, energy)| energy).sum()
}

/// Constant and Nyquist are real in a real sequence; an odd number of quarter turns removes them.
fn real_ends(spectrum: &mut [Complex<f64>], len: usize) {
    spectrum[0].im = 0.0;
    if len.is_multiple_of(2) {
        spectrum[len / 2].im = 0.0;
    }
}

/// i^turns.
pub fn quarter_turns(turns: i32) -> Complex<f64> {
    match turns.rem_euclid(4) {
        0 => Complex::new(1.0, 0.0),
        1 => Complex::new(0.0, 1.0),
        2 => Complex::new(-1.0, 0.0),
        _ => Complex::new(0.0, -1.0),
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use std::f64::consts::TAU;

    #[test]
    fn a_tone_takes_the_gain_at_its_own_frequency() {
        for len in [1, 2, 15, 64] {
            let k = (len / 4) as f64;
            let mut tone: Vec<f64> = (0..len).map(|n| (TAU * k * n as f64 / len as f64).cos()).collect();
            let expected: Vec<f64> = tone.iter().map(|v| v * (1.0 + k / len as f64)).collect();
            filter(&mut tone, |f| 1.0 + f, 0);
            for (a, b) in tone.iter().zip(&expected) {
                assert!((a - b).abs() < 1e-14);
            }
        }
    }

    #[test]
    fn one_turn_is_a_derivative() {
        let len = 48;
        let mut tone: Vec<f64> = (0..len).map(|n| (TAU * 3.0 * n as f64 / 48.0).sin()).collect();
        filter(&mut tone, |f| TAU * f, 1);
        for (n, v) in tone.iter().enumerate() {
            assert!((v - TAU / 16.0 * (TAU * 3.0 * n as f64 / 48.0).cos()).abs() < 1e-14);
        }
    }
}
