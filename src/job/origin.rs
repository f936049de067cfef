//! The table that a result is written back into, and the rows that its samples came from.

use crate::error::Result;
use crate::record::{Format, Layout, RawRecord, Record};
use crate::regularise::RowMap;
use crate::write::{Origin, Rows};

/// The row map in the writer's terms.
pub enum SourceRows {
    /// Sample n from row `first` + n.
    From(u64),
    /// One row a sample; `None` where it was filled in.
    Each(Vec<Option<u64>>),
}

impl SourceRows {
    /// `None` where no sample stands on a row of the file.
    pub fn of(rows: &RowMap) -> Option<SourceRows> {
        match rows {
            RowMap::Even { first, every: 1, .. } => Some(SourceRows::From(*first as u64)),
            RowMap::Regridded { .. } => None,
            other => {
                let each = (0..other.len()).map(|n| other.row(n).map(|row| row as u64)).collect();
                Some(SourceRows::Each(each))
            }
        }
    }
}

/// The table to write back into, where input and output are both tables.
pub fn origin_of<'a>(
    outline: &RawRecord,
    record: &Record,
    format: Format,
    rows: Option<&'a SourceRows>,
) -> Result<Option<Origin<'a>>> {
    let (Layout::Table(_), Format::Csv, Some(rows)) = (&outline.layout, format, rows) else { return Ok(None) };
    let channels: Vec<Option<usize>> =
        record.channels().map(|channel| outline.channels.iter().position(|raw| raw.name == channel.name)).collect();
    let rows = match rows {
        SourceRows::From(first) => Rows::From(*first),
        SourceRows::Each(list) => Rows::Each(list),
    };
    Ok(Some(Origin::new(outline, &channels, rows)?))
}
