//! What happens to output outside the trusted span: kept, marked, left blank, or cut off.

use std::ops::Range;

use ndarray::s;

use crate::error::{Error, Result};
use crate::job::repairs;
use crate::record::{Record, Repair};
use crate::regularise::RowMap;
use crate::report::ChannelReport;
use crate::settings::{Edges, Settings};
use crate::write::{Cells, Extra};

/// The record cut to the span that every channel trusts, with the rows and repairs it keeps; unchanged unless trimming is asked for.
///
/// # Errors
/// `Unsupported` when no sample is trusted by all channels.
pub fn trimmed(
    record: Record,
    rows: RowMap,
    repairs: Vec<Vec<Repair>>,
    channels: &[ChannelReport],
    settings: &Settings,
) -> Result<(Record, RowMap, Vec<Vec<Repair>>)> {
    if settings.edges != Edges::Trim {
        return Ok((record, rows, repairs));
    }
    let spans: Vec<Range<usize>> = channels.iter().map(span_of).collect();
    let first = spans.iter().map(|span| span.start).max().unwrap_or(0);
    let end = spans.iter().map(|span| span.end).min().unwrap_or(0).min(record.len());
    if first >= end {
        return Err(Error::unsupported("no sample is trusted in every channel")
            .remedy("raise --tolerance, choose channels apart, or keep the edges"));
    }
    let (axis, names, units, samples, findings) = record.into_parts();
    let kept = samples.slice(s![.., first..end]).to_owned();
    let record = Record::new(axis.cut(first, end - first), names, units, kept)?.with_findings(findings);
    Ok((record, rows.cut(first, end - first), repairs::cut(&repairs, first, end - first)))
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
        let judged = !channel.candidates.is_empty();
        Mark { name, flags: (0..len).map(|n| judged.then(|| span.contains(&n))).collect() }
    };
    channels.iter().map(mark).collect()
}

/// The spans whose cells are written, where blanks are asked for.
pub fn shown(channels: &[ChannelReport], settings: &Settings) -> Option<Vec<Range<usize>>> {
    (settings.edges == Edges::Blank).then(|| channels.iter().map(span_of).collect())
}

/// Samples that are trusted: all of them where nothing was judged, since nothing then speaks against them.
fn span_of(channel: &ChannelReport) -> Range<usize> {
    match (&channel.trusted, channel.candidates.is_empty()) {
        (Some(span), _) => span.first..span.last + 1,
        (None, true) => 0..usize::MAX,
        (None, false) => 0..0,
    }
}
