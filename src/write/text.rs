//! Opens the text of a table again, without a byte order mark, and notices at its end when the file has changed.

use std::fs::File;
use std::io::{self, Cursor, Read};
use std::sync::Arc;

use sha2::{Digest, Sha256};

use crate::error::{Error, Result};
use crate::place::Place;
use crate::record::{Source, TableLayout, TextSource};

/// The text from its first byte, as UTF-8.
///
/// # Errors
/// `Io` when the file cannot be opened again; reading to the end fails when it has changed.
pub(super) fn reopen(source: &Source, layout: &TableLayout) -> Result<Box<dyn Read + Send>> {
    let path = match &layout.text {
        TextSource::Held(text) => return Ok(Box::new(Cursor::new(text.as_ref().clone()))),
        TextSource::File(path) => path,
    };
    let at_file = |error: io::Error| Error::from(error).at(Place::file(path.display().to_string()));
    let file = File::open(path).map_err(at_file)?;
    let mut text = Unchanged { file, hash: Sha256::new(), expected: source.sha256.clone() };
    let mut first = Vec::new();
    (&mut text).take(3).read_to_end(&mut first).map_err(at_file)?;
    if first == b"\xef\xbb\xbf" {
        first.clear();
    }
    Ok(Box::new(Cursor::new(first).chain(text)))
}

/// A file that must still have its fingerprint when it has been read to its end.
struct Unchanged {
    file: File,
    hash: Sha256,
    /// Lower-case hex; empty where none is known.
    expected: String,
}

impl Read for Unchanged {
    fn read(&mut self, buffer: &mut [u8]) -> io::Result<usize> {
        let got = self.file.read(buffer)?;
        self.hash.update(&buffer[..got]);
        if got == 0 && !buffer.is_empty() && !self.expected.is_empty() {
            let found: String = self.hash.clone().finalize().iter().map(|byte| format!("{byte:02x}")).collect();
            if found != self.expected {
                return Err(io::Error::other("the file has changed since it was read"));
            }
        }
        Ok(got)
    }
}
