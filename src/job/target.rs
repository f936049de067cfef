//! Where a job's outputs go: the record, its JSON sidecar and, where asked, a further JSON file.

use std::io::Write;
use std::path::{Path, PathBuf};

use crate::error::{Error, Result};
use crate::write::{Overwrite, Pending};

/// The outputs of a job, opened before any work so that a refusal costs nothing.
pub struct Target<'a> {
    record: Place<'a>,
    json: Option<PathBuf>,
    overwrite: Overwrite,
}

enum Place<'a> {
    File(PathBuf),
    Stream(Box<dyn Write + Send + 'a>),
}

/// The opened outputs, nothing of them visible yet.
pub(super) struct Opened<'a> {
    pub record: Pending<'a>,
    pub sidecar: Option<Pending<'a>>,
    pub json: Option<Pending<'a>>,
}

impl<'a> Target<'a> {
    /// The record at `path`, its sidecar at `path` with `.json` appended, and the JSON once more at `json`.
    pub fn file(path: &Path, json: Option<&Path>, overwrite: Overwrite) -> Target<'a> {
        Target { record: Place::File(path.to_owned()), json: json.map(Path::to_owned), overwrite }
    }

    /// The record into a stream: there is no place for a sidecar.
    pub fn stream(sink: Box<dyn Write + Send + 'a>, json: Option<&Path>, overwrite: Overwrite) -> Target<'a> {
        Target { record: Place::Stream(sink), json: json.map(Path::to_owned), overwrite }
    }

    /// The record's file name, where it goes to a file.
    pub(super) fn path(&self) -> Option<&Path> {
        match &self.record {
            Place::File(path) => Some(path),
            Place::Stream(_) => None,
        }
    }

    /// What happens to files that are in the way.
    pub(super) fn overwrite(&self) -> Overwrite {
        self.overwrite
    }

    /// Opens everything; the input is protected from being overwritten unasked.
    pub(super) fn open(self, input: Option<&Path>) -> Result<Opened<'a>> {
        let inputs: Vec<&Path> = input.into_iter().collect();
        let sidecar = match &self.record {
            Place::File(path) => Some(Pending::create(&sidecar_of(path), &inputs, self.overwrite)?),
            Place::Stream(_) => None,
        };
        let json = self.json.map(|path| Pending::create(&path, &inputs, self.overwrite)).transpose()?;
        let record = match self.record {
            Place::File(path) => Pending::create(&path, &inputs, self.overwrite)?,
            Place::Stream(sink) => Pending::stream("-", sink),
        };
        Ok(Opened { record, sidecar, json })
    }
}

/// Opens the record and the sidecar of each of `count` parts: `clean-01.csv` to `clean-12.csv`.
pub(super) fn open_parts<'a>(
    path: Option<&Path>,
    count: usize,
    input: Option<&Path>,
    overwrite: Overwrite,
) -> Result<Vec<(Pending<'a>, Pending<'a>)>> {
    let Some(path) = path else {
        return Err(Error::usage(format!("gaps split the record into {count} parts, which one stream cannot hold"))
            .remedy("name a file with -o; the parts are numbered after it"));
    };
    let inputs: Vec<&Path> = input.into_iter().collect();
    let open = |number: usize| {
        let path = part_of(path, number, count);
        let sidecar = Pending::create(&sidecar_of(&path), &inputs, overwrite)?;
        Ok((Pending::create(&path, &inputs, overwrite)?, sidecar))
    };
    (1..=count).map(open).collect()
}

/// `clean.csv` has the parts `clean-1.csv`, `clean-2.csv`; numbers are as wide as the last of them.
fn part_of(path: &Path, number: usize, count: usize) -> PathBuf {
    let width = count.to_string().len();
    let stem = path.file_stem().unwrap_or_default().to_string_lossy();
    let extension = path.extension().map(|e| format!(".{}", e.to_string_lossy())).unwrap_or_default();
    path.with_file_name(format!("{stem}-{number:0width$}{extension}"))
}

/// `clean.csv` has the sidecar `clean.csv.json`.
fn sidecar_of(path: &Path) -> PathBuf {
    let mut name = path.as_os_str().to_owned();
    name.push(".json");
    PathBuf::from(name)
}
