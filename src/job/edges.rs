//! What happens to output outside the trusted span: kept, marked, left blank, or cut off.

use std::ops::Range;

use ndarray::s;

use crate::error::{Error, Result};
use crate::job::integral::Column;
use crate::record::Record;
use crate::regularise::RowMap;
use crate::report::ChannelReport;
use crate::settings::{Edges, Settings};
use crate::write::{Cells, Extra};

/// The samples that are written: all of them unless trimming is asked for, then those that every channel trusts.
///
/// # Errors
/// `Unsupported` when no sample is trusted by all channels.
pub fn kept(channels: &[ChannelReport], len: usize, settings: &Settings) -> Result<Range<usize>> {
    if settings.edges != Edges::Trim {
        return Ok(0..len);
    }
    let spans: Vec<Range<usize>> = channels.iter().map(span_of).collect();
    let first = spans.iter().map(|span| span.start).max().unwrap_or(0);
    let end = spans.iter().map(|span| span.end).min().unwrap_or(0).min(len);
    if first >= end {
        return Err(Error::unsupported("no sample is trusted in every channel")
            .remedy("raise --tolerance, choose channels apart, or keep the edges"));
    }
    Ok(first..end)
}

/// The record cut to `kept`, with the rows it keeps.
///
/// # Errors
/// Those of `Record::new`.
pub fn trimmed(record: Record, rows: RowMap, kept: &Range<usize>) -> Result<(Record, RowMap)> {
    if *kept == (0..record.len()) {
        return Ok((record, rows));
    }
    let (axis, names, units, samples, findings) = record.into_parts();
    let cut = samples.slice(s![.., kept.clone()]).to_owned();
    let record = Record::new(axis.cut(kept.start, kept.len()), names, units, cut)?.with_findings(findings);
    Ok((record, rows.cut(kept.start, kept.len())))
}

/// A column of numbers beside the channels.
pub struct Beside {
    name: String,
    cells: Vec<Option<f64>>,
}

impl Beside {
    /// As a column of an output.
    pub fn column(&self) -> Extra<'_> {
        Extra { name: &self.name, cells: Cells::Numbers(&self.cells) }
    }
}

/// The columns that are written, cut to `kept`.
pub fn beside(columns: &[Column], kept: &Range<usize>) -> Vec<Beside> {
    let cells = |column: &Column| column.values[kept.clone()].iter().copied().map(Some).collect();
    columns.iter().map(|column| Beside { name: column.name.clone(), cells: cells(column) }).collect()
}

/// A column that tells which samples of a channel are trusted.
pub struct Mark {
    name: String,
    flags: Vec<Option<bool>>,
}

impl Mark {
    /// As a column of an output.
    pub fn column(&self) -> Extra<'_> {
        Extra { name: &self.name, cells: Cells::Flags(&self.flags) }
    }
}

/// The `trusted` columns, where marking is asked for: one a channel. Cells stay blank where nothing was judged.
pub fn marks(channels: &[ChannelReport], len: usize, settings: &Settings) -> Vec<Mark> {
    if settings.edges != Edges::Mark {
        return Vec::new();
    }
    let mark = |channel: &ChannelReport| {
        let name = if channels.len() == 1 { "trusted".to_owned() } else { format!("{} trusted", channel.name) };
        let span = span_of(channel);
        let is_known = is_known(channel);
        Mark { name, flags: (0..len).map(|n| is_known.then(|| span.contains(&n))).collect() }
    };
    channels.iter().map(mark).collect()
}

/// The spans whose cells are written, where blanks are asked for.
pub fn shown(channels: &[ChannelReport], settings: &Settings) -> Option<Vec<Range<usize>>> {
    (settings.edges == Edges::Blank).then(|| channels.iter().map(span_of).collect())
}

/// Samples that are trusted: all of them where nothing was judged, since nothing then speaks against them.
fn span_of(channel: &ChannelReport) -> Range<usize> {
    match &channel.trusted {
        Some(span) => span.first..span.last + 1,
        None if is_known(channel) => 0..0,
        None => 0..usize::MAX,
    }
}

/// True where the edges of the extension in use were judged.
fn is_known(channel: &ChannelReport) -> bool {
    channel.verdict.as_ref().is_some_and(|verdict| verdict.adequacy.is_some())
}
