//! Files of results, one an attempt: written a group at a time, read again line by line, never appended to by another.

use std::fs::{self, File};
use std::io::{BufRead, BufReader, Read, Seek, SeekFrom, Write};
use std::path::{Path, PathBuf};

use serde::Deserialize;

use crate::error::{Error, Result};
use crate::fleet::line::{Head, Status};
use crate::fleet::shard::Shard;
use crate::place::Place;

/// A file of results being written.
pub struct Attempt {
    file: File,
    path: PathBuf,
    head: u64,
    written: u64,
}

/// Room kept for results, in bytes: a disk that outputs fill still takes the lines that say so.
const RESERVE: u64 = 1 << 20;

impl Attempt {
    /// Makes the file, with its head.
    ///
    /// # Errors
    /// `Io` where the folder takes none.
    pub fn create(results: &Path, shard: Shard, head: &Head) -> Result<Attempt> {
        let place = || Place::file(results.display().to_string());
        let stem = format!("{}.", shard.stem());
        let mut builder = tempfile::Builder::new();
        let (file, path) = with_permissions(builder.prefix(&stem).suffix(EXTENSION).rand_bytes(8))
            .tempfile_in(results)
            .map_err(|error| Error::io(format!("cannot write results: {}", error.kind())).at(place()))?
            .keep()
            .map_err(|error| Error::from(error.error).at(place()))?;
        let mut attempt = Attempt { file, path, head: 0, written: 0 };
        let mut line = serde_json::to_vec(head).map_err(|error| Error::io(format!("no JSON: {error}")))?;
        line.push(b'\n');
        attempt.append(&line)?;
        attempt.head = attempt.written;
        Ok(attempt)
    }

    /// Appends whole lines in one write, and waits until they are on the disk.
    ///
    /// # Errors
    /// `Io` where the disk is full or fails: what these lines tell counts as not done.
    pub fn append(&mut self, lines: &[u8]) -> Result<()> {
        let written = self.file.write_all(lines).and_then(|()| self.file.sync_data());
        written.map_err(|error| {
            Error::from(error).remedy("run the batch again: what is whole is not done again").at(self.place())
        })?;
        self.written += lines.len() as u64;
        Ok(())
    }

    /// Keeps room on the disk for the next lines.
    ///
    /// # Errors
    /// `Io` where there is none.
    pub fn reserve(&mut self) -> Result<()> {
        reserve(&self.file, self.written, RESERVE).map_err(|error| {
            Error::from(error).remedy("make room for results, then run the batch again").at(self.place())
        })
    }

    /// Gives back what room is left; a file without a result goes.
    pub fn close(self) {
        // Neither matters for what the file says.
        let _ = self.file.set_len(self.written);
        if self.written == self.head {
            let _ = fs::remove_file(&self.path);
        }
    }

    fn place(&self) -> Place {
        Place::file(self.path.display().to_string())
    }
}

/// Ends the names of result files.
const EXTENSION: &str = ".jsonl";

/// A new file gets the permissions of any other, not those of a private temporary.
#[cfg(unix)]
fn with_permissions<'b, 'p, 's>(builder: &'b mut tempfile::Builder<'p, 's>) -> &'b mut tempfile::Builder<'p, 's> {
    use std::os::unix::fs::PermissionsExt;
    builder.permissions(fs::Permissions::from_mode(0o666))
}

#[cfg(not(unix))]
fn with_permissions<'b, 'p, 's>(builder: &'b mut tempfile::Builder<'p, 's>) -> &'b mut tempfile::Builder<'p, 's> {
    builder
}

#[cfg(target_os = "linux")]
fn reserve(file: &File, from: u64, bytes: u64) -> std::io::Result<()> {
    use rustix::fs::{FallocateFlags, fallocate};
    match fallocate(file, FallocateFlags::KEEP_SIZE, from, bytes) {
        Err(rustix::io::Errno::NOSPC) => Err(rustix::io::Errno::NOSPC.into()),
        // File systems that cannot reserve do without.
        _ => Ok(()),
    }
}

#[cfg(not(target_os = "linux"))]
fn reserve(_: &File, _: u64, _: u64) -> std::io::Result<()> {
    Ok(())
}

/// The files of results in a folder, sorted by name.
///
/// # Errors
/// `Io` where the folder cannot be listed.
pub fn files(results: &Path) -> Result<Vec<PathBuf>> {
    let place = || Place::file(results.display().to_string());
    let mut files = Vec::new();
    for entry in fs::read_dir(results).map_err(|error| Error::from(error).at(place()))? {
        let path = entry.map_err(|error| Error::from(error).at(place()))?.path();
        let name = path.file_name().unwrap_or_default().to_string_lossy().into_owned();
        if name.starts_with("shard-") && name.ends_with(EXTENSION) {
            files.push(path);
        }
    }
    files.sort();
    Ok(files)
}

