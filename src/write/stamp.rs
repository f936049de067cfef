//! Stamps of a uniform axis as text: exact quotients where the step allows, so that no rounding error adds up.

use crate::record::Axis;

/// Gives the stamp of any sample of an axis.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) enum StampRule {
    /// (`first` + n x `step`) / `rate`, all whole numbers: the nearest double to the true stamp.
    Quotient { first: f64, step: f64, rate: f64 },
    /// `start` + n x `step`.
    Product { start: f64, step: f64 },
}

impl StampRule {
    /// The rule that reproduces the axis: its step is the nearest double to 1/rate, or to a short decimal number.
    pub(super) fn of(axis: &Axis) -> StampRule {
        let (start, step) = (axis.start(), axis.step());
        let rates = std::iter::once((1.0 / step).round()).chain((0..=9).map(|n| 10_f64.powi(n)));
        for rate in rates {
            let (steps, first) = ((step * rate).round(), (start * rate).round());
            let last = first.abs() + steps * axis.len() as f64;
            // A start that was itself computed as a multiple of the step is off by a few roundings of its own.
            let near = (first / rate - start).abs() <= 4.0 * f64::EPSILON * start.abs();
            if steps >= 1.0 && steps / rate == step && near && last < WHOLE {
                return StampRule::Quotient { first, step: steps, rate };
            }
        }
        StampRule::Product { start, step }
    }

    /// The stamp of sample `n`, in the axis unit.
    pub(super) fn stamp(self, n: usize) -> f64 {
        match self {
            StampRule::Quotient { first, step, rate } => (first + n as f64 * step) / rate,
            StampRule::Product { start, step } => start + n as f64 * step,
        }
    }
}

/// 2^53: whole numbers below it are exact doubles.
const WHOLE: f64 = 9_007_199_254_740_992.0;

#[cfg(test)]
mod tests {
    use super::*;
    use crate::record::RateSource;
    use crate::unit::Unit;

    fn rule(unit: &str, start: f64, step: f64) -> StampRule {
        StampRule::of(&Axis::new(Unit::parse(unit), start, step, 1_000_000, RateSource::Given).unwrap())
    }

    #[test]
    fn a_thousandth_times_three_is_three_thousandths() {
        // 3 x 0.001 in doubles is 0.003, but 3 x 0.1 is 0.30000000000000004: products drift, quotients do not.
        assert_eq!(rule("s", 0.0, 0.1).stamp(3), 0.3);
        for n in [1, 7, 12_345, 999_999] {
            assert_eq!(rule("s", 0.0, 1.0 / 44_100.0).stamp(n), n as f64 / 44_100.0);
            assert_eq!(rule("ms", 0.0, 0.3).stamp(n).to_string(), format!("{}", n as f64 * 3.0 / 10.0));
        }
    }

    #[test]
    fn a_cut_keeps_its_stamps() {
        let whole = Axis::from_rate_hz(200.0, 1000, RateSource::Given).unwrap();
        let cut = whole.cut(123, 500);
        assert_eq!(StampRule::of(&cut).stamp(4), 127.0 / 200.0);
    }

    #[test]
    fn an_odd_step_is_a_plain_product() {
        let step = std::f64::consts::PI * 1e-3;
        assert_eq!(rule("s", 0.25, step), StampRule::Product { start: 0.25, step });
    }
}
