//! Where a record came from and how its file is laid out, so that results go back in the same form.

use std::path::PathBuf;
use std::sync::Arc;

use serde::{Deserialize, Serialize};

use super::RowLines;

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
///
/// Offsets and `head` count in the decoded text: UTF-8 without a byte order mark.
#[derive(Debug, Clone)]
pub struct TableLayout {
    /// The text again, to copy untouched fields from.
    pub text: TextSource,
    /// How the text is stored.
    pub encoding: Encoding,
    /// Field separator; blank stands for runs of blanks and tabs.
    pub delimiter: u8,
    /// Decimal mark, `.` or `,`.
    pub decimal: u8,
    /// Mark between groups of three digits, where one was declared.
    pub thousands: Option<u8>,
    /// Text that precedes the data block (preamble, header, units row): complete lines with their ends.
    pub head: String,
    /// Line of `head` (from 0) that holds the column names, where there is one; `None` too where quoted names hold line
    /// ends.
    pub header_line: Option<usize>,
    /// Line of `head` (from 0) that holds the units, where they stand on a row of their own.
    pub units_line: Option<usize>,
    /// Byte offset at which the data block starts: the length of `head`.
    pub data_start: u64,
    /// Line number (from 1) of the first data row.
    pub data_line: u64,
    /// Role of each field of a data row, in order; a field that is always empty after a trailing delimiter counts.
    pub columns: Vec<ColumnRole>,
    /// Line of each sample. Other lines of the data block (blank, dropped, footer) hold no sample.
    pub lines: RowLines,
    /// Line end of the data block: `\n`, `\r\n` or `\r`.
    pub newline: &'static str,
}

impl TableLayout {
    /// Field (from 0) of the data rows that holds channel `channel` of the raw record.
    pub fn field_of(&self, channel: usize) -> Option<usize> {
        self.columns.iter().position(|role| *role == ColumnRole::Channel(channel))
    }
}

/// How text is stored.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Serialize, Deserialize)]
#[serde(rename_all = "snake_case")]
pub enum Encoding {
    /// UTF-8 without a byte order mark; plain ASCII too.
    Utf8,
    /// UTF-8 with a byte order mark.
    Utf8Marked,
    /// UTF-16, low byte first.
    Utf16Le,
    /// UTF-16, high byte first.
    Utf16Be,
    /// Windows-1252, which includes Latin-1.
    Windows1252,
}

impl Encoding {
    /// Where decoded text holds what the encoding cannot: bytes that are no UTF-8, or the mark that stands for halves of
    /// characters in UTF-16.
    pub(crate) fn odd_byte(self, text: &[u8]) -> Option<usize> {
        match self {
            Encoding::Utf8 | Encoding::Utf8Marked => std::str::from_utf8(text).err().map(|error| error.valid_up_to()),
            Encoding::Utf16Le | Encoding::Utf16Be => memchr::memmem::find(text, "\u{fffd}".as_bytes()),
            Encoding::Windows1252 => None,
        }
    }
}

/// What a column of a table is.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum ColumnRole {
    /// The time or position column.
    Stamps,
    /// The dates of the stamps, whose clock times stand in the column of stamps.
    Dates,
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
    Held(Arc<Vec<u8>>),
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
