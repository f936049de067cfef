//! The quantisation step of a record: the smallest gap between two different values.

use crate::numeric::stretch;

/// Smallest gap between distinct values, in the record's unit; 0 when all values are equal. Of long records about 65,000
/// samples are looked at: on any coarser scale than their range over 65,000 every step then still occurs.
pub fn step(samples: &[f64]) -> f64 {
    let stretches = stretch::evenly_spread(samples.len()).into_iter();
    let mut sorted: Vec<f64> = stretches.flat_map(|stretch| samples[stretch].iter().copied()).collect();
    sorted.sort_unstable_by(f64::total_cmp);
    let gaps = sorted.windows(2).map(|w| w[1] - w[0]).filter(|gap| *gap > 0.0);
    gaps.reduce(f64::min).unwrap_or(0.0)
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn the_step_is_the_least_difference_that_occurs() {
        assert_eq!(step(&[1.0, 3.5, 1.0, 2.0, 2.25]), 0.25);
        assert_eq!(step(&[4.0; 9]), 0.0);
        assert_eq!(step(&[]), 0.0);
    }
}
