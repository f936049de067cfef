//! Rows and channels on their way to a record, with the places in the file that messages name.

use crate::audit;
use crate::audit::fault::row_place;
use crate::audit::sparse::Sparse;
use crate::audit::stamps::StampReading;
use crate::error::{Error, Finding, Result};
use crate::place::Place;
use crate::record::{ColumnRole, Layout, RawChannel, RawRecord};

use super::{Gaps, Pattern, RowMap};

/// A raw record, and which rows of the file it holds.
pub struct Table {
    /// Channels and stamps; row numbers inside count the rows that are left.
    pub raw: RawRecord,
    /// Their rows in the file.
    pub rows: RowMap,
    /// Their columns in the file, from 1, where it is a table.
    pub columns: Vec<Option<u64>>,
    /// What happens to missing rows and values.
    pub gaps: Gaps,
}

/// The channels of a record grouped by the rows that hold their values: full rows first, then lower rates in file order.
pub fn by_rate(raw: RawRecord) -> Vec<Table> {
    let count = raw.channels.iter().map(|channel| channel.values.len()).max().unwrap_or(0);
    let mut patterns: Vec<Pattern> = Vec::new();
    let own: Vec<Pattern> = raw.channels.iter().map(Sparse::of).collect();
    for pattern in own.iter().filter(|p| p.is_none()).chain(own.iter().filter(|p| p.is_some())) {
        if !patterns.contains(pattern) {
            patterns.push(*pattern);
        }
    }
    let columns: Vec<Option<u64>> = (0..raw.channels.len()).map(|index| column_of(&raw.layout, index)).collect();
    let RawRecord { source, channels, stamps, stated_rate, metadata, findings, layout } = raw;
    let shell = RawRecord { source, channels: Vec::new(), stamps, stated_rate, metadata, findings, layout };
    let rows = RowMap::Even { first: 0, every: 1, count };
    // Stamps are as large as a channel: only lower rates get copies of them.
    let mut groups: Vec<Table> = patterns
        .iter()
        .skip(1)
        .map(|_| Table { raw: shell.clone(), rows: rows.clone(), columns: Vec::new(), gaps: Gaps::default() })
        .collect();
    if !patterns.is_empty() {
        groups.insert(0, Table { raw: shell, rows, columns: Vec::new(), gaps: Gaps::default() });
    }
    for ((channel, pattern), column) in channels.into_iter().zip(own).zip(columns) {
        if let Some(group) = patterns.iter().position(|p| *p == pattern).and_then(|at| groups.get_mut(at)) {
            group.raw.channels.push(channel);
            group.columns.push(column);
        }
    }
    for (group, pattern) in groups.iter_mut().zip(&patterns) {
        if let Some(sparse) = pattern {
            group.thin(*sparse);
        }
    }
    groups
}

impl Table {
    /// Number of rows.
    pub fn len(&self) -> usize {
        self.raw.channels.first().map_or(0, |channel| channel.values.len())
    }

    /// Refuses tables without a sample, and columns of different lengths.
    pub fn check(&self) -> Result<()> {
        let rows = self.len();
        if rows == 0 {
            return Err(Error::unsupported("the record holds no samples").at(Place::file(&self.raw.source.path)));
        }
        let stamps = self.raw.stamps.as_ref().map_or(rows, |stamps| stamps.ticks.len());
        if stamps != rows || self.raw.channels.iter().any(|channel| channel.values.len() != rows) {
            return Err(Error::malformed("the columns differ in length").at(Place::file(&self.raw.source.path)));
        }
        Ok(())
    }

    /// What the stamps say.
    pub fn read_stamps(&self) -> Option<StampReading> {
        audit::read_stamps(&self.raw)
    }

    /// Where a row stands in the file.
    pub fn place(&self, row: usize) -> Place {
        row_place(&self.raw, self.rows.row(row).unwrap_or(row))
    }

    /// Where a value stands in the file.
    pub fn value_place(&self, channel: usize, row: usize) -> Place {
        let name = self.raw.channels.get(channel).map(|channel| channel.name.clone());
        Place { column: self.columns.get(channel).copied().flatten(), channel: name, ..self.place(row) }
    }

