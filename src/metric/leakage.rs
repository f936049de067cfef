//! Leakage: energy that an extension spreads far above the frequencies of the record itself.

use std::f64::consts::TAU;

use super::Subject;
use crate::numeric::fourier;

/// Half cycles per record above which energy counts as far.
fn far(len: usize) -> f64 {
    (len as f64 / 4.0).max(32.0)
}

/// Share of the record's variance that the remainder holds far up, in dB; absent where nothing is there.
pub fn share_db(subject: &Subject) -> Option<f64> {
    decibels(share_beyond(subject, far(subject.samples.len())))
}

/// By how much that exceeds what the record holds there through a window that hides its ends, in dB.
pub fn excess_db(subject: &Subject) -> Option<f64> {
    let beyond = far(subject.samples.len());
    decibels(share_beyond(subject, beyond) * subject.variance / windowed_beyond(subject.samples, beyond))
}

/// Mean square of the coefficients beyond so many half cycles per record, relative to the record's variance.
pub fn share_beyond(subject: &Subject, half_cycles: f64) -> f64 {
    if subject.is_spent {
        return 0.0;
    }
    let energies = subject.coefficients.iter().enumerate().filter(|(k, _)| subject.half_cycles(*k) > half_cycles);
    let energy: f64 = energies.map(|(_, c)| c * c).sum();
    energy / subject.samples.len() as f64 / subject.variance
}

/// Mean square of the same band of (x - weighted mean) w, w the four-term Blackman-Harris window, divided by the mean of
/// w squared so that white noise counts fully.
fn windowed_beyond(samples: &[f64], half_cycles: f64) -> f64 {
    let n = samples.len();
    let window: Vec<f64> = (0..n).map(|j| blackman_harris((j as f64 + 0.5) / n as f64)).collect();
    let weight: f64 = window.iter().sum();
    let mean = samples.iter().zip(&window).map(|(x, w)| x * w).sum::<f64>() / weight;
    let line: Vec<f64> = samples.iter().zip(&window).map(|(x, w)| (x - mean) * w).collect();
    let energy = fourier::energy_above(&line, half_cycles / (2.0 * n as f64));
    energy / (window.iter().map(|w| w * w).sum::<f64>() / n as f64)
}

/// Minimum four-term window (Harris 1978, On the use of windows, Proc. IEEE 66, table 1), on 0..1.
fn blackman_harris(x: f64) -> f64 {
    const TERMS: [f64; 4] = [0.358_75, -0.488_29, 0.141_28, -0.011_68];
    TERMS.iter().enumerate().map(|(k, a)| a * (TAU * k as f64 * x).cos()).sum()
}

fn decibels(ratio: f64) -> Option<f64> {
    (ratio > 0.0 && ratio.is_finite()).then(|| 10.0 * ratio.log10())
}
