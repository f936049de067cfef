//! Medians and robust spreads: what most of the values say, whatever a few of them do.

/// Turns a median of magnitudes into the standard deviation of a normal distribution: 1 / Phi^-1(3/4) (Hampel 1974).
pub const HAMPEL_SCALE: f64 = 1.482_602_218_505_602;

/// Median of the finite values; of an even number of them the mean of the middle two. `None` without any. The slice is
/// rearranged.
pub fn median(values: &mut [f64]) -> Option<f64> {
    let count = gather_finite(values);
    let values = &mut values[..count];
    let middle = count / 2;
    if count == 0 {
        return None;
    }
    let (below, &mut upper, _) = values.select_nth_unstable_by(middle, f64::total_cmp);
    if count % 2 == 1 {
        return Some(upper);
    }
    let lower = below.iter().copied().fold(f64::NEG_INFINITY, f64::max);
    Some(lower + (upper - lower) / 2.0)
}

/// `HAMPEL_SCALE` times the median distance from the median, over the finite values; 0 without any. The slice is
/// overwritten.
pub fn robust_deviation(values: &mut [f64]) -> f64 {
    let Some(centre) = median(values) else { return 0.0 };
    for value in values.iter_mut() {
        *value = (*value - centre).abs();
    }
    HAMPEL_SCALE * median(values).unwrap_or(0.0)
}

/// Moves the finite values to the front and tells how many there are.
fn gather_finite(values: &mut [f64]) -> usize {
    let mut count = 0;
    for n in 0..values.len() {
        if values[n].is_finite() {
            values.swap(n, count);
            count += 1;
        }
    }
    count
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn the_scale_turns_quartiles_into_deviations() {
        // Phi(1/scale) must be 3/4: Simpson's rule on the normal density from 0 to 1/scale.
        let end = 1.0 / HAMPEL_SCALE;
        let steps = 2000;
        let h = end / f64::from(steps);
        let density = |x: f64| (-x * x / 2.0).exp() / (2.0 * std::f64::consts::PI).sqrt();
        let weight = |n: i32| if n == 0 || n == steps { 1.0 } else { f64::from(2 + 2 * (n % 2)) };
        let area: f64 = (0..=steps).map(|n| weight(n) * density(f64::from(n) * h)).sum::<f64>() * h / 3.0;
        // Simpson's error at this step is below 1e-15; a scale wrong by 1e-12 moves the area by 1e-13 x 3.
        assert!((area - 0.25).abs() < 1e-13, "{area}");
        // The published value (Hampel 1974; Pearson 2002).
        assert!((HAMPEL_SCALE - 1.482_602_218_505_601_8).abs() < 1e-12);
    }

    #[test]
    fn medians_by_hand() {
        assert_eq!(median(&mut [3.0, 1.0, 2.0]), Some(2.0));
        assert_eq!(median(&mut [4.0, 1.0, f64::NAN, 2.0, 3.0]), Some(2.5));
        assert_eq!(median(&mut [f64::NAN]), None);
        assert_eq!(median(&mut []), None);
        assert!((robust_deviation(&mut [1.0, 2.0, 3.0, 4.0, 100.0]) - HAMPEL_SCALE).abs() < 1e-15);
    }
}
