//! A table out of an archive: the source's own head, marks and decimals, its stamps as they were.

use std::io::Write;

use super::csv::named;
use super::field::push_field;
use super::{Digits, number};
use crate::error::Result;

/// A table to be written again.
pub struct RestoredTable<'a> {
    /// Field separator.
    pub delimiter: u8,
    /// Decimal mark.
    pub decimal: u8,
    /// Line end.
    pub newline: &'a str,
    /// The lines above the data as they were; `None` makes a line of names.
    pub head: Option<&'a str>,
    /// Columns: 0 for the stamps, k for channel k - 1; empty for stamps and all channels.
    pub columns: &'a [u64],
    /// Name and unit of each channel.
    pub names: Vec<(&'a str, &'a str)>,
    /// Decimals of each channel; `None` for the fewest that give the same double.
    pub decimals: Vec<Option<u8>>,
    /// Samples of each channel; NaN for a blank.
    pub samples: &'a [Vec<f64>],
    /// The stamp of a row as text.
    pub stamps: &'a (dyn Fn(u64) -> String + Sync),
    /// Name of the column of stamps.
    pub stamps_name: String,
}

impl RestoredTable<'_> {
    /// Writes the table.
    ///
    /// # Errors
    /// Those of the sink.
    pub fn write(&self, sink: &mut dyn Write) -> Result<()> {
        let newline = if self.newline.is_empty() { "\n" } else { self.newline };
        let channels = |column: u64| (column > 0).then(|| self.names.get(column as usize - 1)).flatten();
        match self.head {
            Some(head) => sink.write_all(head.as_bytes())?,
            None => {
                let mut line = Vec::new();
                for (at, column) in self.columns.iter().enumerate() {
                    if at > 0 {
                        line.push(self.delimiter);
                    }
                    match channels(*column) {
                        Some((name, unit)) => push_field(&mut line, &named(name, unit), self.delimiter),
                        None => push_field(&mut line, &self.stamps_name, self.delimiter),
                    }
                }
                line.extend(newline.as_bytes());
                sink.write_all(&line)?;
            }
        }
        let rows = self.samples.first().map_or(0, Vec::len);
        let mut out = Vec::new();
        for row in 0..rows {
            for (at, column) in self.columns.iter().enumerate() {
                if at > 0 {
                    out.push(self.delimiter);
                }
                self.cell(*column, row, &mut out);
            }
            out.extend(newline.as_bytes());
            if out.len() > 1 << 16 {
                sink.write_all(&out)?;
                out.clear();
            }
        }
        Ok(sink.write_all(&out)?)
    }

    fn cell(&self, column: u64, row: usize, out: &mut Vec<u8>) {
        let quoted = self.decimal == self.delimiter;
        let start = out.len();
        if column == 0 {
            let text = (self.stamps)(row as u64);
            out.extend(text.bytes().map(|byte| if byte == b'.' { self.decimal } else { byte }));
        } else {
            let value = self.samples.get(column as usize - 1).and_then(|samples| samples.get(row));
            let digits =
                self.decimals.get(column as usize - 1).copied().flatten().map_or(Digits::Shortest, Digits::Fixed);
            match value {
                Some(value) if value.is_finite() => number::push(out, *value, digits, self.decimal),
                // Between blanks an empty field needs a word, or the columns would shift.
                _ if self.delimiter == b' ' => out.extend(b"nan"),
                _ => {}
            }
        }
        if quoted && out[start..].contains(&self.delimiter) {
            out.insert(start, b'"');
            out.push(b'"');
        }
    }
}
