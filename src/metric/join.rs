//! Whether the record joins to itself past its ends as smoothly as it runs in its interior.

use serde::Serialize;

use crate::numeric::autoregression::{Burg, dot};
use crate::numeric::sum;

/// Shorter histories are not tested: the test would cost more than it tells.
pub const SHORTEST: usize = 256;

/// Highest order of the autoregression behind the periodic join.
const PERIODIC_ORDER: usize = 16;

/// Highest order of the autoregression behind even joins.
const EVEN_ORDER: usize = 32;

/// Interior pairs of places that a periodic join is compared with.
const PAIRS: usize = 1024;

/// Interior mirrors that an even join is compared with.
const MIRRORS: usize = 512;

/// One join compared with joins made at arbitrary places of the interior.
#[derive(Debug, Clone, Copy, PartialEq, Serialize)]
pub struct Join {
    /// Mean squared one-step error across the join, relative to the interior's: 1 where it joins seamlessly.
    pub ratio: f64,
    /// Share of arbitrary joins that are as smooth: (1 + number with a ratio not above) / (1 + number).
    pub share: f64,
    /// Median ratio of the arbitrary joins. Near 1 nothing can be told: every join looks smooth.
    pub median: f64,
}

/// The history towards one end, oldest first, and a short autoregression that foretells it from its past.
struct Course {
    /// Less `mean`.
    values: Vec<f64>,
    /// Weight of the highest lag first, lag 1 last.
    weights: Vec<f64>,
    /// Mean squared one-step error in the interior.
    variance: f64,
}

impl Course {
    /// `None` when the history is short or is foretold without any error.
    fn of(history: &[f64], mean: f64, highest_order: usize) -> Option<Course> {
        let n = history.len();
        if n < SHORTEST {
            return None;
        }
        let values: Vec<f64> = history.iter().map(|v| v - mean).collect();
        let order = (n / 8).clamp(2, highest_order);
        let weights: Vec<f64> = Burg::fit(&values, order).predictor(order).weights.into_iter().rev().collect();
        let mut course = Course { values, weights, variance: 1.0 };
        let total: f64 = course.values.windows(order + 1).map(|w| course.squared_error(w)).sum();
        course.variance = total / (n - order) as f64;
        (course.variance > 0.0 && course.variance.is_finite()).then_some(course)
    }

    fn order(&self) -> usize {
        self.weights.len()
    }

    /// Squared error at the last of p + 1 values, foretold from those before it, relative to the interior.
    fn squared_error(&self, window: &[f64]) -> f64 {
        let (past, now) = window.split_at(self.order());
        (now[0] - dot(&self.weights, past)).powi(2) / self.variance
    }

    /// Mean squared error of the p values that follow the first `stop` ones when they are `next`.
    fn ratio(&self, stop: usize, next: impl Iterator<Item = f64>) -> f64 {
        let p = self.order();
        let line: Vec<f64> = self.values[stop - p..stop].iter().copied().chain(next.take(p)).collect();
        line.windows(p + 1).map(|w| self.squared_error(w)).sum::<f64>() / p as f64
    }
}

/// The join of the record's end to its own start. `left` and `right` are the histories towards both ends, oldest first:
/// the last value of each touches its end. `None` for histories shorter than `SHORTEST`.
pub fn periodic(left: &[f64], right: &[f64]) -> Option<Join> {
    let mean = sum::mean(right);
    let (left, right) = (Course::of(left, mean, PERIODIC_ORDER)?, Course::of(right, mean, PERIODIC_ORDER)?);
    let p = left.order().max(right.order());
    // Onwards from the end into the start, and backwards from the start into the end.
    let joined = |stop: usize, start: usize| {
        let after = left.values[..start].iter().rev().copied();
        let before = right.values[..stop].iter().rev().copied();
        0.5 * (right.ratio(stop, after) + left.ratio(start, before))
    };
    let n = left.values.len().min(right.values.len());
    let room = n - 2 * p;
    // Two irrational steps spread the pairs evenly over the square of places (additive recurrence, Roberts 2018).
    let place = |i: usize, step: f64| p + ((0.5 + step * i as f64).fract() * room as f64) as usize;
    let mut pairs: Vec<f64> = Vec::with_capacity(PAIRS);
    for i in 1..=4 * PAIRS {
        let (stop, start) = (place(i, 0.754_877_666_246_693), place(i, 0.569_840_290_998_053));
        // The start counts from the other end. A place joined to itself, or nearly, is the record as it is.
        if stop.abs_diff(n - start) >= p && pairs.len() < PAIRS {
            pairs.push(joined(stop, start));
        }
    }
    Some(compare(joined(right.values.len(), left.values.len()), pairs))
}

