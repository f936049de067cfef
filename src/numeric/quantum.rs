//! The quantisation step of a record: the smallest gap between two different values.

/// Smallest gap between distinct values, in the record's unit; 0 when all values are equal.
pub fn step(samples: &[f64]) -> f64 {
    let mut sorted = samples.to_vec();
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
