//! Spectral lines: steady tones that stand out of the noise about them, with interpolated frequency and amplitude.

use std::f64::consts::{LN_2, PI};

use super::window::window;
use crate::basis::Planner;
use crate::ends::Ends;
use crate::error::Result;
use crate::numeric::quantile::median;
use crate::numeric::running_median::running_median;

/// One line; frequencies in Hz or 1/m, amplitudes in the unit of the samples.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Line {
    /// Interpolated frequency.
    pub frequency: f64,
    /// Its standard error under the noise about the line.
    pub frequency_error: f64,
    /// Amplitude (peak value) of the tone.
    pub amplitude: f64,
    /// Its standard error.
    pub amplitude_error: f64,
    /// Power over that of the noise in the same bin, in dB.
    pub above_noise_db: f64,
    /// Share of the energy in the five bins about it that one steady tone explains: near 1 for a tone, less for a
    /// resonance, a drifting tone or two close ones.
    pub steadiness: f64,
}

/// Chance that noise alone shows any line at all.
const FALSE_ALARM: f64 = 0.05;
/// Bins either side of a line that its own Hann main lobe takes.
const LOBE: usize = 3;
/// Bins either side over which the near noise is taken, beyond the lobe.
const NEAR: usize = 20;
/// Half-width of the running median that is the far noise.
const FAR: usize = 100;
/// A peak counts only where it is this much larger than the leakage of all stronger lines.
const OVER_LEAKAGE: f64 = 2.0;

/// The strongest lines of `record` (trend taken off) at `rate` per second or metre: at most `count`, by falling amplitude.
///
/// The whole record runs through one Hann window. A bin is a line where it is a local maximum and so far above the noise,
/// the larger of the medians near and far, that noise alone would show one anywhere in 5 of 100 records, and above what
/// stronger lines leak. Frequency and amplitude by the ratio of the two largest bins: with a the smaller over the larger,
/// delta = (2a - 1)/(a + 1), A = A_0 (1 - delta^2)/sinc(delta) (Hann; Grandke 1983 and Harris 1978 for the kernel; from
/// memory). Exact for a lone tone.
///
/// # Errors
/// None for a record of at least one sample.
pub fn lines(record: &[f64], rate: f64, count: usize, planner: &Planner) -> Result<Vec<Line>> {
    let len = record.len();
    if len < 16 || count == 0 {
        return Ok(Vec::new());
    }
    let spectrum = Spectrum::of(record, planner)?;
    let noise = spectrum.noise();
    let bins = spectrum.power.len();
    let threshold = (bins as f64 / FALSE_ALARM).ln();
    // Rounding of the transform: a bin below it is no line of a record that holds anything.
    let rounding = spectrum.power.iter().copied().fold(0.0, f64::max) * 1e-26;
    let mut peaks: Vec<usize> = (2..bins.saturating_sub(2))
        .filter(|&k| {
            let p = &spectrum.power;
            p[k] > threshold * noise[k]
                && p[k] > rounding
                && p[k] >= p[k - 1]
                && p[k] > p[k + 1]
                && p[k] > threshold * spectrum.noise_of_the_louder_side(k)
        })
        .collect();
    peaks.sort_by(|&a, &b| spectrum.power[b].total_cmp(&spectrum.power[a]).then(a.cmp(&b)));
    let mut found: Vec<Line> = Vec::new();
    for k in peaks {
        if found.len() == count {
            break;
        }
        let line = spectrum.line(k, noise[k]);
        let leaked: f64 =
            found.iter().map(|stronger| stronger.amplitude * leakage(line.frequency, stronger, len)).sum();
        if line.amplitude > OVER_LEAKAGE * leaked {
            found.push(line);
        }
    }
    for line in &mut found {
        line.frequency *= rate;
        line.frequency_error *= rate;
    }
    Ok(found)
}

/// What a unit tone at `stronger` (cycles per sample, as all frequencies until the end) may show at `frequency`: the envelope
/// of the Hann kernel, both from the tone and from its image at the negative frequency; everything within the main lobe.
fn leakage(frequency: f64, stronger: &Line, len: usize) -> f64 {
    let envelope = |distance: f64| {
        let d = distance.abs() * len as f64;
        if d < LOBE as f64 { 1.0 } else { 1.0 / (PI * d * (d * d - 1.0)) }
    };
    envelope(frequency - stronger.frequency)
        + envelope(frequency + stronger.frequency)
        + envelope(1.0 - frequency - stronger.frequency)
}

/// The record through a Hann window, bin by bin.
struct Spectrum {
    len: usize,
    /// X_k = sum w x exp(-2 pi i k n/N), k = 0..=N/2.
    parts: Vec<[f64; 2]>,
    /// |X_k|^2.
    power: Vec<f64>,
}

