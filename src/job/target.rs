//! Where a job's outputs go: the record, its JSON sidecar and, where asked, a further JSON file.

use std::io::Write;
use std::path::{Path, PathBuf};

use serde::Serialize;

use crate::error::Result;
use crate::report::page::{self, Page};
use crate::write::{self, Durability, Overwrite, Pending};

/// The outputs of a job, opened before any work so that a refusal costs nothing.
pub struct Target<'a> {
    record: Place<'a>,
    sidecar: Option<PathBuf>,
    json: Option<PathBuf>,
    page: Option<PathBuf>,
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
    pub page: Option<PageFiles<'a>>,
    pub durability: Durability,
}

impl<'a> Target<'a> {
    /// The record at `path`, its sidecar at `path` with `.json` appended, and the JSON once more at `json`.
    pub fn file(path: &Path, json: Option<&Path>, overwrite: Overwrite) -> Target<'a> {
        Target {
            sidecar: Some(beside(path, ".json")),
            json: json.map(Path::to_owned),
            ..Target::alone(path, overwrite)
        }
    }

    /// The record at `path` and nothing beside it: its report goes elsewhere.
    pub fn alone(path: &Path, overwrite: Overwrite) -> Target<'a> {
        let record = Place::File(path.to_owned());
        Target { record, sidecar: None, json: None, page: None, overwrite, durability: Durability::default() }
    }

    /// The record into a stream: there is no place for a sidecar.
    pub fn stream(sink: Box<dyn Write + Send + 'a>, json: Option<&Path>, overwrite: Overwrite) -> Target<'a> {
        let (record, json) = (Place::Stream(sink), json.map(Path::to_owned));
        Target { record, sidecar: None, json, page: None, overwrite, durability: Durability::default() }
    }

    /// The report page at `path` as well, with its figures beside it.
    #[must_use]
    pub fn with_page(mut self, path: &Path) -> Target<'a> {
        self.page = Some(path.to_owned());
        self
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
        let others = [&self.sidecar, &self.json, &self.page].into_iter().flatten().map(PathBuf::as_path);
        write::refuse_twins(&self.path().into_iter().chain(others).collect::<Vec<_>>())?;
        let open = |path: PathBuf| Pending::create(&path, &inputs, self.overwrite);
        let sidecar = self.sidecar.map(open).transpose()?;
        let json = self.json.map(open).transpose()?;
        let page = self.page.map(|path| PageFiles::create(&path, &inputs, self.overwrite)).transpose()?;
        let record = match self.record {
            Place::File(path) => open(path)?,
            Place::Stream(sink) => Pending::stream("-", sink),
        };
        Ok(Opened { record, sidecar, json, page, durability: self.durability })
    }
}

/// A report page and what stands beside it, opened before any work.
pub struct PageFiles<'a> {
    page: Pending<'a>,
    json: Pending<'a>,
    csv: Pending<'a>,
}

impl<'a> PageFiles<'a> {
    /// The page at `path`, and the same figures at `path` with `.json` and `.csv` appended.
    ///
    /// # Errors
    /// As `Pending::create`.
    pub fn create(path: &Path, inputs: &[&Path], overwrite: Overwrite) -> Result<PageFiles<'a>> {
        let open = |path: &Path| Pending::create(path, inputs, overwrite);
        Ok(PageFiles { page: open(path)?, json: open(&beside(path, ".json"))?, csv: open(&beside(path, ".csv"))? })
    }

    /// All three with their content, still to be finished.
    ///
    /// # Errors
    /// `Io` for what stops writing.
    pub fn fill<T: Serialize>(mut self, report: &T, page: &Page) -> Result<[Pending<'a>; 3]> {
        self.page.write_all(page::html(page).as_bytes())?;
        self.json.write_all(page::figures_json(report, page)?.as_bytes())?;
        self.csv.write_all(page::figures_csv(page).as_bytes())?;
        Ok([self.csv, self.json, self.page])
    }
}

/// `clean.csv` has the sidecar `clean.csv.json`.
fn beside(path: &Path, suffix: &str) -> PathBuf {
    let mut name = path.as_os_str().to_owned();
    name.push(suffix);
    PathBuf::from(name)
}
