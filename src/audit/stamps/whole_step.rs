//! Stamps that advance by one and the same whole step nearly everywhere: there even coarse stamps show a missing row.

use super::candidate;

/// A step that nearly all rows take, and the rows that do not.
pub struct WholeStep {
    /// The step in ticks.
    pub step: i64,
    /// Rows whose stamp equals the one before.
    pub repeated: Vec<usize>,
    /// First row after a gap, and the number of rows missing before it.
    pub gaps: Vec<(usize, u64)>,
}

/// Share of the rows that must take the step: a rate beside it would show a rounded step at least once in ten rows
/// unless it is within a tenth of the print resolution.
const SHARE: f64 = 0.9;

/// The whole step, if every distance of neighbouring stamps is a multiple of it and nearly all are the step itself.
pub fn find(ticks: &[i64]) -> Option<WholeStep> {
    let step = candidate::middle_step(ticks)?;
    let mut found = WholeStep { step, repeated: Vec::new(), gaps: Vec::new() };
    if step <= 0 {
        return None;
    }
    for row in 1..ticks.len() {
        let distance = ticks[row] - ticks[row - 1];
        if distance == step {
            continue;
        }
        match distance / step {
            _ if distance % step != 0 => return None,
            0 => found.repeated.push(row),
            steps => found.gaps.push((row, (steps - 1) as u64)),
        }
    }
    let odd = found.repeated.len() + found.gaps.len();
    (odd as f64 <= (1.0 - SHARE) * (ticks.len() - 1) as f64).then_some(found)
}
