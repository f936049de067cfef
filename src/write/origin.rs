//! Where a result came from: the table, the column of each channel, and the source row of each sample.

use crate::error::{Error, Result};
use crate::record::{ColumnRole, Layout, RawRecord, Source, TableLayout};
use crate::unit::Unit;

/// The table that a result is written back into.
#[derive(Clone)]
pub struct Origin<'a> {
    pub(super) layout: TableLayout,
    /// Table column of each channel of the result; `None` for a channel that is new.
    pub(super) columns: Vec<Option<usize>>,
    /// Unit of each channel as the table has it.
    pub(super) units: Vec<Unit>,
    pub(super) rows: Rows<'a>,
    pub(super) stamps: Option<&'a (dyn Fn(usize, ColumnRole) -> String + Sync)>,
    pub(super) source: Source,
}

/// Which row of the raw record each sample of the result came from, counted from 0.
#[derive(Debug, Clone, Copy)]
pub enum Rows<'a> {
    /// Sample n from row `first` + n.
    From(u64),
    /// One row a sample, ascending; `None` for a sample that was inserted: its other fields stay blank.
    Each(&'a [Option<u64>]),
}

impl Rows<'_> {
    /// The source row of sample `n`.
    fn row(&self, n: usize) -> Option<u64> {
        match self {
            Rows::From(first) => Some(first.saturating_add(n as u64)),
            Rows::Each(rows) => rows.get(n).copied().flatten(),
        }
    }
}

impl Origin<'_> {
    /// The line of the file (from 1) that sample `n` came from; `None` for a sample that was inserted.
    pub(super) fn line(&self, n: usize) -> Option<u64> {
        self.rows.row(n).and_then(|row| self.layout.lines.line(row))
    }

    /// The first of `len` samples whose row the table does not have.
    pub(super) fn without_line(&self, len: usize) -> Option<usize> {
        let rows = self.layout.lines.rows();
        let last = (0..len).rev().find(|&n| self.rows.row(n).is_some())?;
        // Rows ascend: where the last one is there, all are.
        if self.rows.row(last).is_none_or(|row| row < rows) {
            return None;
        }
        (0..len).find(|&n| self.rows.row(n).is_some_and(|row| row >= rows))
    }

    /// The first sample from `n` on, and before `len`, that comes from line `limit` or a later one.
    pub(super) fn first_beyond(&self, n: usize, limit: u64, len: usize) -> usize {
        let beyond = |n: usize| self.line(n).is_some_and(|line| line >= limit);
        let Rows::From(_) = self.rows else { return (n..len).find(|&n| beyond(n)).unwrap_or(len) };
        let (mut low, mut high) = (n, len);
        while low < high {
            let middle = low + (high - low) / 2;
            if beyond(middle) { high = middle } else { low = middle + 1 }
        }
        low
    }
}

impl<'a> Origin<'a> {
    /// The table that `raw` was read from; `channels` gives the raw channel of each channel of the result, `None` for one
    /// that is new (it becomes a column at the right). Of `raw` only the layout is kept.
    ///
    /// # Errors
    /// `Usage` when `raw` is no table, has no such channel, or the rows do not ascend.
    pub fn new(raw: &RawRecord, channels: &[Option<usize>], rows: Rows<'a>) -> Result<Origin<'a>> {
        let Layout::Table(layout) = &raw.layout else {
            return Err(Error::usage("the source is no table"));
        };
        let mut columns = Vec::with_capacity(channels.len());
        let mut units = Vec::with_capacity(channels.len());
        for &channel in channels {
            let Some(index) = channel else {
                columns.push(None);
                units.push(Unit::unknown());
                continue;
            };
            let column = layout.columns.iter().position(|role| *role == ColumnRole::Channel(index));
            let (Some(column), Some(raw)) = (column, raw.channels.get(index)) else {
                return Err(Error::usage(format!("the source has no channel number {index}")));
            };
            columns.push(Some(column));
            units.push(raw.unit.clone());
        }
        if let Rows::Each(rows) = rows
            && !rows.iter().flatten().is_sorted_by(|a, b| a < b)
        {
            return Err(Error::usage("the source rows of a result must ascend"));
        }
        Ok(Origin { layout: layout.clone(), columns, units, rows, stamps: None, source: raw.source.clone() })
    }

    /// Gives the text in the columns of stamps and dates for samples that were inserted, by sample and column; without it these
    /// fields stay blank.
    #[must_use]
    pub fn with_stamps(mut self, stamps: &'a (dyn Fn(usize, ColumnRole) -> String + Sync)) -> Origin<'a> {
        self.stamps = Some(stamps);
        self
    }
}
