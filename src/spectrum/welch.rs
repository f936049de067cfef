//! Welch's density: windowed overlapping segments, their periodograms averaged.

use rayon::prelude::*;

use super::density::{Correlation, Density};
use super::detrend::Detrend;
use super::window::{Window, noise_bandwidth_lines};
use crate::basis::Planner;
use crate::ends::Ends;
use crate::error::{Error, Result};
use crate::numeric::sum;

/// How a record is cut into segments.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub struct Segments {
    /// Samples of a segment.
    pub len: usize,
    /// Samples from the start of one to the start of the next.
    pub hop: usize,
    /// How many.
    pub count: usize,
}

impl Segments {
    /// As many segments of `len` samples as fit, overlapping by the share `overlap` (0 to below 1).
    ///
    /// # Errors
    /// `Unsupported` for a segment of fewer than 2 samples or longer than the record.
    pub fn new(samples: usize, len: usize, overlap: f64) -> Result<Segments> {
        if len < 2 {
            return Err(Error::unsupported(format!("a segment of {len} samples has no spectrum"))
                .remedy("give a longer one with --segment"));
        }
        if len > samples {
            return Err(Error::unsupported(format!(
                "a segment of {len} samples is longer than the record of {samples}"
            ))
            .remedy("give a shorter one with --segment"));
        }
        let shared = (overlap * len as f64).floor() as usize;
        let hop = len - shared.min(len - 1);
        Ok(Segments { len, hop, count: (samples - len) / hop + 1 })
    }

    /// Samples at the end of the record that no segment reaches.
    pub fn left_over(&self, samples: usize) -> usize {
        samples - (self.len + (self.count - 1) * self.hop)
    }
}

/// Blocks of segments that are summed apart and then in order: the result does not depend on the number of threads.
const BLOCKS: usize = 64;

/// Welch's estimate of `samples` at `rate` per second or metre. Source and normalisation: [`crate::spectrum`].
///
/// # Errors
/// None for segments that fit the record.
pub fn welch(
    samples: &[f64],
    rate: f64,
    segments: Segments,
    window: &Window,
    detrend: Detrend,
    planner: &Planner,
) -> Result<Density> {
    let Segments { len, hop, count } = segments;
    let record = detrend.of_record(samples)?;
    let taper = window.samples(len);
    let power = sum::sum_of_squares(&taper);
    let plan = planner.plan(Ends::Periodic, len)?;
    let lines = len / 2 + 1;
    let block = count.div_ceil(BLOCKS);
    let sums: Vec<(Vec<f64>, f64)> = (0..count.div_ceil(block))
        .into_par_iter()
        .map(|index| {
            let mut total = vec![0.0; lines];
            let mut weighted = 0.0;
            let mut work = vec![0.0; len];
            let mut scratch = vec![0.0; plan.scratch_len()];
            for segment in index * block..((index + 1) * block).min(count) {
                work.copy_from_slice(&record[segment * hop..segment * hop + len]);
                detrend.of_segment(&mut work)?;
                for (value, w) in work.iter_mut().zip(&taper) {
                    *value *= w;
                }
                weighted += sum::sum_of_squares(&work);
                plan.forward(&mut work, &mut scratch);
                // Cosine and sine of one frequency stand side by side: constant, pairs, Nyquist cosine.
                for (k, c) in work.iter().enumerate() {
                    total[k.div_ceil(2)] += c * c;
                }
            }
            Ok((total, weighted))
        })
        .collect::<Result<_>>()?;
    let mut values = vec![0.0; lines];
    let mut weighted = 0.0;
    for (block, energy) in sums {
        for (value, part) in values.iter_mut().zip(block) {
            *value += part;
        }
        weighted += energy;
    }
    // |X_k|^2 is M/2 times the energy of the orthonormal pair, M times that of a single one: the factor c_k comes out even.
    let factor = len as f64 / (rate * power * count as f64);
    values.iter_mut().for_each(|v| *v *= factor);
    let spacing = rate / len as f64;
    let variances = variances(&taper, segments, 2 * window.coefficients.len() + 1);
    let freedom = (0..lines)
        .map(|k| {
            // The mirror image of a line near zero or the Nyquist frequency is correlated with the line itself.
            let to_image = (2 * k).min(len - 2 * k.min(len / 2));
            2.0 / (variances[0] + variances.get(to_image).copied().unwrap_or(0.0))
        })
        .collect();
    Ok(Density {
        spacing,
        rate,
        values,
        freedom,
        bandwidth: vec![noise_bandwidth_lines(&taper) * spacing; lines],
        correlation: Correlation::ByDistance(variances.iter().map(|v| v / variances[0]).collect()),
        weighted_mean_square: Some(weighted / (power * count as f64)),
        mean_square: sum::rms(&record).powi(2),
    })
}

