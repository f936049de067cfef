//! A record made uniform and complete, with what was done to make it so.

use crate::record::{Record, Repair};

use super::RowMap;

/// A uniform record, where its samples came from, and what was mended in it.
#[derive(Debug, Clone)]
pub struct Regular {
    /// The record.
    pub record: Record,
    /// Rows of the file that its samples came from.
    pub rows: RowMap,
    /// Samples of each channel that are not as they were read, ascending.
    pub repairs: Vec<Vec<Repair>>,
    /// Row of the file with which a part of it starts; `None` for the whole.
    pub first_row: Option<usize>,
    /// Which part of the file it is, where gaps split that.
    pub segment: Option<Segment>,
}

/// A part of a file between gaps.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub struct Segment {
    /// Number of the part, from 1.
    pub number: usize,
    /// Number of parts.
    pub count: usize,
}

impl Regular {
    /// A record in which nothing was mended.
    pub(super) fn untouched(record: Record, rows: RowMap) -> Regular {
        let repairs = vec![Vec::new(); record.channel_count()];
        Regular { record, rows, repairs, first_row: None, segment: None }
    }
}
