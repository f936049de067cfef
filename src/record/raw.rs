//! What a reader found, before any check of spacing or finiteness: the audit sees this, nothing below does.

use crate::error::Finding;
use crate::place::Place;
use crate::record::{Layout, Source};
use crate::unit::Unit;

/// A file as read. Channels may hold missing values; stamps may be anything.
#[derive(Debug, Clone)]
pub struct RawRecord {
    /// What was read: name, fingerprint, format.
    pub source: Source,
    /// Numeric channels in file order, without the time column.
    pub channels: Vec<RawChannel>,
    /// The time or position column, where there is one.
    pub stamps: Option<Stamps>,
    /// A sampling rate that the header or the user states.
    pub stated_rate: Option<StatedRate>,
    /// `key = value` lines of the preamble, in file order.
    pub metadata: Vec<(String, String)>,
    /// Remarks of the reader.
    pub findings: Vec<Finding>,
    /// How to write the record back in its own form.
    pub layout: Layout,
}

impl RawRecord {
    /// Everything but the numbers, which are large: source, names, units, metadata, layout, and what the stamps are.
    #[must_use]
    pub fn outline(&self) -> RawRecord {
        let channels = self.channels.iter().map(|channel| RawChannel {
            name: channel.name.clone(),
            unit: channel.unit.clone(),
            values: Vec::new(),
            missing: Vec::new(),
            missing_spelling: None,
            full_scale: channel.full_scale,
        });
        let stamps = self.stamps.as_ref().map(|stamps| Stamps {
            name: stamps.name.clone(),
            unit: stamps.unit.clone(),
            ticks: Vec::new(),
            civil: stamps.civil.clone(),
            ..*stamps
        });
        RawRecord {
            source: self.source.clone(),
            channels: channels.collect(),
            stamps,
            stated_rate: self.stated_rate.clone(),
            metadata: self.metadata.clone(),
            findings: Vec::new(),
            layout: self.layout.clone(),
        }
    }

    /// Where sample `row` (from 0) of channel `channel` stands: file, line and column of a text file, channel, sample.
    pub fn place(&self, channel: usize, row: usize) -> Place {
        let name = self.channels.get(channel).map(|channel| channel.name.clone());
        let field = match &self.layout {
            Layout::Table(table) => table.field_of(channel).map(|field| field as u64 + 1),
            Layout::Wave(_) => None,
        };
        Place { column: field, channel: name, sample: Some(row as u64), ..self.row_place(row) }
    }

    /// Where row `row` (from 0) stands: file, and line of a text file.
    pub fn row_place(&self, row: usize) -> Place {
        let line = match &self.layout {
            Layout::Table(table) => table.lines.line(row as u64),
            Layout::Wave(_) => None,
        };
        Place { line, ..Place::file(&self.source.path) }
    }
}

/// One channel as read.
#[derive(Debug, Clone)]
pub struct RawChannel {
    /// Name, unique in the record.
    pub name: String,
    /// Unit, as the header spells it.
    pub unit: Unit,
    /// Values; NaN where the file has none (listed in `missing`).
    pub values: Vec<f64>,
    /// Sample indices without a value, ascending, with the spelling found at the first of them.
    pub missing: Vec<usize>,
    /// The spelling of the first missing value, such as `NA`.
    pub missing_spelling: Option<String>,
    /// Digital full scale where the format has one (integer WAV): the largest magnitude a sample can take.
    pub full_scale: Option<f64>,
}

/// A column of stamps: integer ticks of a stated size, so that an epoch in nanoseconds loses nothing.
///
/// `ticks` has one entry a row and starts with 0. Nothing else holds: stamps may repeat, go back or leave gaps. A clock
/// that restarts at midnight has already been unwrapped, with a remark.
#[derive(Debug, Clone)]
pub struct Stamps {
    /// Name of the column.
    pub name: String,
    /// Unit of one `tick`: time or length.
    pub unit: Unit,
    /// Size of one integer tick in `unit`: a power of ten for decimal text, a binary fraction for `float_ticks`.
    pub tick: f64,
    /// Ticks since `first`.
    pub ticks: Vec<i64>,
    /// The first stamp, in `unit`, as exactly as f64 allows: seconds since 1970 for dates, since midnight for clock times.
    pub first: f64,
    /// Print resolution in `unit`: the step of the last printed digit at the largest stamp.
    pub resolution: f64,
    /// Civil time of the first stamp where the column holds dates or an epoch (RFC 3339, in UTC; without `Z` where the
    /// file tells no offset); `None` where day and month are ambiguous.
    pub civil: Option<String>,
    /// Line of the first row. Other rows: `RawRecord::row_place`, since blank lines and dropped rows make gaps.
    pub first_line: u64,
}

/// A rate that was stated rather than measured.
#[derive(Debug, Clone, PartialEq)]
pub struct StatedRate {
    /// Samples per second, or per metre for a length axis.
    pub rate_base: f64,
    /// Axis unit: `s` or a unit of length.
    pub unit: Unit,
    /// True when the user gave it on the command line: it then wins over the stamps.
    pub given: bool,
    /// What says so, for messages: `header key "rate"`, `--rate`.
    pub origin: String,
}
