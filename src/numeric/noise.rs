//! White noise sigma of a record, from its third differences.

use crate::numeric::stretch;

/// Noise sigma = median |third difference| / (0.6745 sqrt 20), in the record's unit; 0 for fewer than four samples.
///
/// A third difference of white noise has variance 1 + 9 + 9 + 1 = 20, and a quadratic passes without trace; 0.6745 is the
/// upper quartile of the normal distribution, which turns a median of magnitudes into a standard deviation. Of long
/// records about 65,000 samples are looked at: the median then scatters by less than 1 %.
pub fn sigma(samples: &[f64]) -> f64 {
    if samples.len() < 4 {
        return 0.0;
    }
    let third = |w: &[f64]| (w[3] - 3.0 * w[2] + 3.0 * w[1] - w[0]).abs();
    let stretches = stretch::evenly_spread(samples.len()).into_iter();
    let mut differences: Vec<f64> = stretches.flat_map(|stretch| samples[stretch].windows(4).map(third)).collect();
    let middle = differences.len() / 2;
    let (_, &mut median, _) = differences.select_nth_unstable_by(middle, f64::total_cmp);
    median / (0.6745 * 20f64.sqrt())
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_quadratic_has_no_noise_and_white_noise_its_own() {
        let quadratic: Vec<f64> = (0..100).map(|n| (n as f64).powi(2)).collect();
        assert!(sigma(&quadratic) < 1e-9);
        // Sum of twelve uniforms: variance 1. A plain multiplicative generator is enough here.
        let mut state = 1u64;
        let mut uniform = || {
            state = state.wrapping_mul(6364136223846793005).wrapping_add(1442695040888963407);
            (state >> 11) as f64 / (1u64 << 53) as f64
        };
        let noise: Vec<f64> = (0..20_000).map(|_| (0..12).map(|_| uniform()).sum::<f64>() - 6.0).collect();
        // The median of 20,000 correlated magnitudes scatters by about 1.5 %.
        assert!((sigma(&noise) - 1.0).abs() < 0.05, "{}", sigma(&noise));
    }
}
