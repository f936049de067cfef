//! What earlier attempts have finished: a record is not done again where its input, its options and its output agree.

use std::collections::HashMap;
use std::fs::File;
use std::io::{self, Read};
use std::path::{Path, PathBuf};

use serde_json::Value;
use sha2::{Digest, Sha256};

use crate::error::Result;
use crate::fleet::attempt::{self, Span};
use crate::fleet::line::Status;
use crate::fleet::plan::{Fingerprint, Plan, Planned, fingerprint};
use crate::fleet::shard::Shard;

/// The lines of earlier attempts that may stand for a record of this plan.
#[derive(Debug, Default)]
pub struct Earlier {
    files: Vec<PathBuf>,
    lines: HashMap<u64, Vec<Known>>,
}

#[derive(Debug, Clone, Copy)]
struct Known {
    input: Fingerprint,
    output: Fingerprint,
    span: Span,
    /// The line stands under this plan already.
    planned: bool,
}

/// How an earlier line stands for a record.
pub enum Standing {
    /// It is in a file of this very plan.
    Here,
    /// It was written under another plan; this is it under the record's number in this one.
    Moved(Vec<u8>),
}

impl Earlier {
    /// Reads all files of results for what concerns one shard.
    ///
    /// # Errors
    /// `Io` where they cannot be read.
    pub fn read(results: &Path, plan: &Plan, shard: Shard) -> Result<Earlier> {
        let files = attempt::files(results)?;
        if files.is_empty() {
            return Ok(Earlier::default());
        }
        // A repeated name shares its output with the record that it repeats, whose line it is.
        let own = plan.records.iter().enumerate();
        let own = own.filter(|(number, record)| shard.holds(*number as u64) && record.same_as.is_none());
        let by_output: HashMap<&Path, u64> =
            own.map(|(number, record)| (record.output.as_path(), number as u64)).collect();
        let mut lines: HashMap<u64, Vec<Known>> = HashMap::new();
        for (index, path) in files.iter().enumerate() {
            attempt::read(path, index as u32, &mut |brief, span, plan_sha256| {
                let planned = plan_sha256 == plan.sha256;
                let [output] = brief.outputs.as_slice() else { return };
                let name = output.name.name();
                let Some(&number) = name.as_deref().and_then(|name| by_output.get(name)) else { return };
                let settings = fingerprint(&brief.settings_sha256);
                if brief.status != Status::Done || settings != Some(plan.records[number as usize].settings_sha256) {
                    return;
                }
                if planned && brief.record != number {
                    return;
                }
                let input = brief.input_sha256.as_deref().and_then(fingerprint);
                if let (Some(input), Some(output)) = (input, fingerprint(&output.sha256)) {
                    lines.entry(number).or_default().push(Known { input, output, span, planned });
                }
            })?;
        }
        // Lines of this plan first: nothing then needs to be written again.
        lines.values_mut().for_each(|known| known.sort_by_key(|known| !known.planned));
        Ok(Earlier { files, lines })
    }

    /// How a record stands: `None` where it is to be done.
    pub fn standing(&self, number: u64, record: &Planned, into: &Path) -> Option<Standing> {
        let known = self.lines.get(&number)?;
        let output = fingerprint_of_file(&into.join(&record.output)).ok()?;
        if !known.iter().any(|known| known.output == output) {
            return None;
        }
        let input = fingerprint_of_file(&record.path).ok()?;
        let found = known.iter().find(|known| known.output == output && known.input == input)?;
        if found.planned {
            return Some(Standing::Here);
        }
        let mut file = File::open(self.files.get(found.span.file as usize)?).ok()?;
        let line = attempt::line_at(&mut file, found.span).ok()?;
        renumbered(&line, number, &record.path).map(Standing::Moved)
    }
}

/// The line with the record's number and name in this plan.
fn renumbered(line: &[u8], number: u64, path: &Path) -> Option<Vec<u8>> {
    let Ok(Value::Object(mut map)) = serde_json::from_slice(line) else { return None };
    map.insert("record".to_owned(), number.into());
    map.remove("path_bytes");
    let Ok(Value::Object(name)) = serde_json::to_value(crate::fleet::name::Shown::of(path)) else { return None };
    map.extend(name);
    let mut bytes = serde_json::to_vec(&map).ok()?;
    bytes.push(b'\n');
    Some(bytes)
}

/// SHA-256 of a regular file's bytes.
///
/// # Errors
/// What the system tells; a pipe or device is refused, since reading it would change or never end it.
pub fn fingerprint_of_file(path: &Path) -> io::Result<Fingerprint> {
    if !std::fs::metadata(path)?.is_file() {
        return Err(io::Error::other("not a regular file"));
    }
    let mut file = File::open(path)?;
    let (mut digest, mut buffer) = (Sha256::new(), vec![0; 1 << 16]);
    loop {
        match file.read(&mut buffer) {
            Ok(0) => return Ok(digest.finalize().into()),
            Ok(count) => digest.update(&buffer[..count]),
            Err(error) if error.kind() == io::ErrorKind::Interrupted => {}
            Err(error) => return Err(error),
        }
    }
}
