//! Numbers every row on an even grid by following the phase of its stamp, and fits the step to that.

use super::candidate::Candidates;
use super::clock::Clock;
use crate::numeric::strip::Strip;

/// Rows on a grid.
pub struct Track {
    /// Index of every row, strictly ascending from 0.
    pub indices: Vec<i64>,
    /// Step of least squares, in ticks.
    pub step: f64,
    /// Stamp of index 0 on the line of least squares, in ticks after the first stamp.
    pub start: f64,
    /// Standard deviation about that line, in ticks.
    pub deviation: f64,
    /// The hulls of the stamps over the indices, where the stamps are even to print resolution.
    pub strip: Option<Strip>,
}

/// How much of a deviation the followed phase takes over.
const GAIN: f64 = 0.1;
/// Relative change of the step at which the fit stands still.
const STILL: f64 = 1e-9;
/// A fit that has not come to rest by then never will.
const ROUNDS: usize = 20;

impl Track {
    /// The tracks of all candidates that differ, best first: those that fit the print resolution by the number of missing
    /// rows, then the others by how close they lie to their grid.
    pub fn all(clock: &Clock<'_>, candidates: &Candidates) -> Vec<Track> {
        let mut tracks: Vec<Track> = Vec::new();
        for &guess in &candidates.all {
            // Guesses differ enough to matter only where the stamps are coarse.
            if tracks.first().is_some_and(|t| clock.resolution < 0.1 * t.step && t.deviation < 0.1 * t.step) {
                break;
            }
            let Some(track) = Track::follow(clock, guess, &tracks) else { continue };
            let at = tracks.iter().position(|other| track.beats(other)).unwrap_or(tracks.len());
            tracks.insert(at, track);
        }
        tracks
    }

    /// Rows missing between those that are there.
    pub fn missing(&self) -> u64 {
        let last = self.indices.last().copied().unwrap_or(0);
        (last + 1 - self.indices.len() as i64).max(0) as u64
    }

    fn beats(&self, other: &Track) -> bool {
        let key = |track: &Track| {
            let fits = track.strip.is_some();
            (!fits, if fits { track.indices.last().copied().unwrap_or(0) as f64 } else { track.deviation / track.step })
        };
        key(self) < key(other)
    }

    /// Follows the stamps from a first guess of the step until indices and step agree. `None` when the step runs off,
    /// or arrives at that of a track in `known`.
    fn follow(clock: &Clock<'_>, guess: f64, known: &[Track]) -> Option<Track> {
        let ticks: &[i64] = &clock.ticks;
        let mut step = guess;
        let mut indices = vec![0i64; ticks.len()];
        let mut line = Line::default();
        for _ in 0..ROUNDS {
            line = number(ticks, step, &mut indices)?;
            let change = line.slope;
            step += change;
            if !(step.is_finite() && step > 0.0) {
                return None;
            }
            if known.iter().any(|track| (track.step - step).abs() <= STILL * step) {
                return None;
            }
            if change.abs() <= STILL * step {
                break;
            }
        }
        let strip = Strip::within(ticks.len(), |n| (indices[n], ticks[n]), clock.limit());
        Some(Track { indices, step, start: line.level, deviation: line.deviation, strip })
    }
}

/// A straight line through deviations from the grid.
#[derive(Default)]
struct Line {
    slope: f64,
    level: f64,
    deviation: f64,
}

/// Numbers the rows with a step, and fits a line to what their stamps deviate from it.
fn number(ticks: &[i64], step: f64, indices: &mut [i64]) -> Option<Line> {
    let first = *ticks.first()?;
    let mut phase = 0.0;
    let mut previous = -1i64;
    // Sums about the middle of the rows and of small deviations: no cancellation.
    let centre = ((ticks[ticks.len() - 1] - first) as f64 / step / 2.0).round();
    let per_step = 1.0 / step;
    if (ticks[ticks.len() - 1] - first) as f64 * per_step > 9e15 {
        return None;
    }
    let (mut sum_n, mut sum_nn, mut sum_r, mut sum_nr, mut sum_rr) = (0.0, 0.0, 0.0, 0.0, 0.0);
    for (slot, &tick) in indices.iter_mut().zip(ticks) {
        let stamp = (tick - first) as f64;
        // Truncation of what is half a step further on rounds; below zero the previous index decides.
        let index = (((stamp - phase) * per_step + 0.5) as i64).max(previous + 1);
        let rest = stamp - index as f64 * step;
        let deviation = rest - phase;
        phase += if deviation.abs() >= 0.5 * step { deviation } else { GAIN * deviation };
        *slot = index;
        previous = index;
        let n = index as f64 - centre;
        sum_n += n;
        sum_nn += n * n;
        sum_r += rest;
        sum_nr += n * rest;
        sum_rr += rest * rest;
    }
    let count = ticks.len() as f64;
    let spread = sum_nn - sum_n * sum_n / count;
    if spread.is_nan() || spread <= 0.0 {
        return None;
    }
    let covariance = sum_nr - sum_n * sum_r / count;
    let slope = covariance / spread;
    let level = (sum_r - slope * sum_n) / count - slope * centre;
    let variance = (sum_rr - sum_r * sum_r / count - slope * covariance) / count;
    Some(Line { slope, level, deviation: variance.max(0.0).sqrt() })
}
