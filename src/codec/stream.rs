//! One channel as coded blocks.

use rayon::prelude::*;

use super::block::{Coded, MOST_SAMPLES, Mode};
use super::cast::Cast;
use super::container::Gaps;
use super::goal::{Effort, Limit};
use super::search;
use crate::basis::Planner;
use crate::error::Result;

/// Rows of a block where a record takes more than one.
const PART: usize = 65_536;

/// A coded block and what is known of it.
#[derive(Debug, Clone)]
pub struct Made {
    /// First row.
    pub first: u64,
    /// Rows.
    pub rows: usize,
    /// Runs without a value.
    pub gaps: Gaps,
    /// The block; `None` where no row has a value.
    pub coded: Option<Coded>,
    /// The smallest block of another mode, and its bytes.
    pub runner_up: Option<(Mode, usize)>,
    /// The rows as a reader gets them, NaN where there is no value.
    pub restored: Vec<f64>,
}

/// Codes the rows of a channel, NaN where there is no value: as one block up to 2^20 rows, otherwise in blocks of 65,536.
/// A bound in the mean holds in every block.
///
/// # Errors
/// Those of the coding: see [`crate::codec`].
pub fn encode(rows: &[f64], cast: Cast, limit: Limit, effort: Effort, planner: &Planner) -> Result<Vec<Made>> {
    let part = if rows.len() <= MOST_SAMPLES { rows.len().max(1) } else { PART };
    let blocks: Vec<(usize, &[f64])> = rows.chunks(part).enumerate().map(|(n, rows)| (n * part, rows)).collect();
    let total = rows.len();
    blocks
        .into_par_iter()
        .map(|(first, block)| {
            let limit = match limit {
                // A corner keeps its share of the coefficients in every block.
                Limit::Keep(keep) => {
                    let share = (u128::from(keep) * block.len() as u128).div_ceil(total as u128);
                    Limit::Keep((share as u64).max(1))
                }
                other => other,
            };
            one(first, block, cast, limit, effort, planner)
        })
        .collect()
}

fn one(first: usize, rows: &[f64], cast: Cast, limit: Limit, effort: Effort, planner: &Planner) -> Result<Made> {
    let values: Vec<f64> = rows.iter().copied().filter(|v| !v.is_nan()).collect();
    let mut gaps = Gaps::new();
    let (mut before, mut missing) = (0, 0);
    for v in rows {
        match (v.is_nan(), missing) {
            (true, _) => missing += 1,
            (false, 0) => before += 1,
            (false, _) => {
                gaps.push((before, missing));
                (before, missing) = (1, 0);
            }
        }
    }
    if missing > 0 {
        gaps.push((before, missing));
    }
    let mut made =
        Made { first: first as u64, rows: rows.len(), gaps, coded: None, runner_up: None, restored: rows.to_vec() };
    if values.is_empty() {
        return Ok(made);
    }
    let limit = match limit {
        Limit::Keep(keep) => Limit::Keep(keep.min(values.len() as u64)),
        other => other,
    };
    let found = search::encode(&values, cast, limit, effort, planner)?;
    let mut restored = found.restored.into_iter();
    for row in made.restored.iter_mut().filter(|row| !row.is_nan()) {
        if let Some(value) = restored.next() {
            *row = value;
        }
    }
    made.coded = Some(found.coded);
    made.runner_up = found.runner_up;
    Ok(made)
}
