//! Joins what shards and attempts have left: one line a record, one table for a spreadsheet, and what is still to be done.

use std::fs::{self, File};
use std::io::{BufWriter, Write};
use std::path::{Path, PathBuf};

use serde::Serialize;
use serde_json::Value;

use crate::error::{Error, Result};
use crate::fleet::attempt::{self, Span};
use crate::fleet::gathering::{Gathering, Standing, gather};
use crate::fleet::name::Shown;
use crate::fleet::overview::Overview;
use crate::fleet::plan::{PLAN, results_of, stored};
use crate::fleet::table;
use crate::write::{Overwrite, Pending};

/// The order of the joined results.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Default)]
pub enum Order {
    /// As in the list.
    #[default]
    List,
    /// Failures first, then the largest edge error for its tolerance.
    WorstFirst,
}

/// What happens to temporary files of attempts that were killed.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Default)]
pub enum Stale {
    /// They are told.
    #[default]
    Report,
    /// They are removed: no attempt may be running.
    Remove,
}

/// A record that is not whole.
#[derive(Debug, Clone, PartialEq, Eq, Serialize)]
pub struct Redo {
    /// Number in the list.
    pub record: u64,
    /// The input.
    #[serde(flatten)]
    pub input: Shown,
    /// `missing`, `output_gone` or `mismatched`.
    pub reason: &'static str,
}

/// Name of the joined results.
pub const LINES: &str = "merged.jsonl";
/// Name of the joined table.
pub const TABLE: &str = "merged.csv";
/// Name of the list of what is to be done again.
pub const REDO: &str = "redo.jsonl";

/// Joins the results under an output folder into `results/merged.jsonl` and `results/merged.csv`, and lists what is to be
/// done again in `results/redo.jsonl`. Running the batch again does just that.
///
/// # Errors
/// `Malformed` where no batch has run there; `Io` where results cannot be read or written.
pub fn merge(into: &Path, order: Order, stale: Stale) -> Result<Overview> {
    let gathering = gather(into)?;
    let results = results_of(into);
    if stale == Stale::Remove {
        for path in &gathering.temporaries {
            fs::remove_file(path)
                .map_err(|error| Error::from(error).at(crate::place::Place::file(path.display().to_string())))?;
        }
    }
    let mut overview = Overview::new(&gathering, stale);
    let mut source = Source::new(&gathering.files);
    let mut told: Vec<Span> = gathering.standings.iter().filter_map(line_of).collect();
    if order == Order::WorstFirst {
        let mut ranked = Vec::with_capacity(told.len());
        for span in told {
            ranked.push((table::rank(&source.value(span)?), span));
        }
        ranked.sort_by(|a, b| b.0.total_cmp(&a.0));
        told = ranked.into_iter().map(|(_, span)| span).collect();
    }
    let open = |name: &str| Pending::create(&results.join(name), &[], Overwrite::Force);
    let (mut lines, mut rows) = (open(LINES)?, open(TABLE)?);
    {
        let mut text = BufWriter::new(&mut lines);
        let mut sheet = table::Sheet::new(&mut rows)?;
        for span in told {
            let line = source.line(span)?;
            text.write_all(&line)?;
            let value = parsed(&line)?;
            overview.count(&value);
            sheet.add(&value)?;
        }
        text.flush()?;
        sheet.finish()?;
    }
    lines.finish()?;
    rows.finish()?;
    list_redo(&gathering, &results.join(REDO))?;
    Ok(overview)
}

/// The files that belong to the batch under an output folder, which nothing else may replace: records, outputs, plan, joined
/// results. Records are found where they were named from the current folder.
///
/// # Errors
/// `Malformed` where no batch has run there.
pub fn files_of(into: &Path) -> Result<Vec<PathBuf>> {
    let results = results_of(into);
    let (plan, _) = stored(&results)?;
    let records = plan.iter().filter_map(|planned| planned.input.name());
    let outputs = plan.iter().filter_map(|planned| Some(into.join(planned.output.name()?)));
    let own = [PLAN, LINES, TABLE, REDO].map(|name| results.join(name));
    Ok(records.chain(outputs).chain(own).collect())
}

fn line_of(standing: &Standing) -> Option<Span> {
    match standing {
        Standing::Whole(line) | Standing::Failed { line, .. } => Some(*line),
        Standing::Missing | Standing::Gone | Standing::Mismatched => None,
    }
}

/// Why a record is to be done again.
pub(super) fn reason(standing: &Standing) -> Option<&'static str> {
    match standing {
        Standing::Whole(_) | Standing::Failed { .. } => None,
        Standing::Missing => Some("missing"),
        Standing::Gone => Some("output_gone"),
        Standing::Mismatched => Some("mismatched"),
    }
}

fn list_redo(gathering: &Gathering, path: &Path) -> Result<()> {
    let open = gathering.plan.iter().zip(&gathering.standings).filter_map(|(planned, standing)| {
        Some(Redo { record: planned.record, input: planned.input.clone(), reason: reason(standing)? })
    });
    let mut open = open.peekable();
    if open.peek().is_none() {
        // An older list would tell of what has been done since.
        return match fs::remove_file(path) {
            Err(error) if error.kind() != std::io::ErrorKind::NotFound => Err(error.into()),
            _ => Ok(()),
        };
    }
    let mut output = Pending::create(path, &[], Overwrite::Force)?;
    let mut text = BufWriter::new(&mut output);
    for redo in open {
        serde_json::to_writer(&mut text, &redo).map_err(std::io::Error::from)?;
        text.write_all(b"\n")?;
    }
    text.flush()?;
    drop(text);
    output.finish().map(drop)
}

fn parsed(line: &[u8]) -> Result<Value> {
    serde_json::from_slice(line).map_err(|error| Error::malformed(format!("not a result: {error}")))
}

/// Lines read from files of results; the file in use stays open.
struct Source<'a> {
    files: &'a [PathBuf],
    open: Option<(u32, File)>,
}

impl Source<'_> {
    fn new(files: &[PathBuf]) -> Source<'_> {
        Source { files, open: None }
    }

    fn line(&mut self, span: Span) -> Result<Vec<u8>> {
        if self.open.as_ref().is_none_or(|(number, _)| *number != span.file) {
            self.open = Some((span.file, File::open(&self.files[span.file as usize])?));
        }
        match &mut self.open {
            Some((_, file)) => attempt::line_at(file, span),
            None => Ok(Vec::new()),
        }
    }

    fn value(&mut self, span: Span) -> Result<Value> {
        parsed(&self.line(span)?)
    }
}
