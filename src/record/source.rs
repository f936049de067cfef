//! Where a record came from and how its file is laid out, so that results go back in the same form.

use std::path::PathBuf;
use std::sync::Arc;

use serde::{Deserialize, Serialize};

/// A file format that is read and written.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Serialize, Deserialize)]
#[serde(rename_all = "snake_case")]
pub enum Format {
    /// Delimited text.
    Csv,
    /// RIFF WAVE.
    Wav,
}

/// What was read.
#[derive(Debug, Clone)]
pub struct Source {
    /// The path as the user gave it, `-` for standard input.
    pub path: String,
    /// SHA-256 of the bytes as stored, lower-case hex.
    pub sha256: String,
    /// Bytes as stored.
    pub bytes: u64,
    /// Format.
    pub format: Format,
}

/// How the file was laid out.
#[derive(Debug, Clone)]
pub enum Layout {
    /// Delimited text.
    Table(TableLayout),
    /// RIFF WAVE.
    Wave(WaveLayout),
}

/// The layout of a delimited text file: enough to write it back with untouched fields kept byte for byte.
#[derive(Debug, Clone)]
pub struct TableLayout {
    /// The text again, to copy untouched fields from.
    pub text: TextSource,
    /// Field separator; blank stands for runs of blanks.
    pub delimiter: u8,
    /// Decimal mark, `.` or `,`.
    pub decimal: u8,
    /// Text that precedes the data block, as decoded UTF-8 (preamble, header, units row), complete lines with their ends.
    pub head: String,
    /// Line of `head` (from 0) that holds the column names, where there is one.
    pub header_line: Option<usize>,
    /// Line of `head` (from 0) that holds the units, where they stand on a row of their own.
    pub units_line: Option<usize>,
    /// Byte offset in the decoded text at which the data block starts.
    pub data_start: u64,
    /// Line number (from 1) of the first data row.
    pub data_line: u64,
    /// Role of each column of the data block.
    pub columns: Vec<ColumnRole>,
    /// Line end of the data block: `\n`, `\r\n` or `\r`.
    pub newline: &'static str,
}

/// What a column of a table is.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum ColumnRole {
    /// The time or position column.
    Stamps,
    /// Channel of that index in the raw record.
    Channel(usize),
    /// Copied through: text, or a channel that was not asked for.
    Untouched,
}

/// Where the text of a table can be read again.
#[derive(Debug, Clone)]
pub enum TextSource {
    /// From the file; its fingerprint must still agree.
    File(PathBuf),
    /// From memory, as decoded UTF-8 (standard input, small files).
    Held(Arc<[u8]>),
}

/// The layout of a WAV file.
#[derive(Debug, Clone)]
pub struct WaveLayout {
    /// Sampling rate in Hz, as the header's integer.
    pub rate_hz: u32,
    /// How samples are stored.
    pub sample_type: SampleType,
    /// Number of channels in the file.
    pub channels: usize,
}

/// How one sample is stored.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Serialize)]
#[serde(rename_all = "snake_case")]
pub enum SampleType {
    /// Integers of that many valid bits.
    Integer(u16),
    /// IEEE floats of 32 or 64 bits.
    Float(u16),
}
