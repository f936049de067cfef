//! The records of a batch, in order: names from the command line or a list, or the rows of a manifest.

use std::io::Read;
use std::path::PathBuf;

use crate::error::{Error, Result};
use crate::fleet::name::path_of;
use crate::place::Place;
use crate::settings::Layer;

/// One record that is asked for.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Item {
    /// Where it is.
    pub path: PathBuf,
    /// Name of its output inside the output folder, where the template does not make it.
    pub output: Option<PathBuf>,
    /// Its own options.
    pub layer: Layer,
}

impl Item {
    /// A record with nothing of its own.
    pub fn new(path: impl Into<PathBuf>) -> Item {
        Item { path: path.into(), output: None, layer: Layer::default() }
    }
}

/// What ends a name in a list.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Separator {
    /// The end of the line, with or without a carriage return.
    Line,
    /// A NUL byte: names may then hold line ends.
    Nul,
}

/// Reads a list of names; empty names are passed over. `label` names the list in errors.
///
/// # Errors
/// `Io` where it cannot be read; `Usage` where a name is none on this system.
pub fn read(mut source: impl Read, separator: Separator, label: &str) -> Result<Vec<Item>> {
    let mut bytes = Vec::new();
    source.read_to_end(&mut bytes).map_err(|error| Error::from(error).at(Place::file(label)))?;
    let end = match separator {
        Separator::Line => b'\n',
        Separator::Nul => 0,
    };
    let mut items = Vec::new();
    for (number, name) in bytes.split(|byte| *byte == end).enumerate() {
        let name = match separator {
            Separator::Line => name.strip_suffix(b"\r").unwrap_or(name),
            Separator::Nul => name,
        };
        if name.is_empty() {
            continue;
        }
        let place = || Place { file: Some(label.to_owned()), ..Place::line(number as u64 + 1) };
        if name.contains(&0) {
            return Err(Error::usage("a NUL byte in a name").remedy("--null reads lists with NUL bytes").at(place()));
        }
        items.push(Item::new(path_of(name.to_vec()).ok_or_else(|| Error::usage("not a name").at(place()))?));
    }
    Ok(items)
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn lines_and_nul_bytes_part_names() {
        let names = |text: &str, separator| -> Vec<String> {
            let items = read(text.as_bytes(), separator, "list").expect("a list");
            items.into_iter().map(|item| item.path.to_string_lossy().into_owned()).collect()
        };
        assert_eq!(names("a.csv\r\n\nb c.csv\n d", Separator::Line), ["a.csv", "b c.csv", " d"]);
        assert_eq!(names("a\nb.csv\0c\0", Separator::Nul), ["a\nb.csv", "c"]);
        assert!(read(&b"a\0b\n"[..], Separator::Line, "list").is_err());
    }
}
