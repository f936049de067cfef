//! Whether the record joins to itself past its ends as smoothly as it runs in its interior.

use serde::Serialize;

use crate::baseline::Side;
use crate::numeric::autoregression::{Burg, dot};
use crate::numeric::sum;

/// Shorter records are not tested: the test would cost more than it tells.
pub const SHORTEST: usize = 256;

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

/// A short autoregression over the record, and the innovations it leaves.
struct Innovations {
    centred: Vec<f64>,
    /// Weight of lag p first, lag 1 last.
    forward: Vec<f64>,
    /// Weight of lag 1 first.
    backward: Vec<f64>,
    variance: f64,
}

impl Innovations {
    /// `None` when the record is shorter than `SHORTEST` or is foretold without any error.
    fn of(samples: &[f64], highest_order: usize) -> Option<Innovations> {
        let n = samples.len();
        if n < SHORTEST {
            return None;
        }
        let mean = sum::mean(samples);
        let centred: Vec<f64> = samples.iter().map(|v| v - mean).collect();
        let order = (n / 8).clamp(2, highest_order);
        let backward = Burg::fit(&centred, order).predictor(order).weights;
        let forward: Vec<f64> = backward.iter().rev().copied().collect();
        let mut found = Innovations { centred, forward, backward, variance: 1.0 };
        let errors = |t: usize| {
            let x = &found.centred;
            found.ahead(&x[t - order..=t]).powi(2) + found.back(&x[t - order..=t]).powi(2)
        };
        let total: f64 = (order..n).map(errors).sum();
        found.variance = total / (2 * (n - order)) as f64;
        (found.variance > 0.0 && found.variance.is_finite()).then_some(found)
    }

    fn order(&self) -> usize {
        self.forward.len()
    }

    /// Error at the last of p + 1 values, foretold from those before it.
    fn ahead(&self, window: &[f64]) -> f64 {
        let (past, now) = window.split_at(self.order());
        now[0] - dot(&self.forward, past)
    }

    /// Error at the first of p + 1 values, foretold from those after it.
    fn back(&self, window: &[f64]) -> f64 {
        window[0] - dot(&self.backward, &window[1..])
    }

    /// Mean squared error of the 2 p innovations that straddle the middle of 2 p values, relative to the interior.
    fn ratio(&self, line: &[f64]) -> f64 {
        let p = self.order();
        let straddling = (0..p).map(|i| &line[i..=i + p]);
        let total: f64 = straddling.map(|w| self.ahead(w).powi(2) + self.back(w).powi(2)).sum();
        total / (2 * p) as f64 / self.variance
    }

    /// The record up to `stop` continued by the record from `start`.
    fn joined(&self, stop: usize, start: usize) -> f64 {
        let p = self.order();
        let line: Vec<f64> = self.centred[stop - p..stop].iter().chain(&self.centred[start..start + p]).copied().collect();
        self.ratio(&line)
    }

    /// The record from `start` on, before it its even reflection.
    fn mirrored(&self, start: usize) -> f64 {
        let p = self.order();
        let half = &self.centred[start..start + p];
        let line: Vec<f64> = half.iter().rev().chain(half).copied().collect();
        self.ratio(&line)
    }

    /// The record up to `stop`, after it its even reflection.
    fn mirrored_after(&self, stop: usize) -> f64 {
        let p = self.order();
        let half = &self.centred[stop - p..stop];
        let line: Vec<f64> = half.iter().chain(half.iter().rev()).copied().collect();
        self.ratio(&line)
    }
}

/// The join of the record's end to its own start; `None` below `SHORTEST` samples.
pub fn periodic(samples: &[f64]) -> Option<Join> {
    let found = Innovations::of(samples, 16)?;
    let (n, p) = (samples.len(), found.order());
    let room = n - 2 * p;
    // Two irrational steps spread the pairs evenly over the square of places (additive recurrence, Roberts 2018).
    let place = |i: usize, step: f64| p + ((0.5 + step * i as f64).fract() * (room + 1) as f64) as usize;
    let mut pairs: Vec<f64> = Vec::with_capacity(PAIRS);
    for i in 1..=4 * PAIRS {
        let (stop, start) = (place(i, 0.754_877_666_246_693), place(i, 0.569_840_290_998_053));
        // A place joined to itself, or nearly, is the record as it is.
        if stop.abs_diff(start) >= p && pairs.len() < PAIRS {
            pairs.push(found.joined(stop.min(n), start.min(n - p)));
        }
    }
    Some(compare(found.joined(n, 0), pairs))
}

/// The join of one end to its own even reflection; `None` below `SHORTEST` samples.
pub fn even(samples: &[f64], side: Side) -> Option<Join> {
    let found = Innovations::of(samples, 32)?;
    let (n, p) = (samples.len(), found.order());
    let room = n - 2 * p;
    let count = MIRRORS.min(room);
    let place = |i: usize| p + i * room / count;
    let (own, others) = match side {
        Side::Left => (found.mirrored(0), (0..count).map(|i| found.mirrored(place(i))).collect()),
        Side::Right => (found.mirrored_after(n), (0..count).map(|i| found.mirrored_after(place(i) + 1)).collect()),
    };
    Some(compare(own, others))
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

    #[test]
    fn whole_revolutions_join_and_broken_ones_do_not() {
        let whole = periodic(&tones(1024, 8.0)).expect("long enough");
        assert!(whole.ratio < 2.0 && whole.share < 0.05 && whole.median > 25.0, "{whole:?}");
        let broken = periodic(&tones(1024, 8.4)).expect("long enough");
        assert!(broken.ratio > 25.0, "{broken:?}");
    }

    #[test]
    fn a_crest_at_the_end_joins_its_own_reflection() {
        // Cosines over half cycles of the mirror interval are even about both ends.
        let both = tones(1024, 7.5);
        for side in [Side::Left, Side::Right] {
            let join = even(&both, side).expect("long enough");
            assert!(join.ratio < 2.0 && join.share < 0.1 && join.median > 6.0, "{join:?}");
        }
        let right = even(&tones(1024, 7.3), Side::Right).expect("long enough");
        assert!(right.ratio > 6.0, "{right:?}");
    }

    #[test]
    fn scale_and_offset_change_nothing_and_short_records_are_not_tested() {
        let x = tones(512, 5.2);
        let moved: Vec<f64> = x.iter().map(|v| 3.0 - 40.0 * v).collect();
        let (a, b) = (periodic(&x).expect("long"), periodic(&moved).expect("long"));
        assert!((a.ratio / b.ratio - 1.0).abs() < 1e-6 && a.share == b.share);
        assert!(periodic(&x[..255]).is_none() && even(&x[..255], Side::Left).is_none());
        assert!(periodic(&[1.0; 300]).is_none());
    }
}