/// Covariance of the estimates at two lines m apart, over the product of the densities there: (1/K) times the sum over all
/// shifts j of (1 - |j|/K) |sum_n w_n w_(n+jS) exp(2 pi i m n/M)|^2 / (sum w^2)^2. At m = 0 its inverse is half the number of
/// degrees of freedom (Welch 1967; Percival and Walden 1993, section 6.17).
fn variances(taper: &[f64], segments: Segments, distances: usize) -> Vec<f64> {
    let Segments { len, hop, count } = segments;
    let power = sum::sum_of_squares(taper);
    let cosines: Vec<f64> = (0..len).map(|n| (std::f64::consts::TAU * n as f64 / len as f64).cos()).collect();
    let sines: Vec<f64> = (0..len).map(|n| (std::f64::consts::TAU * n as f64 / len as f64).sin()).collect();
    let shifts = count.min(len.div_ceil(hop));
    (0..distances.min(len / 2 + 1))
        .map(|m| {
            let share = |j: usize| {
                let (mut re, mut im) = (0.0, 0.0);
                for n in 0..len - j * hop {
                    let product = taper[n] * taper[n + j * hop];
                    re += product * cosines[m * n % len];
                    im += product * sines[m * n % len];
                }
                (re * re + im * im) / (power * power)
            };
            let others: f64 = (1..shifts).map(|j| (1.0 - j as f64 / count as f64) * share(j)).sum();
            (share(0) + 2.0 * others) / count as f64
        })
        .collect()
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::spectrum::window;

    fn freedom(overlap: f64, count: usize) -> f64 {
        let taper = window("hann").unwrap().samples(512);
        let hop = 512 - (overlap * 512.0) as usize;
        2.0 / variances(&taper, Segments { len: 512, hop, count }, 1)[0]
    }

    #[test]
    fn overlapped_hann_segments_have_the_published_degrees_of_freedom() {
        // Percival and Walden 1993, eq. 294 (from memory): 36 K^2 / (19 K - 1) for Hann and 50 %.
        for (count, expected) in [(1, 2.0), (2, 3.8919), (9, 17.1529), (31, 58.8367), (99, 187.6787)] {
            assert!((freedom(0.5, count) - expected).abs() < 1e-3, "{count}: {}", freedom(0.5, count));
        }
        // Welch 1967; Harris 1978: 1 + 2 sum rho^2 for very many segments.
        for (overlap, factor) in [(0.5, 1.055556), (0.625, 1.291796), (0.75, 1.924639)] {
            let count = 10_000_000;
            let found = 2.0 * count as f64 / freedom(overlap, count);
            assert!((found - factor).abs() < 1e-5, "{overlap}: {found}");
        }
    }

    #[test]
    fn segments_fill_the_record() {
        let segments = Segments::new(2400, 400, 0.5).unwrap();
        assert_eq!((segments.hop, segments.count, segments.left_over(2400)), (200, 11, 0));
        assert_eq!(Segments::new(10, 10, 0.5).unwrap().count, 1);
        assert_eq!(Segments::new(10, 3, 0.99).unwrap(), Segments { len: 3, hop: 1, count: 8 });
        assert!(Segments::new(10, 11, 0.5).is_err() && Segments::new(10, 1, 0.5).is_err());
    }

    #[test]
    fn a_tone_on_a_line_shows_its_power() {
        // Heinzel, Ruediger and Schilling 2002, section 9: density x bandwidth = power; Hann, rms 1, 1000 Hz, 1000 samples.
        let (rate, len) = (1000.0, 1000);
        let tone: Vec<f64> =
            (0..len).map(|n| 2f64.sqrt() * (std::f64::consts::TAU * 100.0 * n as f64 / rate).cos()).collect();
        let segments = Segments::new(len, len, 0.5).unwrap();
        let density = welch(&tone, rate, segments, window("hann").unwrap(), Detrend::None, &Planner::new()).unwrap();
        assert!((density.values[100] - 2.0 / 3.0).abs() < 1e-12);
        assert!((density.values[100] * density.bandwidth[100] - 1.0).abs() < 1e-12);
        assert!((density.sum() - 1.0).abs() < 1e-12);
        // Without a window, whole cycles leak nothing: amplitudes at rounding, power at its square.
        let plain =
            welch(&tone, rate, segments, window("rectangular").unwrap(), Detrend::None, &Planner::new()).unwrap();
        let leak = plain.values.iter().enumerate().filter(|(k, _)| *k != 100).map(|(_, v)| *v).fold(0.0, f64::max);
        assert!(leak / plain.values[100] < 1e-26, "{leak}");
    }

    #[test]
    fn a_tone_between_two_lines_reads_low_and_spreads() {
        // Harris, Proc. IEEE 66 (1978) 51-83, scallop loss without a window: the amplitude reads 2/pi = 0.6366 (-3.9224 dB); the
        // two nearest lines hold 8/pi^2 of the power. Both hold for N >= 1024 to 1e-3: the image of the tone falls as 1/N.
        let (len, line) = (4096, 700);
        let tone: Vec<f64> = (0..len)
            .map(|n| 2f64.sqrt() * (std::f64::consts::TAU * (line as f64 + 0.5) * n as f64 / len as f64 + 0.3).cos())
            .collect();
        let segments = Segments::new(len, len, 0.0).unwrap();
        let found =
            welch(&tone, len as f64, segments, window("rectangular").unwrap(), Detrend::None, &Planner::new()).unwrap();
        // Lines one unit apart: a density is the power of its line; the tone's power is 1.
        let (low, high) = (found.values[line], found.values[line + 1]);
        for power in [low, high] {
            assert!((power.sqrt() - std::f64::consts::FRAC_2_PI).abs() < 1e-3, "{}", power.sqrt());
            assert!((10.0 * power.log10() + 3.9224).abs() < 0.01, "{} dB", 10.0 * power.log10());
        }
        assert!((low + high - 0.8105694691).abs() < 1e-3, "{}", low + high);
    }

    #[test]
    fn averages_apart_have_a_random_error_of_one_over_their_root() {
        // Bendat and Piersol, Random Data (from memory): normalised random error 1/sqrt(n_d) of n_d averages that share no
        // samples: 10 % for 100. Of a density with nu degrees of freedom it is sqrt(2/nu).
        let (len, count) = (256, 100);
        let segments = Segments::new(len * count, len, 0.0).unwrap();
        assert_eq!(segments.count, count);
        for name in ["rectangular", "hann"] {
            let taper = window(name).unwrap().samples(len);
            let error = variances(&taper, segments, 1)[0].sqrt();
            assert!((error - 0.1).abs() < 1e-12, "{name}: {error}");
        }
        // White noise bears it out: the scatter of 126 independent lines around their mean has a standard error of
        // 1/sqrt(2 * 126) = 6.3 % of itself; three of them are allowed.
        let mut state = 42_u64;
        let mut uniform = || {
            state = state.wrapping_mul(6_364_136_223_846_793_005).wrapping_add(1_442_695_040_888_963_407);
            ((state >> 11) as f64 + 0.5) / (1_u64 << 53) as f64
        };
        let noise: Vec<f64> = (0..len * count)
            .map(|_| (-2.0 * uniform().ln()).sqrt() * (std::f64::consts::TAU * uniform()).cos())
            .collect();
        let rectangular = window("rectangular").unwrap();
        let found = welch(&noise, 1.0, segments, rectangular, Detrend::None, &Planner::new()).unwrap();
        let lines = &found.values[1..len / 2 - 1];
        let mean = lines.iter().sum::<f64>() / lines.len() as f64;
        let square = lines.iter().map(|v| (v / mean - 1.0).powi(2)).sum::<f64>() / (lines.len() - 1) as f64;
        assert!((square.sqrt() / 0.1 - 1.0).abs() < 0.19, "{}", square.sqrt());
    }
}
