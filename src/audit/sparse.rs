//! Channels recorded at a lower rate: a value on every k-th row and nothing between.

use serde::Serialize;

use crate::record::RawChannel;

/// The rows that hold values.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Serialize)]
pub struct Sparse {
    /// First row with a value.
    pub first: usize,
    /// Rows from one value to the next, at least 2.
    pub every: usize,
    /// Number of values.
    pub count: usize,
}

impl Sparse {
    /// The pattern of a channel, if its values stand on every k-th row, at least four of them, and on no other.
    pub fn of(channel: &RawChannel) -> Option<Sparse> {
        let rows = channel.values.len();
        let count = rows.checked_sub(channel.missing.len())?;
        if channel.missing.is_empty() || count < 4 {
            return None;
        }
        // `missing` ascends: the rows it leaves out are the values.
        let present = |from: usize| {
            let at = channel.missing.partition_point(|&row| row < from);
            let run = channel.missing[at..].iter().enumerate().take_while(|&(k, &row)| row == from + k).count();
            from + run
        };
        let first = present(0);
        let every = present(first + 1) - first;
        if every < 2 || first >= every || (rows - 1 - first) / every + 1 != count {
            return None;
        }
        let regular = channel.missing.iter().all(|&row| row < first || (row - first) % every != 0);
        regular.then_some(Sparse { first, every, count })
    }
}
