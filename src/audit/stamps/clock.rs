//! The stamps on one unbroken clock: clocks that start over at midnight or overflow are carried on.

use std::borrow::Cow;

use serde::Serialize;

use crate::numeric::quantile::median;
use crate::numeric::rational::greatest_common_divisor;
use crate::record::Stamps;

/// Where a clock started over.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct Wrap {
    /// First row after it.
    pub row: usize,
    /// What the clock counts up to, in seconds.
    pub modulus_seconds: f64,
    /// What that is: `midnight`, `2^32 ms`.
    pub what: &'static str,
}

/// Ticks that never go back, and how finely they are printed.
pub struct Clock<'a> {
    /// Ticks since the first row.
    pub ticks: Cow<'a, [i64]>,
    /// Size of a tick in the unit of the stamps.
    pub tick: f64,
    /// Size of the unit in seconds or metres.
    pub scale: f64,
    /// Print resolution in ticks.
    pub resolution: f64,
    /// Rounding of stamps that were binary fractions before they were ticks, in ticks.
    slack: f64,
    /// Where the clock was carried on.
    pub wraps: Vec<Wrap>,
}

/// Clocks that start over, seconds and name. Civil clocks, and counters of 16 and 32 bits.
const MODULI: &[(f64, &str)] = &[
    (86_400.0, "midnight"),
    (43_200.0, "twelve hours"),
    (3_600.0, "the hour"),
    (604_800.0, "the week"),
    (4_294_967.296, "2^32 ms"),
    (4_294.967_296, "2^32 us"),
    (65.536, "2^16 ms"),
];

impl<'a> Clock<'a> {
    /// The stamps on one clock, or the first row that goes back for no known reason. At least two rows.
    pub fn new(stamps: &'a Stamps) -> Result<Clock<'a>, usize> {
        let raw = &stamps.ticks[..];
        let scale = stamps.unit.meaning().map_or(1.0, |m| m.scale);
        let printed = (stamps.resolution / stamps.tick).max(1.0);
        let resolution = if printed.is_finite() { printed.max(single_precision(stamps)) } else { 1.0 };
        let mut clock = Clock {
            ticks: Cow::Borrowed(raw),
            tick: stamps.tick,
            scale,
            resolution,
            slack: binary_slack(stamps),
            wraps: Vec::new(),
        };
        if let Some(first_back) = raw.windows(2).position(|pair| pair[1] < pair[0]) {
            if !stamps.unit.is_time() {
                return Err(first_back + 1);
            }
            clock.unwrap(raw)?;
        }
        if clock.median_step() == 0.0 {
            // Most stamps repeat: the clock itself ticks more coarsely than it is printed.
            let steps = clock.ticks.windows(2).map(|pair| pair[1].abs_diff(pair[0]));
            let common = steps.fold(0, greatest_common_divisor);
            clock.resolution = clock.resolution.max(common as f64);
        }
        Ok(clock)
    }

    /// Largest height of the strip that even stamps can need.
    pub fn limit(&self) -> f64 {
        self.resolution * (1.0 + 1e-6) + self.slack
    }

    /// The median step in ticks; over an even choice of at most 100,000 rows.
    pub fn median_step(&self) -> f64 {
        median_step(&self.ticks)
    }

    fn unwrap(&mut self, raw: &[i64]) -> Result<(), usize> {
        let longest = (20.0 * median_step(raw)).max(2.0 * self.resolution);
        let mut ticks = Vec::with_capacity(raw.len());
        let mut turns = vec![0u32; MODULI.len()];
        let mut offset = 0i64;
        let mut rounded = false;
        ticks.push(raw[0]);
        for row in 1..raw.len() {
            let step = (raw[row] - raw[row - 1]) as f64;
            if step < 0.0 {
                let period = |k: usize| MODULI[k].0 / self.scale / self.tick;
                let fits =
                    |&k: &usize| step < -0.5 * period(k) && step + period(k) > 0.0 && step + period(k) <= longest;
                let Some(k) = (0..MODULI.len()).find(fits) else { return Err(row) };
                turns[k] += 1;
                // Rounded once in all, so that many turns do not add their roundings.
                let exact: f64 = turns.iter().enumerate().map(|(k, &count)| f64::from(count) * period(k)).sum();
                rounded |= (exact - exact.round()).abs() > 1e-6;
                offset = exact.round() as i64;
                self.wraps.push(Wrap { row, modulus_seconds: MODULI[k].0, what: MODULI[k].1 });
            }
            let Some(tick) = raw[row].checked_add(offset).filter(|t| t.unsigned_abs() <= super::LARGEST_TICK) else {
                return Err(row);
            };
            ticks.push(tick);
        }
        if rounded {
            self.slack += 1.0;
        }
        self.ticks = Cow::Owned(ticks);
        Ok(())
    }
}

fn median_step(ticks: &[i64]) -> f64 {
    let stride = (ticks.len() / 100_000).max(1);
    let mut steps: Vec<f64> = ticks.windows(2).step_by(stride).map(|pair| (pair[1] - pair[0]) as f64).collect();
    median(&mut steps).unwrap_or(0.0)
}

/// Distance of neighbouring 32-bit floats at the largest stamp, in ticks, when every stamp is one to the last digit and
/// that distance is at least ten ticks: then that is how finely the clock was kept, however many digits are printed.
/// Otherwise 0. Stamps of another clock pass at most once in ten each.
fn single_precision(stamps: &Stamps) -> f64 {
    let value = |tick: i64| stamps.first + tick as f64 * stamps.tick;
    // Half a tick for the last printed digit, 2 ulp for the way from text to double.
    let slack = 0.5 * stamps.tick * (1.0 + 1e-9);
    let is_single = |v: f64| (v - f64::from(v as f32)).abs() <= slack + 2.0 * f64::EPSILON * v.abs();
    let ends = [stamps.ticks.first(), stamps.ticks.last()].into_iter().flatten();
    let largest = ends.map(|&tick| value(tick).abs()).fold(0.0, f64::max) as f32;
    let spacing = (f64::from(largest.next_up()) - f64::from(largest)) / stamps.tick;
    let coarse = spacing.is_finite() && spacing >= 10.0;
    if coarse && stamps.ticks.iter().all(|&tick| is_single(value(tick))) { spacing } else { 0.0 }
}

/// Four ulp of the largest stamp, in ticks, where ticks are binary fractions: such stamps were computed, not printed.
fn binary_slack(stamps: &Stamps) -> f64 {
    let mantissa_is_zero = stamps.tick.to_bits() & ((1 << 52) - 1) == 0;
    if stamps.tick == 1.0 || !mantissa_is_zero {
        return 0.0;
    }
    let end = stamps.ticks.iter().map(|t| t.unsigned_abs()).max().unwrap_or(0) as f64 * stamps.tick;
    4.0 * f64::EPSILON * (stamps.first.abs() + end) / stamps.tick
}
