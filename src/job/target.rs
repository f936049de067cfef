//! Where a job's outputs go: the record, its JSON sidecar and, where asked, a further JSON file.

use std::io::Write;
use std::path::{Path, PathBuf};

use crate::error::Result;
use crate::write::{self, Durability, Overwrite, Pending};

/// The outputs of a job, opened before any work so that a refusal costs nothing.
pub struct Target<'a> {
    record: Place<'a>,
    sidecar: Option<PathBuf>,
    json: Option<PathBuf>,
    overwrite: Overwrite,
    durability: Durability,
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
    pub durability: Durability,
}

impl<'a> Target<'a> {
    /// The record at `path`, its sidecar at `path` with `.json` appended, and the JSON once more at `json`.
    pub fn file(path: &Path, json: Option<&Path>, overwrite: Overwrite) -> Target<'a> {
        Target { sidecar: Some(sidecar_of(path)), json: json.map(Path::to_owned), ..Target::alone(path, overwrite) }
    }

    /// The record at `path` and nothing beside it: its report goes elsewhere.
    pub fn alone(path: &Path, overwrite: Overwrite) -> Target<'a> {
        let record = Place::File(path.to_owned());
        Target { record, sidecar: None, json: None, overwrite, durability: Durability::default() }
    }

    /// The record into a stream: there is no place for a sidecar.
    pub fn stream(sink: Box<dyn Write + Send + 'a>, json: Option<&Path>, overwrite: Overwrite) -> Target<'a> {
        let (record, json) = (Place::Stream(sink), json.map(Path::to_owned));
        Target { record, sidecar: None, json, overwrite, durability: Durability::default() }
    }

    /// The same outputs, finished when that is reached.
    #[must_use]
    pub fn durable(self, durability: Durability) -> Target<'a> {
        Target { durability, ..self }
    }

    /// The record's file name, where it goes to a file.
    pub(super) fn path(&self) -> Option<&Path> {
        match &self.record {
            Place::File(path) => Some(path),
            Place::Stream(_) => None,
        }
    }

    /// Opens everything; the input is protected from being replaced.
    pub(super) fn open(self, input: Option<&Path>) -> Result<Opened<'a>> {
        let inputs: Vec<&Path> = input.into_iter().collect();
        let beside = [&self.sidecar, &self.json].into_iter().flatten().map(PathBuf::as_path);
        write::refuse_twins(&self.path().into_iter().chain(beside).collect::<Vec<_>>())?;
        let open = |path: PathBuf| Pending::create(&path, &inputs, self.overwrite);
        let sidecar = self.sidecar.map(open).transpose()?;
        let json = self.json.map(open).transpose()?;
        let record = match self.record {
            Place::File(path) => open(path)?,
            Place::Stream(sink) => Pending::stream("-", sink),
        };
        Ok(Opened { record, sidecar, json, durability: self.durability })
    }
}

/// `clean.csv` has the sidecar `clean.csv.json`.
fn sidecar_of(path: &Path) -> PathBuf {
    let mut name = path.as_os_str().to_owned();
    name.push(".json");
    PathBuf::from(name)
}
