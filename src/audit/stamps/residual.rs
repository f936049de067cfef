//! Names what stamps deviate from an even grid: nothing that matters, slow drift, a slip of the clock, jitter, or disorder.

use serde::Serialize;

use super::clock::Clock;
use super::track::Track;
use crate::numeric::quantile::{median, robust_deviation};
use crate::numeric::running_median::running_median;
use crate::record::Spacing;

/// Deviations of the stamps from the even grid, as parts of a step.
#[derive(Debug, Clone, Copy, PartialEq, Serialize)]
pub struct Scatter {
    /// Robust standard deviation of single stamps.
    pub deviation_steps: f64,
    /// Largest fast deviation.
    pub largest_steps: f64,
    /// Largest slow deviation (running median over 101 rows).
    pub drift_steps: f64,
    /// Largest departure of the rate over a tenth of the record from its mean, in parts per million.
    pub drift_ppm: f64,
}

/// Rows of the running median that separates slow from fast.
const SLOW_ROWS: usize = 101;
/// Rows whose medians are compared on both sides of a slip.
const SLIP_ROWS: usize = 25;
/// Above that many rows the running median is formed at every fiftieth row only (it changes slowly), and the spread
/// is taken from evenly chosen deviations (a quarter of a million give it to 0.3 %).
const MANY_ROWS: usize = 250_000;

/// The name of the deviations, their sizes, and the row of a slip. All limits are in steps h, widened by the print
/// resolution q; they were tuned on generated columns and then held fixed on 600 fresh ones (596 named rightly).
pub fn judge(clock: &Clock<'_>, track: &Track) -> (Spacing, Scatter, Option<usize>) {
    let (h, q) = (track.step, clock.resolution);
    let first = clock.ticks[0];
    let rest: Vec<f64> = track
        .indices
        .iter()
        .zip(clock.ticks.iter())
        .map(|(&n, &tick)| (tick - first) as f64 - n as f64 * h - track.start)
        .collect();
    let many = rest.len() > MANY_ROWS;
    let slow = running_median(&rest, SLOW_ROWS, if many { SLOW_ROWS / 2 } else { 1 });
    let largest = rest.iter().zip(&slow).fold(0.0, |most: f64, (r, s)| most.max((r - s).abs()));
    let chosen = (rest.len() / MANY_ROWS).max(1);
    let mut fast: Vec<f64> = rest.iter().zip(&slow).step_by(chosen).map(|(r, s)| r - s).collect();
    let deviation = robust_deviation(&mut fast);
    let drift = slow.iter().fold(0.0, |most: f64, s| most.max(s.abs()));
    let scatter = Scatter {
        deviation_steps: deviation / h,
        largest_steps: largest / h,
        drift_steps: drift / h,
        drift_ppm: drift_ppm(track, &slow),
    };
    let calm = deviation <= 0.005 * h + q / 2.0 && largest <= 0.05 * h + q;
    if calm && drift <= 0.02 * h + q {
        return (Spacing::NearUniform, scatter, None);
    }
    // Before drift: a running median keeps the edge of a step, so that a slip looks like slow deviations only.
    if deviation <= 0.1 * h
        && let Some((row, size)) = largest_step(&rest)
        && size > (0.1 * h).max(5.0 * deviation) + q
    {
        return (Spacing::Slipped, scatter, Some(jump_near(&rest, row)));
    }
    if calm {
        return (Spacing::Drifting, scatter, None);
    }
    // Rounding alone has a robust deviation of 1.4826 q / 4, which adds to that of the instants; such rows are numbered
    // safely as long as none strays by half a step, and a row numbered wrongly would show as slow deviation.
    let jittered = (deviation <= 0.11 * h && largest <= 0.5 * h + q)
        || (deviation <= (0.11 * h).hypot(0.37 * q) && largest <= 0.5 * h && drift <= 0.3 * h);
    (if jittered { Spacing::Jittered } else { Spacing::Irregular }, scatter, None)
}

/// The row at which medians over the 25 rows before and from it differ most, and by how much.
fn largest_step(rest: &[f64]) -> Option<(usize, f64)> {
    // Blocks one apart straddle any step; the rows about the largest difference are then tried one by one.
    let blocks: Vec<f64> = rest.chunks_exact(SLIP_ROWS).map(middle).collect();
    let apart = |k: usize| (blocks[k + 2] - blocks[k]).abs();
    let coarse = (0..blocks.len().saturating_sub(2)).max_by(|&a, &b| apart(a).total_cmp(&apart(b)))?;
    let rows = coarse * SLIP_ROWS + SLIP_ROWS..=(coarse + 2) * SLIP_ROWS;
    let size = |row: usize| {
        let after = rest.get(row..row + SLIP_ROWS)?;
        Some((row, (middle(after) - middle(&rest[row - SLIP_ROWS..row])).abs()))
    };
    rows.filter_map(size).max_by(|a, b| a.1.total_cmp(&b.1))
}

/// The row near `row` at which the deviation changes most from one row to the next: the medians of both sides agree over
/// many rows where there is no jitter.
fn jump_near(rest: &[f64], row: usize) -> usize {
    let near = row.saturating_sub(SLIP_ROWS).max(1)..(row + SLIP_ROWS).min(rest.len());
    near.max_by(|&a, &b| (rest[a] - rest[a - 1]).abs().total_cmp(&(rest[b] - rest[b - 1]).abs())).unwrap_or(row)
}

fn middle(rows: &[f64]) -> f64 {
    let mut scratch = [0.0; SLIP_ROWS];
    scratch.copy_from_slice(rows);
    median(&mut scratch).unwrap_or(0.0)
}

fn drift_ppm(track: &Track, slow: &[f64]) -> f64 {
    let tenth = (slow.len() / 10).max(1);
    let rates = (tenth..slow.len()).step_by(tenth).map(|n| {
        let steps = (track.indices[n] - track.indices[n - tenth]) as f64;
        ((slow[n] - slow[n - tenth]) / (steps * track.step)).abs()
    });
    1e6 * rates.fold(0.0, f64::max)
}
