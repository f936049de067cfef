//! Where a job's outputs go: the record, its JSON sidecar and, where asked, a further JSON file.

use std::io::Write;
use std::path::{Path, PathBuf};

use serde::Serialize;

use crate::error::Result;
use crate::report::page::{self, Page};
use crate::write::{self, Overwrite, Pending};

/// The outputs of a job, opened before any work so that a refusal costs nothing.
pub struct Target<'a> {
    record: Place<'a>,
    json: Option<PathBuf>,
    page: Option<PathBuf>,
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
    pub page: Option<PageFiles<'a>>,
}

impl<'a> Target<'a> {
    /// The record at `path`, its sidecar at `path` with `.json` appended, and the JSON once more at `json`.
    pub fn file(path: &Path, json: Option<&Path>, overwrite: Overwrite) -> Target<'a> {
        Target { record: Place::File(path.to_owned()), json: json.map(Path::to_owned), page: None, overwrite }
    }

    /// The record into a stream: there is no place for a sidecar.
    pub fn stream(sink: Box<dyn Write + Send + 'a>, json: Option<&Path>, overwrite: Overwrite) -> Target<'a> {
        Target { record: Place::Stream(sink), json: json.map(Path::to_owned), page: None, overwrite }
    }

    /// The report page at `path` as well, with its figures beside it.
    #[must_use]
    pub fn with_page(mut self, path: &Path) -> Target<'a> {
        self.page = Some(path.to_owned());
        self
    }

    /// The record's file name, where it goes to a file.
    pub(super) fn path(&self) -> Option<&Path> {
        match &self.record {
            Place::File(path) => Some(path),
            Place::Stream(_) => None,
        }
    }

    /// Opens everything; the input is protected from being overwritten unasked.
    pub(super) fn open(self, input: Option<&Path>) -> Result<Opened<'a>> {
        let inputs: Vec<&Path> = input.into_iter().collect();
        let sidecar = match &self.record {
            Place::File(path) => Some(Pending::create(&beside(path, ".json"), &inputs, self.overwrite)?),
            Place::Stream(_) => None,
        };
        let json = self.json.map(|path| Pending::create(&path, &inputs, self.overwrite)).transpose()?;
        let page = self.page.map(|path| PageFiles::create(&path, &inputs, self.overwrite)).transpose()?;
        let record = match self.record {
            Place::File(path) => Pending::create(&path, &inputs, self.overwrite)?,
            Place::Stream(sink) => Pending::stream("-", sink),
        };
        Ok(Opened { record, sidecar, json, page })
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

    /// Writes all three, or none.
    ///
    /// # Errors
    /// `Io` for what stops writing.
    pub fn write<T: Serialize>(mut self, report: &T, page: &Page) -> Result<()> {
        self.page.write_all(page::html(page).as_bytes())?;
        self.json.write_all(page::figures_json(report, page)?.as_bytes())?;
        self.csv.write_all(page::figures_csv(page).as_bytes())?;
        write::finish_all(vec![self.csv, self.json, self.page]).into_iter().collect::<Result<Vec<_>>>()?;
        Ok(())
    }
}

/// `clean.csv` has the sidecar `clean.csv.json`.
fn beside(path: &Path, suffix: &str) -> PathBuf {
    let mut name = path.as_os_str().to_owned();
    name.push(suffix);
    PathBuf::from(name)
}