    /// Keeps rows `first..last` only.
    pub fn cut(&mut self, first: usize, last: usize) {
        for channel in &mut self.raw.channels {
            channel.values.truncate(last);
            channel.values.drain(..first);
            channel.missing.retain(|row| (first..last).contains(row));
            channel.missing.iter_mut().for_each(|row| *row -= first);
        }
        if let Some(stamps) = &mut self.raw.stamps {
            stamps.ticks.truncate(last);
            stamps.ticks.drain(..first);
        }
        self.rows = self.rows.cut(first, last - first);
    }

    /// Leaves out repeated rows.
    ///
    /// # Errors
    /// `Malformed` at the first of them that holds other values than the row before.
    pub fn drop_repeats(&mut self, repeated: &[usize]) -> Result<Finding> {
        let same = |channel: &RawChannel, row: usize| {
            let (before, now) = (channel.values[row - 1], channel.values[row]);
            before == now || (before.is_nan() && now.is_nan())
        };
        for &row in repeated {
            if let Some(index) = self.raw.channels.iter().position(|channel| !same(channel, row)) {
                let what = "repeats the stamp of the row before with another value";
                let remedy = "--time-column none with --rate takes the rows as they stand";
                return Err(Error::malformed(what).at(self.value_place(index, row)).remedy(remedy));
            }
        }
        let place = self.place(repeated.first().copied().unwrap_or(0));
        let keeps = |row: usize| repeated.binary_search(&row).is_err();
        let kept: Vec<usize> = (0..self.len()).filter(|&row| keeps(row)).collect();
        for channel in &mut self.raw.channels {
            channel.values = kept.iter().map(|&row| channel.values[row]).collect();
            channel.missing = (0..kept.len()).filter(|&row| channel.values[row].is_nan()).collect();
        }
        if let Some(stamps) = &mut self.raw.stamps {
            stamps.ticks = kept.iter().map(|&row| stamps.ticks[row]).collect();
        }
        self.rows = RowMap::Listed(kept.iter().map(|&row| self.rows.row(row)).collect());
        let rows = if repeated.len() == 1 {
            "one repeated row".to_owned()
        } else {
            format!("{} repeated rows", repeated.len())
        };
        Ok(Finding::new("repeats_dropped", format!("{rows} left out")).at(place))
    }

    /// Refuses missing values.
    ///
    /// # Errors
    /// `Malformed` at the first of them, with their number.
    pub fn refuse_missing(&self) -> Result<()> {
        let gone = |channel: &RawChannel| channel.values.iter().position(|v| !v.is_finite());
        let firsts = self.raw.channels.iter().enumerate().filter_map(|(index, channel)| Some((gone(channel)?, index)));
        let Some((row, index)) = firsts.min() else { return Ok(()) };
        let count: usize =
            self.raw.channels.iter().map(|channel| channel.values.iter().filter(|v| !v.is_finite()).count()).sum();
        let spelling = self.raw.channels[index].missing_spelling.as_deref().unwrap_or_default();
        let which = if count == 1 { "the only one".to_owned() } else { format!("the first of {count}") };
        let what = format!("no value ({spelling:?}), {which}");
        Err(Error::malformed(what).at(self.value_place(index, row)).remedy("--gaps fill interpolates missing values"))
    }

    fn thin(&mut self, sparse: Sparse) {
        let Sparse { first, every, count } = sparse;
        for channel in &mut self.raw.channels {
            channel.values = channel.values.iter().skip(first).step_by(every).copied().collect();
            channel.missing = Vec::new();
        }
        if let Some(stamps) = &mut self.raw.stamps {
            stamps.ticks = stamps.ticks.iter().skip(first).step_by(every).copied().collect();
        }
        // A rate of the header is that of the rows.
        if let Some(rate) = &mut self.raw.stated_rate {
            rate.rate_base /= every as f64;
        }
        self.rows = RowMap::Even { first, every, count };
    }
}

fn column_of(layout: &Layout, channel: usize) -> Option<u64> {
    let Layout::Table(table) = layout else { return None };
    let at = table.columns.iter().position(|&role| role == ColumnRole::Channel(channel))?;
    Some(at as u64 + 1)
}
