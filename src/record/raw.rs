//! What a reader found, before any check of spacing or finiteness: the audit sees this, nothing below does.

use crate::error::Finding;
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
    /// The first stamp, in `unit`, as exactly as f64 allows.
    pub first: f64,
    /// Print resolution in `unit`: the coarsest step the text can show.
    pub resolution: f64,
    /// Civil time of the first stamp where the column holds dates (RFC 3339).
    pub civil: Option<String>,
    /// Line of each row where it is not `first_line + row`.
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
