//! The noise floor of a record: the white noise that would explain the upper half of its spectrum.

use std::f64::consts::TAU;

use crate::numeric::{fourier, noise, quantile, sum};

/// Samples of one segment at most; shorter records have shorter ones, so that eight fit in.
const SEGMENT: usize = 1024;
/// Shorter segments hold too few lines above a quarter of the rate for a median.
const SHORTEST: usize = 32;
/// Segments looked at, spread evenly over long records: the median of their lines then scatters by less than 1 %.
const SEGMENTS: usize = 200;

/// Standard deviation a sample of the white noise whose density is the median of the power spectral density above a
/// quarter of the sampling rate, in the record's unit.
///
/// Welch's average over Hann windows at half overlap; the median of chi-square estimates with nu degrees of freedom lies
/// at (1 - 2/(9 nu))^3 of their mean (Wilson and Hilferty 1931), nu = 36 K^2/(19 K - 1) for K such windows (Welch 1967).
/// Records too short for that fall back on third differences. A low-pass in the recorder lowers the figure, signal in the
/// upper half of the band raises it.
pub fn sigma(samples: &[f64]) -> f64 {
    let len = samples.len();
    let segment = if len / 4 >= SEGMENT { SEGMENT } else { (len / 4 + 1).next_power_of_two() / 2 };
    if segment < SHORTEST {
        return noise::sigma(samples);
    }
    let last = len - segment;
    let half_steps = last / (segment / 2);
    let count = (half_steps + 1).min(SEGMENTS);
    let window: Vec<f64> = (0..segment).map(|n| 0.5 - 0.5 * (TAU * n as f64 / segment as f64).cos()).collect();
    let weight = sum::sum_of_squares(&window) / segment as f64;
    let mut mean = vec![0.0; segment / 2 + 1];
    for index in 0..count {
        let place = if count > 1 { index * half_steps / (count - 1) } else { 0 };
        let part = &samples[place * (segment / 2)..][..segment];
        let centre = sum::mean(part);
        let windowed: Vec<f64> = part.iter().zip(&window).map(|(v, w)| (v - centre) * w).collect();
        for (total, energy) in mean.iter_mut().zip(fourier::energies(&windowed)) {
            *total += energy / count as f64;
        }
    }
    // Between a quarter and half of the rate, without the Nyquist line; each line stands for 1/segment of the band twice.
    let mut upper: Vec<f64> = mean[segment / 4 + 1..segment / 2].to_vec();
    let k = count as f64;
    let freedom = 36.0 * k * k / (19.0 * k - 1.0);
    let median = quantile::median(&mut upper).unwrap_or(0.0) / (1.0 - 2.0 / (9.0 * freedom)).powi(3);
    (median * segment as f64 / 2.0 / weight).sqrt()
}

#[cfg(test)]
mod tests {
    use super::*;

    /// Sum of twelve uniforms: variance 1.
    fn white(count: usize) -> Vec<f64> {
        let mut state = 7u64;
        let mut uniform = || {
            state = state.wrapping_mul(6364136223846793005).wrapping_add(1442695040888963407);
            (state >> 11) as f64 / (1u64 << 53) as f64
        };
        (0..count).map(|_| (0..12).map(|_| uniform()).sum::<f64>() - 6.0).collect()
    }

    #[test]
    fn white_noise_gives_its_own_deviation_and_slow_signals_do_not_count() {
        for (count, tolerance) in [(100, 0.35), (500, 0.15), (4000, 0.06), (60_000, 0.03)] {
            let noise = white(count);
            let found = sigma(&noise);
            // The median of n lines with 2K-odd degrees of freedom each scatters by about 1.25/sqrt(n K) or less.
            assert!((found - 1.0).abs() < tolerance, "{count}: {found}");
            let mixed: Vec<f64> =
                noise.iter().enumerate().map(|(n, v)| v + 500.0 * (n as f64 * 0.05).sin() + 1e3).collect();
            if count >= 500 {
                assert!((sigma(&mixed) - found).abs() < 0.05, "{count}: {} {found}", sigma(&mixed));
            }
        }
        assert_eq!(sigma(&[]), 0.0);
        assert_eq!(sigma(&[3.0; 5000]), 0.0);
    }
}
