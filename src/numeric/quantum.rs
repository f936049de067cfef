//! The quantisation step of a record: the smallest gap between two different values.

use crate::numeric::{noise, stretch};

/// Smallest gap between distinct values, in the record's unit; 0 when all values are equal. Of long records about 65,000
/// samples are looked at: on any coarser scale than their range over 65,000 every step then still occurs.
pub fn step(samples: &[f64]) -> f64 {
    least_gap(&sorted(samples))
}

/// What values are rounded to as far as they show it: `step`, but 0 for a record in which no value comes twice and which
/// runs without noise, such as a computed ramp. Its smallest gap is its own slope.
pub fn rounding(samples: &[f64]) -> f64 {
    let sorted = sorted(samples);
    let largest = [sorted.first(), sorted.last()].into_iter().flatten().fold(0.0, |so_far: f64, v| so_far.max(v.abs()));
    let comes_twice = sorted.windows(2).any(|pair| pair[0] == pair[1]);
    // The third difference of doubles is wrong by a few roundings of the largest value.
    let is_smooth = || noise::sigma(samples) <= 8.0 * f64::EPSILON * largest;
    if !comes_twice && is_smooth() { 0.0 } else { least_gap(&sorted) }
}

fn sorted(samples: &[f64]) -> Vec<f64> {
    let stretches = stretch::evenly_spread(samples.len()).into_iter();
    let mut sorted: Vec<f64> = stretches.flat_map(|stretch| samples[stretch].iter().copied()).collect();
    sorted.sort_unstable_by(f64::total_cmp);
    sorted
}

fn least_gap(sorted: &[f64]) -> f64 {
    sorted.windows(2).map(|w| w[1] - w[0]).filter(|gap| *gap > 0.0).reduce(f64::min).unwrap_or(0.0)
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn an_exact_ramp_is_not_rounded_to_its_slope() {
        let ramp: Vec<f64> = (0..1000).map(|n| 3.0 + 0.1 * f64::from(n)).collect();
        assert!(step(&ramp) > 0.09);
        assert_eq!(rounding(&ramp), 0.0);
        // The same ramp as a logger with a step of 0.25 prints it: values come twice.
        let logged: Vec<f64> = ramp.iter().map(|v| (v * 4.0).round() / 4.0).collect();
        assert_eq!(rounding(&logged), 0.25);
        // Values that never come twice, but with noise, count as rounded to their smallest gap.
        let rough: Vec<f64> = (0..1000).map(|n| f64::from(n * n).sin()).collect();
        assert_eq!(rounding(&rough), step(&rough));
        assert_eq!(rounding(&[4.0; 9]), 0.0);
    }

    #[test]
    fn the_step_is_the_least_difference_that_occurs() {
        assert_eq!(step(&[1.0, 3.5, 1.0, 2.0, 2.25]), 0.25);
        assert_eq!(step(&[4.0; 9]), 0.0);
        assert_eq!(step(&[]), 0.0);
    }
}
