//! How finely a channel is stepped: the least significant bit, the levels in use, single precision.

use serde::Serialize;

/// The steps of a channel's values, in its unit.
#[derive(Debug, Clone, Default, PartialEq, Serialize)]
pub struct Quantisation {
    /// Number of distinct values.
    pub levels: usize,
    /// Smallest distance of two distinct values.
    pub smallest_gap: Option<f64>,
    /// The least significant bit: the smallest distance, where at least 90 % of the distances are multiples of it.
    pub lsb: Option<f64>,
    /// Bits that the range of the values uses: log2(range / lsb + 1).
    pub bits: Option<f64>,
    /// Every value is a 32-bit float.
    pub single_precision: bool,
}

/// A distance within that part of an lsb of a multiple counts as one: printed decimals round.
const TOLERANCE: f64 = 0.05;
/// Share of distances that must be multiples.
const SHARE: f64 = 0.9;

impl Quantisation {
    /// From the finite values in ascending order.
    pub fn of(sorted: &[f64]) -> Quantisation {
        let (Some(&low), Some(&high)) = (sorted.first(), sorted.last()) else { return Quantisation::default() };
        let gaps = || sorted.windows(2).map(|pair| pair[1] - pair[0]).filter(|&gap| gap > 0.0);
        let levels = 1 + gaps().count();
        let smallest_gap = gaps().reduce(f64::min);
        let single_precision = sorted.iter().all(|&v| v == f64::from(v as f32));
        let largest = low.abs().max(high.abs());
        let lsb = smallest_gap.filter(|&q| {
            let slack = TOLERANCE + 4.0 * f64::EPSILON * largest / q;
            let multiple = |gap: f64| ((gap / q) - (gap / q).round()).abs() <= slack;
            let multiples = gaps().filter(|&gap| multiple(gap)).count();
            // The grid of the floats themselves is no converter's.
            let float_grid = f64::from((largest as f32).next_up()) - f64::from(largest as f32);
            let is_float_grid = single_precision && levels > 1000 && q < 0.75 * float_grid;
            slack < 0.25 && multiples as f64 >= SHARE * (levels - 1) as f64 && !is_float_grid
        });
        let bits = lsb.map(|q| ((high - low) / q + 1.0).log2());
        Quantisation { levels, smallest_gap, lsb, bits, single_precision }
    }

    /// The lsb, or failing that the smallest distance of two values, or 0.
    pub fn floor(&self) -> f64 {
        self.lsb.or(self.smallest_gap).unwrap_or(0.0)
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn sorted(mut values: Vec<f64>) -> Vec<f64> {
        values.sort_by(f64::total_cmp);
        values
    }

    #[test]
    fn a_converter_shows_its_lsb() {
        let lsb = 1.0 / 2048.0;
        let wave = |n: i32| 0.7 * (f64::from(n) * 0.037).sin();
        let q = Quantisation::of(&sorted((0..3000).map(|n| (wave(n) / lsb).round() * lsb).collect()));
        assert_eq!(q.lsb, Some(lsb));
        assert!(q.single_precision);
        // From -1434 to 1434 steps: log2(2869).
        assert!((q.bits.unwrap_or(0.0) - 2869f64.log2()).abs() < 0.01);
        // The same printed with five decimals.
        let printed =
            Quantisation::of(&sorted((0..3000).map(|n| ((wave(n) / 0.01).round() * 1e3).round() / 1e5).collect()));
        assert!((printed.lsb.unwrap_or(0.0) - 0.01).abs() < 1e-12);
        assert!(!printed.single_precision);
    }

    #[test]
    fn a_continuous_channel_has_none() {
        let values: Vec<f64> = (0..3000).map(|n| 0.7 * (f64::from(n) * 0.0371).sin()).collect();
        assert_eq!(Quantisation::of(&sorted(values.clone())).lsb, None);
        let single = Quantisation::of(&sorted(values.iter().map(|&v| f64::from(v as f32)).collect()));
        assert!(single.single_precision);
        assert_eq!(single.lsb, None);
        assert_eq!(Quantisation::of(&[]), Quantisation::default());
        assert_eq!(Quantisation::of(&[1.5, 1.5]).levels, 1);
    }
}
