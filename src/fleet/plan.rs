//! What a batch will do, settled before any work: every record with its output and its options, no two with one output.

use std::collections::{HashMap, HashSet};
use std::ffi::OsString;
use std::io::Write;
use std::path::{Path, PathBuf};
use std::sync::Arc;

use serde::{Deserialize, Serialize};
use sha2::{Digest, Sha256};

use crate::error::{Error, Result};
use crate::fleet::list::Item;
use crate::fleet::name::{self, RESULTS, Shown, Template};
use crate::fleet::recipe::Recipe;
use crate::place::escape;
use crate::report::Tool;
use crate::settings::{Layer, Settings};
use crate::write::{Overwrite, Pending, is_same_file};

/// A SHA-256 as bytes.
pub type Fingerprint = [u8; 32];

/// A record as planned.
#[derive(Debug, Clone)]
pub struct Planned {
    /// Where it is.
    pub path: PathBuf,
    /// Its output, inside the output folder.
    pub output: PathBuf,
    /// Fingerprint of the options and the version of the program: results with another one are done again.
    pub settings_sha256: Fingerprint,
    /// An earlier record that is the same file with the same options and output under another name.
    pub same_as: Option<u64>,
    options: Options,
}

/// Options of a record: shared by many, or its own, which are read when its turn comes.
#[derive(Debug, Clone)]
enum Options {
    Shared(Arc<Settings>),
    Own(Box<Layer>),
}

impl Planned {
    /// The record's settings.
    ///
    /// # Errors
    /// None that planning did not find.
    pub fn settings(&self) -> Result<Arc<Settings>> {
        match &self.options {
            Options::Shared(settings) => Ok(Arc::clone(settings)),
            Options::Own(layer) => layer.settings().map(Arc::new),
        }
    }
}

/// The plan of a batch.
#[derive(Debug, Clone)]
pub struct Plan {
    /// The records in the order of the list.
    pub records: Vec<Planned>,
    /// Fingerprint of the whole plan, lower-case hex: shards of one batch agree in it.
    pub sha256: String,
}

/// One line of the plan's file.
#[derive(Debug, Clone, PartialEq, Eq, Serialize, Deserialize)]
pub struct PlanLine {
    /// Number in the list, from 0.
    pub record: u64,
    /// The input.
    #[serde(flatten)]
    pub input: Shown,
    /// The output, inside the output folder.
    pub output: Shown,
    /// Fingerprint of its options, lower-case hex.
    pub settings_sha256: String,
}

impl Plan {
    /// Settles names and options of all records. `flags` win over manifest rows, these over the recipe.
    ///
    /// # Errors
    /// `Usage` for options that do not parse, for an output that would lie outside the folder or replace an input, and where
    /// two records have one output; all of that before any work.
    pub fn new(items: Vec<Item>, recipe: &Recipe, flags: &Layer, template: &Template, into: &Path) -> Result<Plan> {
        if items.is_empty() {
            return Err(Error::usage("no records").remedy("name files, or a list with --files-from"));
        }
        let mut shared: HashMap<Vec<usize>, (Arc<Settings>, Fingerprint)> = HashMap::new();
        let mut records = Vec::with_capacity(items.len());
        for (number, item) in items.into_iter().enumerate() {
            let output = match &item.output {
                Some(output) => name::inside(output)?,
                None => template.expand(&item.path, number as u64)?,
            };
            let overrides = recipe.overrides_of(&item.path);
            let (options, settings_sha256) = if item.layer.is_empty() {
                if !shared.contains_key(&overrides) {
                    let settings = flags.over(&recipe.layer(&overrides)).settings()?;
                    let fingerprint = fingerprint_of(&settings)?;
                    shared.insert(overrides.clone(), (Arc::new(settings), fingerprint));
                }
                let (settings, fingerprint) = &shared[&overrides];
                (Options::Shared(Arc::clone(settings)), *fingerprint)
            } else {
                let layer = flags.over(&item.layer.over(&recipe.layer(&overrides)));
                let fingerprint = fingerprint_of(&layer.settings()?)?;
                (Options::Own(Box::new(layer)), fingerprint)
            };
            records.push(Planned { path: item.path, output, settings_sha256, same_as: None, options });
        }
        refuse_collisions(&mut records)?;
        refuse_inputs_as_outputs(&records, into)?;
        let mut plan = Plan { records, sha256: String::new() };
        let mut digest = Sha256::new();
        for line in plan.lines() {
            digest.update(line?);
        }
        plan.sha256 = hex(&digest.finalize());
        Ok(plan)
    }

