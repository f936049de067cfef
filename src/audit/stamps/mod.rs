//! How the rows of a time or position column are spaced: the rate, how sure it is, and what is wrong with the stamps.
//!
//! A stamp is the true instant to within its print resolution q. Rows are even exactly when all stamps fit into a strip
//! of height q about a straight line; every slope that allows such a strip is a possible step, so the set of them is a
//! hard interval for the true step. What does not fit is split into slow and fast deviations and named by their sizes.

mod candidate;
mod clock;
mod residual;
mod track;
mod whole_step;

use serde::Serialize;

use crate::numeric::rational::Rational;
use crate::numeric::strip::Strip;
use crate::record::{Spacing, Stamps};
use crate::unit::Unit;

pub use clock::Wrap;
pub use residual::Scatter;

use candidate::Candidates;
use clock::Clock;
use track::Track;

/// What a column of stamps says. Steps and stamps are in `unit`, rows count from 0.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct StampReading {
    /// How the rows are spaced, apart from missing rows.
    pub spacing: Spacing,
    /// Number of rows.
    pub rows: usize,
    /// Unit of the stamps.
    pub unit: Unit,
    /// The first stamp.
    pub first: f64,
    /// Print resolution: what a stamp can be off by.
    pub resolution: f64,
    /// The step, where one can be told.
    pub step: Option<f64>,
    /// Every step that the stamps allow lies in here; only where the rows are even to print resolution.
    pub interval: Option<[f64; 2]>,
    /// The plainest rate inside the interval, samples per second or metre.
    pub rate: Option<Rational>,
    /// Rows that are missing between those that are there.
    pub missing: u64,
    /// Where they are missing.
    pub gaps: Vec<StampGap>,
    /// Rows whose stamp repeats that of the row before.
    pub repeated: Vec<usize>,
    /// First row whose stamp lies before that of the row above it.
    pub backwards: Option<usize>,
    /// Row at which the clock jumped by a part of a step.
    pub slip: Option<usize>,
    /// Where a clock that starts over was carried on.
    pub wraps: Vec<Wrap>,
    /// Deviations from the even grid, where the rows are not even to print resolution.
    pub scatter: Option<Scatter>,
    /// Rows that share one stamp, on average, where stamps are coarser than the rows.
    pub rows_per_stamp: Option<f64>,
}

/// Missing rows between two rows.
#[derive(Debug, Clone, Copy, PartialEq, Serialize)]
pub struct StampGap {
    /// First row after the gap.
    pub row: usize,
    /// How many rows are missing before it.
    pub missing: u64,
    /// Distance of its stamp from the one before.
    pub width: f64,
}

/// What is known beside the stamps.
pub struct Beside<'a> {
    /// A step in the unit of the stamps that somebody vouches for.
    pub step: Option<f64>,
    /// Whether a row holds the same values as the row before it.
    pub same_row: &'a dyn Fn(usize) -> bool,
}

/// Largest tick handled: differences and their products stay inside the integer types used.
const LARGEST_TICK: u64 = 1 << 61;

impl StampReading {
    /// Reads a column of stamps; never fails.
    pub fn new(stamps: &Stamps, beside: &Beside<'_>) -> StampReading {
        let mut reading = StampReading::blank(stamps);
        let sound = stamps.tick > 0.0 && stamps.tick.is_finite() && stamps.first.is_finite();
        if !sound || stamps.ticks.iter().any(|t| t.unsigned_abs() > LARGEST_TICK) {
            return StampReading { spacing: Spacing::Irregular, ..reading };
        }
        if stamps.ticks.len() < 2 {
            return StampReading { spacing: Spacing::Single, ..reading };
        }
        let clock = match Clock::new(stamps) {
            Ok(clock) => clock,
            Err(row) => return StampReading { spacing: Spacing::Backwards, backwards: Some(row), ..reading },
        };
        reading.wraps = clock.wraps.clone();
        reading.resolution = clock.resolution * stamps.tick;
        reading.classify(&clock, beside);
        reading
    }

