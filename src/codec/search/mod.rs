//! The smallest coded block that keeps a limit: every mode is tried, and what is taken has been decoded and checked.

mod cosines;
mod root;
mod steps;

use crate::basis::Planner;
use crate::codec::block::{self, Coded, Mode};
use crate::codec::cast::Cast;
use crate::codec::goal::{Effort, Limit};
use crate::error::{Error, Result};

/// A coded block and the next best.
#[derive(Debug, Clone)]
pub struct Found {
    /// What is written.
    pub coded: Coded,
    /// The smallest block of another mode, and its bytes.
    pub runner_up: Option<(Mode, usize)>,
    /// The samples as a decoder gets them, after the cast.
    pub restored: Vec<f64>,
}

/// What every search gets.
#[derive(Clone, Copy)]
struct Task<'a> {
    samples: &'a [f64],
    cast: Cast,
    effort: Effort,
    planner: &'a Planner,
}

/// Relative room that is left below a bound, for the rounding of another machine's cosine transform.
const MARGIN: f64 = 4e-9;

/// Codes finite samples, at least one.
///
/// # Errors
/// `Unsupported` where nothing keeps the limit, which lossless coding always does.
pub fn encode(samples: &[f64], cast: Cast, limit: Limit, effort: Effort, planner: &Planner) -> Result<Found> {
    let task = Task { samples, cast, effort, planner };
    let largest = samples.iter().fold(0.0, |most: f64, v| most.max(v.abs()));
    let mut tight = 1.0;
    // A bound in the mean is met after the cast only by trying: each round asks for a little more.
    for round in 0..6 {
        let mut candidates = match limit {
            Limit::Lossless | Limit::Max(0.0) | Limit::Rms(0.0) => Vec::new(),
            Limit::Keep(keep) => vec![Coded::truncated(samples, keep as usize, planner)?],
            Limit::Max(bound) => {
                let wide = cast.widened(bound, largest) * (1.0 - MARGIN) * tight;
                let mut all = steps::within(task, bound, wide);
                // Where the cast grid is coarser than the bound only lossless coding keeps it.
                if effort > Effort::Quick && wide > 0.0 && cast.step().is_none_or(|step| step <= bound) {
                    let least = all.iter().map(|coded| coded.payload.len()).min().unwrap_or(usize::MAX);
                    all.extend(cosines::within(task, wide, least)?);
                }
                all
            }
            Limit::Rms(bound) => {
                let goal = bound * (1.0 - MARGIN) * tight;
                let mut all = cosines::in_the_mean(task, goal)?;
                let least = all.iter().map(|coded| coded.payload.len()).min().unwrap_or(usize::MAX);
                all.extend(steps::in_the_mean(task, goal, least));
                all
            }
        };
        if !matches!(limit, Limit::Keep(_)) && (round > 0 || cast != Cast::Double || candidates.is_empty()) {
            candidates.push(steps::lossless(task));
        }
        candidates.sort_by_key(|coded| coded.payload.len());
        for (at, coded) in candidates.iter().enumerate() {
            let restored = block::decode(coded.mode, &coded.payload, samples.len(), cast, planner)?;
            if keeps(samples, &restored, limit, coded.mode) {
                let runner_up = candidates.iter().enumerate().find(|(n, other)| *n != at && other.mode != coded.mode);
                let runner_up = runner_up.map(|(_, other)| (other.mode, other.payload.len()));
                return Ok(Found { coded: coded.clone(), runner_up, restored });
            }
        }
        tight *= 1.0 - 2e-3 * f64::from(1 << round);
    }
    Err(Error::unsupported("no way of coding keeps the bound").remedy("give --lossless"))
}

/// Whether restored samples keep the limit; bit for bit where it is lossless.
fn keeps(samples: &[f64], restored: &[f64], limit: Limit, mode: Mode) -> bool {
    let room = if mode == Mode::Predicted { 1.0 } else { 1.0 - 1e-9 };
    match limit {
        Limit::Lossless | Limit::Max(0.0) | Limit::Rms(0.0) => {
            samples.iter().zip(restored).all(|(a, b)| a.to_bits() == b.to_bits())
        }
        Limit::Max(bound) => samples.iter().zip(restored).all(|(a, b)| (a - b).abs() <= bound * room || a == b),
        Limit::Rms(bound) => root::mean_square(samples, restored).sqrt() <= bound * room,
        Limit::Keep(_) => true,
    }
}
