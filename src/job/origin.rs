//! The table that a result is written back into, and the rows that its samples came from.

use crate::error::Result;
use crate::read::StampText;
use crate::record::{ColumnRole, Format, Layout, RawRecord, Record};
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
    stamps: Option<&'a Stamp>,
) -> Result<Option<Origin<'a>>> {
    let (Layout::Table(_), Format::Csv, Some(rows)) = (&outline.layout, format, rows) else { return Ok(None) };
    let channels: Vec<Option<usize>> =
        record.channels().map(|channel| outline.channels.iter().position(|raw| raw.name == channel.name)).collect();
    let rows = match rows {
        SourceRows::From(first) => Rows::From(*first),
        SourceRows::Each(list) => Rows::Each(list),
    };
    let origin = Origin::new(outline, &channels, rows)?;
    Ok(Some(match stamps {
        Some(stamps) => origin.with_stamps(stamps),
        None => origin,
    }))
}

/// The text of a stamp or its date, by sample and column.
pub type Stamp = dyn Fn(usize, ColumnRole) -> String + Sync;

/// How stamps of samples that were filled in are printed: as the file prints its own. `None` where none was filled in.
pub fn stamps_of(outline: &RawRecord, record: &Record, format: Format, rows: &RowMap) -> Result<Option<Box<Stamp>>> {
    let filled = matches!(rows, RowMap::Listed(list) if list.contains(&None));
    let (Layout::Table(layout), Format::Csv, Some(stamps), true) = (&outline.layout, format, &outline.stamps, filled)
    else {
        return Ok(None);
    };
    let Some(text) = StampText::of(&outline.source, layout)? else { return Ok(None) };
    // Civil stamps count from the first row of the file, others are the file's own numbers.
    let first = if stamps.civil.is_some() { 0.0 } else { stamps.first };
    let (axis, tick) = (record.axis().clone(), stamps.tick);
    let seconds = stamps.unit.meaning().map_or(1.0, |meaning| meaning.scale);
    Ok(Some(Box::new(move |sample, role| {
        let halves = text.halves_after(axis.stamp(sample) - first, seconds, tick);
        let (date, stamp) = halves.unwrap_or_default();
        if role == ColumnRole::Dates { date } else { stamp }
    })))
}
