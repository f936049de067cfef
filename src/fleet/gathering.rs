//! What the attempts of a batch have left, record by record, checked against the outputs that are there.

use std::fs;
use std::path::{Path, PathBuf};

use rayon::prelude::*;

use crate::error::{Error, Result};
use crate::fleet::attempt::{self, Span};
use crate::fleet::line::Status;
use crate::fleet::plan::{Fingerprint, PlanLine, fingerprint, results_of, stored};
use crate::fleet::resume::fingerprint_of_file;
use crate::place::Place;

/// Everything that is there of a batch.
pub struct Gathering {
    /// The plan, one entry a record.
    pub plan: Vec<PlanLine>,
    /// The files of results.
    pub files: Vec<PathBuf>,
    /// How each record stands.
    pub standings: Vec<Standing>,
    /// Lines beside the ones that stand: retries, orphans, earlier failures.
    pub superseded: u64,
    /// Lines that no record of the plan answers to.
    pub extra: u64,
    /// Lines cut short by a kill or a full disk.
    pub torn: u64,
    /// Files of results that belong to another list or other options.
    pub other_plans: u64,
    /// Temporary files of attempts that were killed, inside the output folder.
    pub temporaries: Vec<PathBuf>,
}

/// How a record stands after all attempts.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Standing {
    /// Its line agrees with its output, or tells of a repeated name.
    Whole(Span),
    /// No attempt did it; `stale` where an output stands at its name all the same.
    Failed {
        /// Its line.
        line: Span,
        /// An output of an earlier run is there.
        stale: bool,
    },
    /// No result tells of it.
    Missing,
    /// Results tell of it, but its output is gone.
    Gone,
    /// Its output is another than any result tells.
    Mismatched,
}

#[derive(Clone, Copy)]
struct Candidate {
    span: Span,
    status: Status,
    output: Option<Fingerprint>,
}

/// Gathers the results under an output folder.
///
/// # Errors
/// `Malformed` where no batch has run there; `Io` where results cannot be read. A record that lacks something is no error.
pub fn gather(into: &Path) -> Result<Gathering> {
    let results = results_of(into);
    let (plan, sha256) = stored(&results)?;
    let files = attempt::files(&results)?;
    let mut candidates: Vec<Vec<Candidate>> = vec![Vec::new(); plan.len()];
    let (mut extra, mut torn, mut other_plans, mut lines) = (0, 0, 0, 0);
    for (index, path) in files.iter().enumerate() {
        let reading = attempt::read(path, index as u32, &mut |brief, span, of| {
            if of != sha256 {
                return;
            }
            let number = brief.record as usize;
            let own = plan.get(number).is_some_and(|planned| {
                let named = brief.outputs.iter().all(|output| output.name == planned.output);
                planned.settings_sha256 == brief.settings_sha256 && named
            });
            if !own {
                extra += 1;
                return;
            }
            lines += 1;
            let output = brief.outputs.first().and_then(|output| fingerprint(&output.sha256));
            candidates[number].push(Candidate { span, status: brief.status, output });
        })?;
        torn += reading.torn;
        other_plans += u64::from(reading.plan_sha256.is_some_and(|own| own != sha256));
    }
    let standings: Vec<Standing> =
        (plan.par_iter().zip(&candidates)).map(|(planned, candidates)| standing(planned, candidates, into)).collect();
    let told = candidates.iter().filter(|candidates| !candidates.is_empty()).count() as u64;
    let mut temporaries = Vec::new();
    find_temporaries(into, &mut temporaries)?;
    temporaries.sort();
    Ok(Gathering { plan, files, standings, superseded: lines - told, extra, torn, other_plans, temporaries })
}

fn standing(planned: &PlanLine, candidates: &[Candidate], into: &Path) -> Standing {
    if let Some(repeated) = candidates.iter().find(|c| c.status == Status::Repeated) {
        return Standing::Whole(repeated.span);
    }
    let path = planned.output.name().map(|name| into.join(name));
    let there = path.as_ref().is_some_and(|path| path.exists());
    let mut done = candidates.iter().filter(|c| c.status == Status::Done).peekable();
    if done.peek().is_some() {
        let Some(actual) = path.and_then(|path| fingerprint_of_file(&path).ok()) else { return Standing::Gone };
        return match done.find(|candidate| candidate.output == Some(actual)) {
            Some(candidate) => Standing::Whole(candidate.span),
            None => Standing::Mismatched,
        };
    }
    match candidates.first() {
        Some(failed) => Standing::Failed { line: failed.span, stale: there },
        None => Standing::Missing,
    }
}

/// Temporary files of outputs and plans, which begin with a dot and end in `.part`; links to folders are not followed.
fn find_temporaries(folder: &Path, found: &mut Vec<PathBuf>) -> Result<()> {
    let fault = |error: std::io::Error| Error::from(error).at(Place::file(folder.display().to_string()));
    for entry in fs::read_dir(folder).map_err(fault)? {
        let entry = entry.map_err(fault)?;
        let (name, kind) = (entry.file_name(), entry.file_type().map_err(fault)?);
        if kind.is_dir() {
            find_temporaries(&entry.path(), found)?;
        }
        let bytes = name.as_encoded_bytes();
        if kind.is_file() && bytes.starts_with(b".") && bytes.ends_with(b".part") {
            found.push(entry.path());
        }
    }
    Ok(())
}
