//! Sums whose rounding error does not grow with their length.

/// Sum by pairwise splitting: error of order eps log2(n) instead of eps n.
pub fn sum(values: &[f64]) -> f64 {
    sum_of(values, |v| v)
}

/// Sum of squares by pairwise splitting.
pub fn sum_of_squares(values: &[f64]) -> f64 {
    sum_of(values, |v| v * v)
}

/// Sum of `term` over the values by pairwise splitting.
pub fn sum_of(values: &[f64], term: impl Fn(f64) -> f64 + Copy) -> f64 {
    // 64 terms at a time keep the recursion cheap; 8 running sums let the compiler vectorise.
    if values.len() <= 64 {
        let mut lanes = [0.0; 8];
        let blocks = values.chunks_exact(8);
        let rest = blocks.remainder();
        for block in blocks {
            for (lane, &v) in lanes.iter_mut().zip(block) {
                *lane += term(v);
            }
        }
        let tail: f64 = rest.iter().map(|&v| term(v)).sum();
        return lanes.iter().sum::<f64>() + tail;
    }
    let (left, right) = values.split_at(values.len() / 2);
    sum_of(left, term) + sum_of(right, term)
}

/// Arithmetic mean; 0 for no values.
pub fn mean(values: &[f64]) -> f64 {
    if values.is_empty() { 0.0 } else { sum(values) / values.len() as f64 }
}

/// Root mean square; 0 for no values.
pub fn rms(values: &[f64]) -> f64 {
    if values.is_empty() { 0.0 } else { (sum_of_squares(values) / values.len() as f64).sqrt() }
}

/// Standard deviation about the mean (divisor n); 0 for no values.
pub fn standard_deviation(values: &[f64]) -> f64 {
    if values.is_empty() {
        return 0.0;
    }
    let centre = mean(values);
    (sum_of(values, |v| (v - centre) * (v - centre)) / values.len() as f64).sqrt()
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_million_tenths_are_a_hundred_thousand() {
        let values = vec![0.1; 1_000_000];
        // Pairwise: 20 levels of rounding, each at most half an ulp of the running sum.
        assert!((sum(&values) - 100_000.0).abs() < 20.0 * f64::EPSILON * 100_000.0);
        assert!((mean(&values) - 0.1).abs() < 1e-15);
        assert!((rms(&values) - 0.1).abs() < 1e-15);
        assert!(standard_deviation(&values) < 1e-15);
    }
}