    /// Index on the even grid of every row: its own number plus the rows missing before it.
    pub fn indices(&self) -> impl Iterator<Item = u64> + '_ {
        let mut gaps = self.gaps.iter().peekable();
        let mut missing = 0;
        (0..self.rows).map(move |row| {
            while let Some(gap) = gaps.next_if(|gap| gap.row <= row) {
                missing += gap.missing;
            }
            row as u64 + missing
        })
    }

    /// Distance of every stamp from the first, in `unit`, on the clock carried on through `wraps`.
    pub fn positions(&self, stamps: &Stamps) -> Vec<f64> {
        let scale = self.unit.meaning().map_or(1.0, |m| m.scale);
        let first = stamps.ticks.first().copied().unwrap_or(0);
        let mut wraps = self.wraps.iter().peekable();
        let mut carried = 0.0;
        let at = |(row, &tick): (usize, &i64)| {
            while let Some(wrap) = wraps.next_if(|wrap| wrap.row <= row) {
                carried += wrap.modulus_seconds / scale;
            }
            tick.saturating_sub(first) as f64 * stamps.tick + carried
        };
        stamps.ticks.iter().enumerate().map(at).collect()
    }

    /// What it says of rows `first..last`, between which none is missing, by the step of the whole column.
    #[must_use]
    pub fn stretch(&self, first: usize, last: usize) -> StampReading {
        let inside = |row: usize| (first + 1..last).contains(&row);
        StampReading {
            rows: last - first,
            missing: 0,
            gaps: Vec::new(),
            slip: self.slip.filter(|&row| inside(row)).map(|row| row - first),
            wraps: (self.wraps.iter().filter(|wrap| inside(wrap.row)))
                .map(|wrap| Wrap { row: wrap.row - first, ..wrap.clone() })
                .collect(),
            ..self.clone()
        }
    }

    fn blank(stamps: &Stamps) -> StampReading {
        StampReading {
            spacing: Spacing::Single,
            rows: stamps.ticks.len(),
            unit: stamps.unit.clone(),
            first: stamps.first + stamps.ticks.first().map_or(0.0, |&tick| tick as f64 * stamps.tick),
            resolution: stamps.resolution,
            step: None,
            interval: None,
            rate: None,
            missing: 0,
            gaps: Vec::new(),
            repeated: Vec::new(),
            backwards: None,
            slip: None,
            wraps: Vec::new(),
            scatter: None,
            rows_per_stamp: None,
        }
    }

    fn classify(&mut self, clock: &Clock<'_>, beside: &Beside<'_>) {
        let ticks: &[i64] = &clock.ticks;
        let q = clock.resolution;
        // The common case first: every row there, even to print resolution.
        let rows = Strip::within(ticks.len(), |n| (n as i64, ticks[n]), clock.limit());
        let rows = rows.filter(|strip| strip.narrowest().1 > 0.0);
        if let (Some(strip), Some(step)) = (&rows, beside.step.map(|step| step / clock.tick))
            && strip.width(step) <= clock.limit()
        {
            return self.settle_even(clock, strip, Some(step));
        }
        let candidates = if rows.is_some() { None } else { Some(Candidates::new(ticks, q)) };
        let near = candidates.as_ref().map(|guesses| guesses.near);
        let rough = near.or(rows.as_ref().map(|strip| strip.narrowest().1)).unwrap_or(0.0);
        if q >= rough / 2.0 {
            return self.settle_coarse(clock, rows.as_ref(), beside);
        }
        if let Some(strip) = &rows {
            return self.settle_even(clock, strip, None);
        }
        self.repeated = (1..ticks.len()).filter(|&n| ((ticks[n] - ticks[n - 1]) as f64) <= q / 2.0).collect();
        let Some(candidates) = candidates else { return };
        if !self.repeated.is_empty() {
            self.spacing = Spacing::Repeated;
            self.step = Some(candidates.median * clock.tick);
            return;
        }
        let tracks = Track::all(clock, &candidates);
        let Some(best) = tracks.first() else {
            self.spacing = Spacing::Irregular;
            return;
        };
        // Coarse stamps with jitter can mimic even ones of a faster rate with many rows missing. Where another step
        // needs less than half the missing rows and leaves no more than jitter, that is the likelier reading.
        let plainer = |track: &&Track| {
            track.strip.is_none()
                && 2 * track.missing() < best.missing()
                && matches!(residual::judge(clock, track).0, Spacing::NearUniform | Spacing::Jittered)
        };
        let doubtful = best.strip.is_some() && q > 0.3 * best.step;
        let other = if doubtful { tracks[1..].iter().find(plainer) } else { None };
        self.settle_track(clock, other.unwrap_or(best));
    }

    /// Every row there, even to print resolution.
    fn settle_even(&mut self, clock: &Clock<'_>, strip: &Strip, known: Option<f64>) {
        self.spacing = Spacing::Uniform;
        let (_, best) = strip.narrowest();
        let interval = strip.interval(clock.resolution).unwrap_or([best, best]);
        self.settle_step(clock, interval);
        if let Some(known) = known {
            self.step = Some(known * clock.tick);
            self.rate = None;
        }
        let distinct = 1 + clock.ticks.windows(2).filter(|pair| pair[1] != pair[0]).count();
        if distinct < clock.ticks.len() {
            self.rows_per_stamp = Some(clock.ticks.len() as f64 / distinct as f64);
        }
    }

    /// Stamps no finer than half a step: a missing row cannot be told from rounding, except where every step is a
    /// whole multiple of one and the same.
    fn settle_coarse(&mut self, clock: &Clock<'_>, rows: Option<&Strip>, beside: &Beside<'_>) {
        if let Some(whole) = whole_step::find(&clock.ticks) {
            let step = whole.step as f64;
            let within = |[low, high]: [f64; 2]| step >= low * (1.0 - 1e-12) && step <= high * (1.0 + 1e-12);
            // Several rounding steps in one direction show a rate beside the round one; a single one does not.
            let believable = rows.and_then(|strip| strip.interval(clock.resolution)).is_none_or(within);
            let only_rounding =
                rows.is_some() && whole.gaps.is_empty() && !whole.repeated.iter().any(|&n| (beside.same_row)(n));
            if believable && !only_rounding {
                self.step = Some(step * clock.tick);
                if !whole.repeated.is_empty() {
                    self.spacing = Spacing::Repeated;
                    self.repeated = whole.repeated;
                    return;
                }
                self.gaps_from(clock, whole.gaps.into_iter());
                let track = Strip::new(self.indices().map(|n| n as i64).zip(clock.ticks.iter().copied()));
                return self.settle_even(clock, &track, None);
            }
        }
        match rows {
            Some(strip) => self.settle_even(clock, strip, None),
            None => self.spacing = Spacing::Unresolved,
        }
    }

    /// Rows on the indices that a phase tracker found.
    fn settle_track(&mut self, clock: &Clock<'_>, track: &Track) {
        let steps = track.indices.windows(2).enumerate();
        self.gaps_from(clock, steps.filter(|(_, w)| w[1] - w[0] > 1).map(|(n, w)| (n + 1, (w[1] - w[0] - 1) as u64)));
        self.step = Some(track.step * clock.tick);
        // What is left of that mimicry when no other step was found.
        let rows_and_missing = self.rows as f64 + self.missing as f64;
        if clock.resolution > 0.3 * track.step && self.missing as f64 > 0.1 * rows_and_missing {
            self.gaps.clear();
            self.missing = 0;
            self.spacing = Spacing::Unresolved;
            return;
        }
        if let Some(strip) = &track.strip {
            return self.settle_even(clock, strip, None);
        }
        let (spacing, scatter, slip) = residual::judge(clock, track);
        self.spacing = spacing;
        self.slip = slip;
        if matches!(spacing, Spacing::NearUniform | Spacing::Jittered) {
            // The slope of least squares scatters by sqrt(12) s / N^1.5; four of them on each side.
            let doubt = 4.0 * 12f64.sqrt() * track.deviation / (self.rows as f64).powf(1.5);
            self.settle_step(clock, [track.step - doubt, track.step + doubt]);
            self.interval = None; // likely, not certain
        }
        self.scatter = Some(scatter);
    }

    /// Step and rate from an interval for the step in ticks.
    fn settle_step(&mut self, clock: &Clock<'_>, [low, high]: [f64; 2]) {
        let step = [low * clock.tick, high * clock.tick];
        self.interval = Some(step);
        self.step = Some(step[0] + (step[1] - step[0]) / 2.0);
        // Ticks of powers of ten are not binary fractions: a relative 1e-15 keeps the exact rate inside.
        let [slowest, fastest] = [step[1], step[0]].map(|h| 1.0 / (h * clock.scale));
        self.rate = Rational::plainest(slowest * (1.0 - 1e-15), fastest * (1.0 + 1e-15));
        if let Some(rate) = self.rate {
            self.step = Some(rate.reciprocal().value() / clock.scale);
        }
    }

    fn gaps_from(&mut self, clock: &Clock<'_>, gaps: impl Iterator<Item = (usize, u64)>) {
        let width = |row: usize| (clock.ticks[row] - clock.ticks[row - 1]) as f64 * clock.tick;
        self.gaps = gaps.map(|(row, missing)| StampGap { row, missing, width: width(row) }).collect();
        self.missing = self.gaps.iter().map(|gap| gap.missing).sum();
    }
}
