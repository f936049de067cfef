//! What a page draws of one archived channel: the record, what comes back from the archive, and the difference.

use crate::codec::Limit;
use crate::report::page::{Quantity, thinned_with_gaps};

/// Rows drawn on each side of the largest error.
const BESIDE: usize = 12;
/// Points kept of a line over the whole record: a page of several channels thins further.
const KEPT: usize = 3000;

/// One channel as recorded and as restored.
#[derive(Debug, Clone)]
pub struct Restoration {
    /// The axis across.
    pub across: Quantity,
    /// What it had to meet.
    pub limit: Limit,
    /// As recorded, broken where rows lack a value.
    pub before: Vec<[f64; 2]>,
    /// As restored.
    pub after: Vec<[f64; 2]>,
    /// Restored less recorded.
    pub error: Vec<[f64; 2]>,
    /// The rows around the largest error; `None` where nothing is off.
    pub worst: Option<Close>,
}

/// A few rows, every one of them.
#[derive(Debug, Clone)]
pub struct Close {
    /// As recorded.
    pub before: Vec<[f64; 2]>,
    /// As restored.
    pub after: Vec<[f64; 2]>,
}

impl Restoration {
    /// Of rows as read and as restored, with the row of the largest error and the place of each row; thinned for a page
    /// of so many channels.
    pub fn of(
        across: Quantity,
        place: &dyn Fn(usize) -> f64,
        limit: Limit,
        [before, after]: [&[f64]; 2],
        worst: Option<usize>,
        channels: usize,
    ) -> Restoration {
        let count = KEPT / channels.max(1);
        let error: Vec<f64> = before.iter().zip(after).map(|(before, after)| after - before).collect();
        let close = |row: usize| {
            let range = row.saturating_sub(BESIDE)..(row + BESIDE + 1).min(before.len()).min(after.len());
            let points = |values: &[f64]| range.clone().map(|n| [place(n), values[n]]).collect();
            Close { before: points(before), after: points(after) }
        };
        Restoration {
            across,
            limit,
            before: thinned_with_gaps(before, place, count),
            after: thinned_with_gaps(after, place, count),
            error: thinned_with_gaps(&error, place, count),
            worst: worst.map(close),
        }
    }
}
