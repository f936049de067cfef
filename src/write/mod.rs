//! Writes records: the forms that are written, and outputs that appear whole or not at all.

mod blocks;
mod csv;
mod field;
mod header;
mod number;
mod origin;
mod restored;
mod series;
mod stamp;
mod table;
mod wav;
mod wave_header;
mod whole;

use std::io::Write;
use std::ops::Range;
use std::path::Path;

use crate::error::{Error, Finding, Result};
use crate::record::{Format, Record};
pub use number::Digits;
pub use origin::{Origin, Rows};
pub use restored::RestoredTable;
pub use series::spectrum_csv;
pub use wave_header::{WAVE_ENCODINGS, WaveEncoding};
pub use whole::{
    Durability, Overwrite, Pending, Written, discard_pending, finish_all, finish_together, is_same_file, refuse_twins,
};

/// A form that is written.
pub struct Writer {
    /// The format.
    pub format: Format,
    /// Name on the command line.
    pub name: &'static str,
    /// File name extensions, in lower case, without the dot.
    pub extensions: &'static [&'static str],
    /// One line of help.
    pub about: &'static str,
    /// Tells whether the content fits the form, before anything is written; remarks say what the form cannot carry.
    pub check: fn(&Content<'_>) -> Result<Vec<Finding>>,
    /// Writes the content from first to last byte; the sink need not seek.
    pub write: fn(&Content<'_>, &mut (dyn Write + Send)) -> Result<()>,
}

/// The forms, in the order of help texts.
pub static WRITERS: &[Writer] = &[csv::WRITER, wav::WRITER];

/// What goes into an output.
#[derive(Clone, Copy)]
pub struct Content<'a> {
    /// The result.
    pub record: &'a Record,
    /// The table it came from, to write it back in its own form; `None` writes a plain new table. For text only.
    pub origin: Option<&'a Origin<'a>>,
    /// Columns appended at the right, such as `trusted`. For text only.
    pub extra: &'a [Extra<'a>],
    /// Samples of each channel that are written; cells outside stay blank. `None` writes all. For text only.
    pub shown: Option<&'a [Range<usize>]>,
    /// Digits of conditioned values. For text only.
    pub digits: Digits,
    /// How a sample is stored. For WAV only.
    pub encoding: WaveEncoding,
}

impl<'a> Content<'a> {
    /// A record in plain form: shortest digits, or 32-bit floats.
    pub fn new(record: &'a Record) -> Content<'a> {
        Content {
            record,
            origin: None,
            extra: &[],
            shown: None,
            digits: Digits::Shortest,
            encoding: WaveEncoding::Float32,
        }
    }
}

impl Content<'_> {
    /// True for a cell that stays blank.
    fn is_blank(&self, channel: usize, sample: usize) -> bool {
        self.shown.is_some_and(|shown| shown.get(channel).is_some_and(|span| !span.contains(&sample)))
    }
}

/// A column of its own beside the channels.
#[derive(Debug, Clone, Copy)]
pub struct Extra<'a> {
    /// Name in the header.
    pub name: &'a str,
    /// One cell for each sample of the record.
    pub cells: Cells<'a>,
}

/// Cells of an extra column.
#[derive(Debug, Clone, Copy)]
pub enum Cells<'a> {
    /// Numbers; a cell stays blank where there is none.
    Numbers(&'a [Option<f64>]),
    /// `1` or `0`; a cell stays blank where it is not known.
    Flags(&'a [Option<bool>]),
}

impl Cells<'_> {
    /// Number of cells.
    pub fn count(&self) -> usize {
        match self {
            Cells::Numbers(cells) => cells.len(),
            Cells::Flags(cells) => cells.len(),
        }
    }
}

/// Checks the content and writes it into `output`, which stays to be finished; remarks say what the form could not carry.
///
/// # Errors
/// Those of the writer.
pub fn fill(writer: &Writer, content: &Content<'_>, output: &mut Pending<'_>) -> Result<Vec<Finding>> {
    let findings = (writer.check)(content)?;
    (writer.write)(content, output).map_err(|error| output.placed(error))?;
    Ok(findings)
}

/// Checks the content, writes it into `output` and finishes that; remarks say what the form could not carry.
///
/// # Errors
/// Those of the writer and of `Pending::finish`; nothing is left behind then.
pub fn save(writer: &Writer, content: &Content<'_>, mut output: Pending<'_>) -> Result<(Written, Vec<Finding>)> {
    let findings = fill(writer, content, &mut output)?;
    output.finish().map(|written| (written, findings))
}

/// The writer of a format.
pub fn writer(format: Format) -> &'static Writer {
    match format {
        Format::Csv => &csv::WRITER,
        Format::Wav => &wav::WRITER,
    }
}

/// The writer that a file name's extension asks for.
///
/// # Errors
/// `Usage` when the extension is none of a writer's.
pub fn writer_by_name(path: &Path) -> Result<&'static Writer> {
    let extension = path.extension().map(|e| e.to_string_lossy().to_ascii_lowercase()).unwrap_or_default();
    WRITERS.iter().find(|writer| writer.extensions.contains(&extension.as_str())).ok_or_else(|| {
        let known: Vec<&str> = WRITERS.iter().map(|writer| writer.name).collect();
        Error::usage(format!("the name {:?} does not tell a format", path.display()))
            .remedy(format!("give one with --format: {}", known.join(", ")))
    })
}