/// The join of one end to its own even reflection, from the history towards it, oldest first. `None` for a history
/// shorter than `SHORTEST`.
pub fn even(history: &[f64]) -> Option<Join> {
    let course = Course::of(history, sum::mean(history), EVEN_ORDER)?;
    let (n, p) = (history.len(), course.order());
    let mirrored = |stop: usize| course.ratio(stop, course.values[..stop].iter().rev().copied());
    let room = n - p;
    let count = MIRRORS.min(room);
    Some(compare(mirrored(n), (0..count).map(|i| mirrored(p + i * room / count)).collect()))
}

fn compare(ratio: f64, mut others: Vec<f64>) -> Join {
    let smooth = others.iter().filter(|other| **other <= ratio).count();
    let share = (1 + smooth) as f64 / (1 + others.len()) as f64;
    let middle = others.len() / 2;
    let median = if others.is_empty() { ratio } else { *others.select_nth_unstable_by(middle, f64::total_cmp).1 };
    Join { ratio, share, median }
}

#[cfg(test)]
mod tests {
    use super::*;
    use std::f64::consts::TAU;

    /// Tones with a little noise, so that innovations are not rounding alone.
    fn tones(len: usize, cycles: f64) -> Vec<f64> {
        let mut state = 7u64;
        let mut noise = || {
            state = state.wrapping_mul(6364136223846793005).wrapping_add(1442695040888963407);
            (state >> 11) as f64 / (1u64 << 53) as f64 - 0.5
        };
        let at = |n: usize, c: f64| (TAU * c * (n as f64 + 0.5) / len as f64).cos();
        (0..len).map(|n| at(n, cycles) + 0.3 * at(n, 3.0 * cycles) + 0.01 * noise()).collect()
    }

    fn reversed(x: &[f64]) -> Vec<f64> {
        x.iter().rev().copied().collect()
    }

    #[test]
    fn whole_revolutions_join_and_broken_ones_do_not() {
        let join = |x: &[f64]| periodic(&reversed(x), x).expect("long enough");
        let whole = join(&tones(1024, 8.0));
        assert!(whole.ratio < 2.0 && whole.share < 0.05 && whole.median > 25.0, "{whole:?}");
        let broken = join(&tones(1024, 8.4));
        assert!(broken.ratio > 25.0, "{broken:?}");
    }

    #[test]
    fn a_crest_at_the_end_joins_its_own_reflection() {
        // Cosines over half cycles of the mirror interval are even about both ends.
        let both = tones(1024, 7.5);
        for history in [both.clone(), reversed(&both)] {
            let join = even(&history).expect("long enough");
            assert!(join.ratio < 2.0 && join.share < 0.1 && join.median > 6.0, "{join:?}");
        }
        let right = even(&tones(1024, 7.3)).expect("long enough");
        assert!(right.ratio > 6.0, "{right:?}");
    }

    #[test]
    fn scale_offset_and_direction_change_nothing_and_short_records_are_not_tested() {
        let x = tones(512, 5.2);
        let moved: Vec<f64> = x.iter().map(|v| 3.0 - 40.0 * v).collect();
        let a = periodic(&reversed(&x), &x).expect("long");
        for b in [periodic(&reversed(&moved), &moved), periodic(&x, &reversed(&x))] {
            let b = b.expect("long");
            assert!((a.ratio / b.ratio - 1.0).abs() < 1e-6, "{a:?} {b:?}");
        }
        assert!(periodic(&x[..255], &x[..255]).is_none() && even(&x[..255]).is_none());
        assert!(periodic(&[1.0; 300], &[1.0; 300]).is_none());
    }
}