/// A line as far as resuming and merging need it.
#[derive(Debug, Clone, Deserialize)]
pub struct Brief {
    /// Number in the list.
    pub record: u64,
    /// What became of it.
    pub status: Status,
    /// Of the input.
    pub input_sha256: Option<String>,
    /// Of the settings.
    pub settings_sha256: String,
    /// The files written.
    pub outputs: Vec<BriefOutput>,
}

/// An output of a line.
#[derive(Debug, Clone, Deserialize)]
pub struct BriefOutput {
    /// Its name.
    #[serde(flatten)]
    pub name: crate::fleet::name::Shown,
    /// SHA-256 of its bytes.
    pub sha256: String,
}

#[derive(Deserialize)]
struct BriefHead {
    plan_sha256: String,
}

/// Where a line stands.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub struct Span {
    /// Number of its file.
    pub file: u32,
    /// First byte.
    pub start: u64,
    /// Bytes, with the end of the line.
    pub length: u32,
}

/// What one file of results held beside its lines.
#[derive(Debug, Clone, Default, PartialEq, Eq)]
pub struct Reading {
    /// Fingerprint of the plan it belongs to; `None` where the head was never finished.
    pub plan_sha256: Option<String>,
    /// Lines that a kill or a full disk cut short: they count as not written.
    pub torn: u64,
}

/// Reads a file of results; `each` gets every line that is whole, with the fingerprint of the file's plan.
///
/// # Errors
/// `Io` where it cannot be read.
pub fn read(path: &Path, file: u32, each: &mut dyn FnMut(Brief, Span, &str)) -> Result<Reading> {
    let place = || Place::file(path.display().to_string());
    let opened = File::open(path).map_err(|error| Error::from(error).at(place()))?;
    let mut reader = BufReader::with_capacity(1 << 16, opened);
    let (mut reading, mut line, mut start) = (Reading::default(), Vec::new(), 0);
    loop {
        line.clear();
        let length = reader.read_until(b'\n', &mut line).map_err(|error| Error::from(error).at(place()))?;
        if length == 0 {
            return Ok(reading);
        }
        let whole = line.ends_with(b"\n");
        match (&reading.plan_sha256, whole) {
            (None, true) => match serde_json::from_slice::<BriefHead>(&line) {
                Ok(head) => reading.plan_sha256 = Some(head.plan_sha256),
                // Lines without a head tell nothing about their plan.
                Err(_) => reading.torn += 1,
            },
            (Some(plan), true) => match (serde_json::from_slice::<Brief>(&line), u32::try_from(length)) {
                (Ok(brief), Ok(length)) => each(brief, Span { file, start, length }, plan),
                _ => reading.torn += 1,
            },
            (_, false) => reading.torn += 1,
        }
        start += length as u64;
    }
}

/// The bytes of a line.
///
/// # Errors
/// `Io` where they cannot be read any more.
pub fn line_at(file: &mut File, span: Span) -> Result<Vec<u8>> {
    let mut bytes = vec![0; span.length as usize];
    file.seek(SeekFrom::Start(span.start))?;
    file.read_exact(&mut bytes)?;
    Ok(bytes)
}

#[cfg(test)]
mod tests {
    use super::*;

    fn line(record: u64) -> String {
        format!(
            "{{\"record\":{record},\"status\":\"done\",\"input_sha256\":\"aa\",\"settings_sha256\":\"bb\",\
             \"outputs\":[{{\"path\":\"x.csv\",\"sha256\":\"cc\"}}],\"other\":[1,2]}}\n"
        )
    }

    #[test]
    fn whole_lines_are_read_and_torn_ones_are_not() {
        let folder = tempfile::tempdir().expect("a folder");
        let mut attempt =
            Attempt::create(folder.path(), Shard::WHOLE, &Head::new("p", Shard::WHOLE, 9)).expect("a file");
        attempt.reserve().expect("room");
        attempt.append(format!("{}{}", line(4), line(5)).as_bytes()).expect("written");
        attempt.append(&line(6).as_bytes()[..40]).expect("written");
        let path = files(folder.path()).expect("a folder").remove(0);
        let mut found = Vec::new();
        let reading = read(&path, 3, &mut |brief, span, plan| found.push((brief.record, span, plan.to_owned())));
        assert_eq!(reading.expect("read"), Reading { plan_sha256: Some("p".to_owned()), torn: 1 });
        assert_eq!(found.iter().map(|(record, ..)| *record).collect::<Vec<_>>(), [4, 5]);
        assert!(found.iter().all(|(_, span, plan)| span.file == 3 && plan == "p"));
        let mut file = File::open(&path).expect("open");
        assert_eq!(line_at(&mut file, found[1].1).expect("a line"), line(5).as_bytes());
    }

    #[test]
    fn a_file_without_a_result_goes() {
        let folder = tempfile::tempdir().expect("a folder");
        let head = Head::new("p", Shard::WHOLE, 9);
        Attempt::create(folder.path(), Shard::WHOLE, &head).expect("a file").close();
        assert!(files(folder.path()).expect("a folder").is_empty());
    }
}