    /// Writes the plan into the folder of results; all shards write the same.
    ///
    /// # Errors
    /// `Io` where that cannot be done.
    pub fn store(&self, results: &Path) -> Result<()> {
        let mut output = Pending::create(&results.join(PLAN), &[], Overwrite::Force)?;
        let mut buffered = std::io::BufWriter::new(&mut output);
        for line in self.lines() {
            buffered.write_all(&line?)?;
        }
        buffered.flush()?;
        drop(buffered);
        output.finish().map(drop)
    }

    /// The plan's file, line by line.
    fn lines(&self) -> impl Iterator<Item = Result<Vec<u8>>> + '_ {
        self.records.iter().enumerate().map(|(number, record)| {
            let line = PlanLine {
                record: number as u64,
                input: Shown::of(&record.path),
                output: Shown::of(&record.output),
                settings_sha256: hex(&record.settings_sha256),
            };
            let mut bytes = serde_json::to_vec(&line).map_err(|error| Error::io(format!("no JSON: {error}")))?;
            bytes.push(b'\n');
            Ok(bytes)
        })
    }
}

/// Name of the plan in the folder of results.
pub const PLAN: &str = "plan.jsonl";

/// The plan that a folder of results was made by, and its fingerprint.
///
/// # Errors
/// `Malformed` where there is none or it is damaged.
pub fn stored(results: &Path) -> Result<(Vec<PlanLine>, String)> {
    let path = results.join(PLAN);
    let place = || crate::place::Place::file(path.display().to_string());
    let bytes = std::fs::read(&path).map_err(|error| {
        Error::malformed(format!("no plan of a batch: {error}"))
            .remedy("give the folder that batch wrote --into")
            .at(place())
    })?;
    let lines = bytes.split(|byte| *byte == b'\n').filter(|line| !line.is_empty());
    let lines = lines.enumerate().map(|(number, line)| {
        let parsed = serde_json::from_slice::<PlanLine>(line).ok().filter(|line| line.record == number as u64);
        parsed.ok_or_else(|| {
            Error::malformed("not a line of a plan")
                .remedy("run the batch again: it writes the plan anew")
                .at(crate::place::Place::line(number as u64 + 1))
                .at(place())
        })
    });
    Ok((lines.collect::<Result<_>>()?, hex(&Sha256::digest(&bytes))))
}

/// Lower-case hex.
pub fn hex(bytes: &[u8]) -> String {
    bytes.iter().map(|byte| format!("{byte:02x}")).collect()
}

/// From lower-case hex.
pub fn fingerprint(hex: &str) -> Option<Fingerprint> {
    let mut bytes = [0; 32];
    if hex.len() != 64 || !hex.is_ascii() {
        return None;
    }
    for (byte, at) in bytes.iter_mut().zip((0..64).step_by(2)) {
        *byte = u8::from_str_radix(&hex[at..at + 2], 16).ok()?;
    }
    Some(bytes)
}

/// Another version may round differently: it counts as other options.
fn fingerprint_of(settings: &Settings) -> Result<Fingerprint> {
    let known = (Tool::THIS.version, settings.to_map());
    let json = serde_json::to_vec(&known).map_err(|error| Error::io(format!("no JSON: {error}")))?;
    Ok(Sha256::digest(json).into())
}

/// Names shown of many at most.
const SHOWN: usize = 5;

/// Two names of one file, with the same options, are one record; two files with one output are an error.
fn refuse_collisions(records: &mut [Planned]) -> Result<()> {
    let mut first: HashMap<OsString, usize> = HashMap::with_capacity(records.len());
    let mut collisions = Vec::new();
    for number in 0..records.len() {
        // A file system may take A.csv and a.csv for one name; on one that does not, a batch rarely needs both.
        let key = records[number].output.as_os_str().to_ascii_lowercase();
        let Some(&earlier) = first.get(&key) else {
            first.insert(key, number);
            continue;
        };
        let (one, other) = (&records[earlier], &records[number]);
        let same = one.output == other.output
            && one.settings_sha256 == other.settings_sha256
            && (one.path == other.path || is_same_file(&one.path, &other.path));
        if same {
            records[number].same_as = Some(earlier as u64);
        } else {
            collisions.push((earlier, number));
        }
    }
    if collisions.is_empty() {
        return Ok(());
    }
    let shown = |path: &Path| escape(&path.to_string_lossy());
    let pairs: Vec<String> = (collisions.iter().take(SHOWN))
        .map(|&(one, other)| {
            let (one, other) = (&records[one], &records[other]);
            format!("{} and {} (as {})", shown(&one.path), shown(&other.path), shown(&other.output))
        })
        .collect();
    let more = collisions.len().saturating_sub(SHOWN);
    let more = if more > 0 { format!("; and {more} more") } else { String::new() };
    Err(Error::usage(format!("records with one output name: {}{more}", pairs.join("; ")))
        .remedy("tell them apart with --name \"{folder}/{name}\" or by column output of a manifest"))
}