impl Spectrum {
    fn of(record: &[f64], planner: &Planner) -> Result<Spectrum> {
        let len = record.len();
        let mut work: Vec<f64> = window("hann")?.samples(len).iter().zip(record).map(|(w, x)| w * x).collect();
        let plan = planner.plan(Ends::Periodic, len)?;
        plan.forward(&mut work, &mut vec![0.0; plan.scratch_len()]);
        let (single, pair) = ((len as f64).sqrt(), (len as f64 / 2.0).sqrt());
        let part = |k: usize| match k {
            0 => [single * work[0], 0.0],
            k if 2 * k == len => [single * work[len - 1], 0.0],
            k => [pair * work[2 * k - 1], -pair * work[2 * k]],
        };
        let parts: Vec<[f64; 2]> = (0..=len / 2).map(part).collect();
        let power = parts.iter().map(|[re, im]| re * re + im * im).collect();
        Ok(Spectrum { len, parts, power })
    }

    /// Mean power of the noise at every bin: the larger of the medians near and far, over the logarithm of 2 (the median of
    /// an exponential distribution of mean 1).
    fn noise(&self) -> Vec<f64> {
        let bins = self.power.len();
        let far = running_median(&self.power, (2 * FAR + 1).min(bins | 1), 1);
        (0..bins)
            .map(|k| {
                let below = k.saturating_sub(NEAR)..k.saturating_sub(LOBE);
                let above = (k + LOBE + 1).min(bins)..(k + NEAR + 1).min(bins);
                let mut about: Vec<f64> = self.power[below].iter().chain(&self.power[above]).copied().collect();
                median(&mut about).unwrap_or(0.0).max(far[k]) / LN_2
            })
            .collect()
    }

    /// Mean power of the noise on that side of a bin where there is more: on a slope the median of both sides lies too low.
    fn noise_of_the_louder_side(&self, k: usize) -> f64 {
        let bins = self.power.len();
        let sides =
            [k.saturating_sub(NEAR)..k.saturating_sub(LOBE), (k + LOBE + 1).min(bins)..(k + NEAR + 1).min(bins)];
        let level = |side: std::ops::Range<usize>| median(&mut self.power[side].to_vec()).unwrap_or(0.0);
        sides.into_iter().map(level).fold(0.0, f64::max) / LN_2
    }

    /// The line at bin `k`, its frequency in cycles per sample.
    fn line(&self, k: usize, noise: f64) -> Line {
        let side: i64 = if self.power[k + 1] >= self.power[k - 1] { 1 } else { -1 };
        let largest = self.power[k].sqrt();
        let second = self.power[(k as i64 + side) as usize].sqrt();
        let ratio = second / largest;
        let delta = (2.0 * ratio - 1.0) / (ratio + 1.0);
        // The kernel of a sum of w = N/2: a tone of amplitude A shows A N/4 at its own frequency.
        let scale = 4.0 / self.len as f64;
        let kernel = |d: f64| (1.0 - d * d) / sinc(d);
        let amplitude = scale * largest * kernel(delta);
        // First order in the noise of the two bins, each of variance noise/2 along the tone's phase and correlated by 2/3.
        let variance = noise / 2.0;
        let slope = 3.0 / (ratio + 1.0).powi(2) / largest;
        let by_second = slope;
        let by_largest = -slope * ratio;
        let together = |a: f64, b: f64| ((a * a + b * b + 4.0 / 3.0 * a * b) * variance).sqrt();
        let step = 1e-6;
        let bend = (kernel(delta + step) - kernel(delta - step)) / (2.0 * step) * largest;
        let amplitude_error = scale * together(kernel(delta) + bend * by_largest, bend * by_second);
        let bin = k as f64 + side as f64 * delta;
        Line {
            frequency: bin / self.len as f64,
            frequency_error: together(by_largest, by_second) / self.len as f64,
            amplitude,
            amplitude_error,
            above_noise_db: 10.0 * (self.power[k] / noise.max(f64::MIN_POSITIVE)).log10(),
            steadiness: self.steadiness(k, bin),
        }
    }

    /// Share of the energy in bins k-2..=k+2 that a tone at `bin` explains, its amplitude and phase fitted.
    fn steadiness(&self, k: usize, bin: f64) -> f64 {
        let (mut re, mut im, mut own, mut total) = (0.0, 0.0, 0.0, 0.0);
        for j in k - 2..=k + 2 {
            let Some([a, b]) = self.parts.get(j).copied() else { continue };
            // The Hann kernel is real but for the phase of the window's middle, which turns by half a cycle a bin.
            let d = bin - j as f64;
            let shape = if d.abs() < 1.0 + 1e-9 && d.abs() > 1.0 - 1e-9 { 0.5 } else { sinc(d) / (1.0 - d * d) };
            let sign = if j % 2 == 0 { shape } else { -shape };
            re += sign * a;
            im += sign * b;
            own += shape * shape;
            total += a * a + b * b;
        }
        if total > 0.0 { ((re * re + im * im) / (own * total)).min(1.0) } else { 0.0 }
    }
}

/// sin(pi x)/(pi x).
fn sinc(x: f64) -> f64 {
    if x == 0.0 { 1.0 } else { (PI * x).sin() / (PI * x) }
}

#[cfg(test)]
mod tests;
