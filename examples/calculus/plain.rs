//! What a plain script does: detrend, cumulative trapezoid, difference quotients, a Butterworth run forwards and backwards.

use std::f64::consts::PI;

/// Without its least-squares line.
pub fn detrended(x: &[f64]) -> Vec<f64> {
    let n = x.len() as f64;
    let centre = (n - 1.0) / 2.0;
    let mean = x.iter().sum::<f64>() / n;
    let slope = x.iter().enumerate().map(|(k, v)| (k as f64 - centre) * v).sum::<f64>() * 12.0 / (n * (n * n - 1.0));
    x.iter().enumerate().map(|(k, v)| v - mean - slope * (k as f64 - centre)).collect()
}

/// Without its mean.
pub fn centred(x: &[f64]) -> Vec<f64> {
    let mean = x.iter().sum::<f64>() / x.len() as f64;
    x.iter().map(|v| v - mean).collect()
}

/// Cumulative trapezoid from 0.
pub fn trapezoid(x: &[f64], step: f64) -> Vec<f64> {
    let mut sum = 0.0;
    std::iter::once(0.0)
        .chain(x.windows(2).map(|w| {
            sum += (w[0] + w[1]) / 2.0 * step;
            sum
        }))
        .collect()
}

/// Central differences, one-sided of second order at the ends.
pub fn gradient(x: &[f64], step: f64) -> Vec<f64> {
    let n = x.len();
    let mut d: Vec<f64> = vec![0.0; n];
    for k in 1..n - 1 {
        d[k] = (x[k + 1] - x[k - 1]) / (2.0 * step);
    }
    d[0] = (-3.0 * x[0] + 4.0 * x[1] - x[2]) / (2.0 * step);
    d[n - 1] = (3.0 * x[n - 1] - 4.0 * x[n - 2] + x[n - 3]) / (2.0 * step);
    d
}

/// High-pass or low-pass of the two.
#[derive(Clone, Copy, PartialEq)]
pub enum Pass {
    Low,
    High,
}

/// Butterworth of order 4 by the bilinear transform, forwards and backwards from settled starts, on the record continued
/// by odd reflection about its end values: the usual default of a zero-phase filter.
pub fn zero_phase(x: &[f64], corner: f64, step: f64, pass: Pass) -> Vec<f64> {
    // SciPy pads by 3 (2 sections + 1) samples at least.
    let pad = 15.min(x.len() - 1);
    let last = x.len() - 1;
    let mut padded: Vec<f64> = (1..=pad).rev().map(|k| 2.0 * x[0] - x[k]).collect();
    padded.extend_from_slice(x);
    padded.extend((1..=pad).map(|k| 2.0 * x[last] - x[last - k]));
    let warped = (PI * corner * step).tan();
    for _ in 0..2 {
        for section in 0..2 {
            // Poles of order 4 in pairs: damping 2 cos((2 m + 1) pi/8).
            let damping = 2.0 * (PI * (2.0 * f64::from(section) + 1.0) / 8.0).cos();
            let norm = 1.0 + damping * warped + warped * warped;
            let (b, sign) = match pass {
                Pass::High => (1.0 / norm, -2.0),
                Pass::Low => (warped * warped / norm, 2.0),
            };
            let a1 = 2.0 * (warped * warped - 1.0) / norm;
            let a2 = (1.0 - damping * warped + warped * warped) / norm;
            let (b0, b1, b2) = (b, sign * b, b);
            // State of the section that has seen the first value for ever.
            let gain = (b0 + b1 + b2) / (1.0 + a1 + a2);
            let mut z2 = (b2 - a2 * gain) * padded[0];
            let mut z1 = (b1 - a1 * gain) * padded[0] + z2;
            for v in &mut padded {
                let y = b0 * *v + z1;
                z1 = b1 * *v - a1 * y + z2;
                z2 = b2 * *v - a2 * y;
                *v = y;
            }
        }
        padded.reverse();
    }
    padded[pad..pad + x.len()].to_vec()
}

/// Without its least-squares polynomial of degree 2, through Legendre polynomials.
pub fn without_parabola(x: &[f64]) -> Vec<f64> {
    let n = x.len() as f64;
    let points = x.iter().enumerate().map(|(k, &v)| (k as f64, v));
    let fitted = endgrain::numeric::least_squares::polynomial(points, -0.5, n - 0.5, 2);
    x.iter().enumerate().map(|(k, v)| v - fitted.at(k as f64)).collect()
}