/// Folders are resolved once each: a list of a hundred thousand names has few.
fn refuse_inputs_as_outputs(records: &[Planned], into: &Path) -> Result<()> {
    let Ok(into) = std::fs::canonicalize(into) else { return Ok(()) };
    let mut folders: HashMap<PathBuf, Option<PathBuf>> = HashMap::new();
    let mut inputs = HashSet::new();
    for record in records {
        let parent = record.path.parent().filter(|p| !p.as_os_str().is_empty()).unwrap_or(Path::new("."));
        if !folders.contains_key(parent) {
            let found =
                std::fs::canonicalize(parent).ok().and_then(|real| real.strip_prefix(&into).ok().map(Path::to_owned));
            folders.insert(parent.to_owned(), found);
        }
        if let (Some(Some(inside)), Some(name)) = (folders.get(parent), record.path.file_name()) {
            inputs.insert(inside.join(name));
        }
    }
    match records.iter().find(|record| inputs.contains(&record.output)) {
        None => Ok(()),
        Some(record) => {
            let what = format!("the output \"{}\" would replace an input", escape(&record.output.to_string_lossy()));
            Err(Error::usage(what).remedy("give another folder with --into or other names with --name"))
        }
    }
}

/// The folder of results inside an output folder.
pub fn results_of(into: &Path) -> PathBuf {
    into.join(RESULTS)
}

#[cfg(test)]
mod tests {
    use super::*;

    fn plan(paths: &[&str], template: &str) -> Result<Plan> {
        let items = paths.iter().map(Item::new).collect();
        let template = Template::parse(template)?;
        Plan::new(items, &Recipe::default(), &Layer::default(), &template, Path::new("/nowhere/at/all"))
    }

    #[test]
    fn collisions_are_found_and_told() {
        let error = plan(&["a/x.csv", "b/x.csv", "c/y.csv", "d/Y.csv"], "{name}").expect_err("collisions").to_string();
        assert!(error.contains("a/x.csv and b/x.csv (as x.csv)") && error.contains("d/Y.csv"), "{error}");
        assert!(plan(&["a/x.csv", "b/x.csv"], "{folder}/{name}").is_ok());
        assert!(plan(&["a/x.csv", "b/x.csv"], "{number}_{name}").is_ok());
        assert!(plan(&[], "{name}").is_err());
    }

    #[test]
    fn the_fingerprint_follows_names_order_and_options() {
        let one = plan(&["a", "b"], "{name}").expect("a plan").sha256;
        assert_eq!(one, plan(&["a", "b"], "{name}").expect("a plan").sha256);
        assert_ne!(one, plan(&["b", "a"], "{name}").expect("a plan").sha256);
        assert_ne!(one, plan(&["a", "b"], "{name}.csv").expect("a plan").sha256);
        let mut flags = Layer::default();
        flags.add("lowpass", ["4Hz".to_owned()]).expect("a key");
        let items = ["a", "b"].iter().map(Item::new).collect();
        let other = Plan::new(items, &Recipe::default(), &flags, &Template::default(), Path::new("/nowhere"));
        assert_ne!(one, other.expect("a plan").sha256);
    }

    #[test]
    fn a_plan_comes_back_from_its_file() {
        let folder = tempfile::tempdir().expect("a folder");
        let made = plan(&["a/x.csv", "b"], "{name}").expect("a plan");
        made.store(folder.path()).expect("stored");
        let (lines, sha256) = stored(folder.path()).expect("a plan");
        assert_eq!((lines.len(), sha256), (2, made.sha256));
        assert_eq!(lines[0].output.path, "x.csv");
        assert_eq!(fingerprint(&lines[0].settings_sha256), Some(made.records[0].settings_sha256));
    }
}
