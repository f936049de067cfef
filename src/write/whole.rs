//! An output appears whole or not at all: it is checked before computing, written beside its place, and renamed.

use std::collections::BTreeSet;
use std::fs::{self, File};
use std::io::{self, ErrorKind, Write};
use std::path::{Path, PathBuf};
use std::sync::{Mutex, MutexGuard, PoisonError};

use rayon::prelude::*;
use tempfile::{NamedTempFile, TempPath};

use crate::error::{Error, Result};
use crate::place::Place;
use crate::read::Fingerprint;

/// What to do with a file that is in the way.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Default)]
pub enum Overwrite {
    /// Leave it and refuse.
    #[default]
    Refuse,
    /// Replace it, unless it is an input: measured data are never replaced.
    Force,
}

/// When an output counts as finished. A killed program leaves no partial file either way; a power failure may, where nobody
/// waited for the disk.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Default)]
pub enum Durability {
    /// When the system has taken it.
    #[default]
    Handed,
    /// When it is on the disk, name and all.
    OnDisk,
}

/// An output being written. Dropped before `finish`, it leaves nothing behind.
pub struct Pending<'a> {
    label: String,
    sink: Sink<'a>,
    fingerprint: Fingerprint,
}

enum Sink<'a> {
    /// A temporary file in the folder of `target`.
    Whole { file: NamedTempFile, target: PathBuf, overwrite: Overwrite, listed: Listed },
    /// A pipe or device: bytes are gone once written.
    Stream(Box<dyn Write + Send + 'a>),
}

/// A finished output.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Written {
    /// The path as the user gave it, `-` for standard output.
    pub path: String,
    /// SHA-256 of the bytes, lower-case hex.
    pub sha256: String,
    /// Number of bytes.
    pub bytes: u64,
}

impl<'a> Pending<'a> {
    /// Opens an output at `path` and makes sure beforehand that it can be finished: the folder exists and takes files, and
    /// nothing stands in the way, least of all an input. A device or named pipe is written directly.
    ///
    /// # Errors
    /// `Io` where the folder is missing or closed, or where a file is in the way and `overwrite` does not allow it.
    pub fn create(path: &Path, inputs: &[&Path], overwrite: Overwrite) -> Result<Pending<'a>> {
        let label = path.display().to_string();
        let sink = open(path, inputs, overwrite).map_err(|error| error.at(Place::file(label.clone())))?;
        Ok(Pending { label, sink, fingerprint: Fingerprint::default() })
    }

    /// An output that streams into `sink`, such as standard output under the label `-`.
    pub fn stream(label: &str, sink: impl Write + Send + 'a) -> Pending<'a> {
        Pending { label: label.to_owned(), sink: Sink::Stream(Box::new(sink)), fingerprint: Fingerprint::default() }
    }

    /// Makes the output appear.
    ///
    /// # Errors
    /// `Io` with the path and the cause; the target is then as it was. `Closed` when the reader of a pipe went away.
    pub fn finish(mut self) -> Result<Written> {
        self.flush().map_err(|error| self.placed(error.into()))?;
        self.publish().map_err(|error| self.placed(error))?;
        Ok(self.written())
    }

    /// SHA-256 of the bytes so far, lower-case hex.
    pub fn fingerprint(&mut self) -> String {
        self.fingerprint.so_far()
    }

    /// The name as the user gave it.
    pub fn label(&self) -> &str {
        &self.label
    }

    /// Everything onto the disk, under the temporary name.
    fn settle(&mut self) -> Result<()> {
        match &mut self.sink {
            Sink::Whole { file, .. } => Ok(file.as_file().sync_all()?),
            Sink::Stream(sink) => Ok(sink.flush()?),
        }
    }

    /// The temporary name becomes the target's; returns the folder whose entry changed.
    fn publish(&mut self) -> Result<Option<PathBuf>> {
        let spent = std::mem::replace(&mut self.sink, Sink::Stream(Box::new(io::sink())));
        let Sink::Whole { file, target, overwrite, listed } = spent else { return Ok(None) };
        rename(file.into_temp_path(), &target, overwrite)?;
        drop(listed);
        Ok(Some(folder_of(&target)))
    }

    fn written(self) -> Written {
        let (sha256, bytes) = self.fingerprint.finish();
        Written { path: self.label, sha256, bytes }
    }

    /// An error of this output, with its name unless it tells another place.
    pub(super) fn placed(&self, error: Error) -> Error {
        error.at(Place::file(self.label.clone()))
    }
}

impl Write for Pending<'_> {
    fn write(&mut self, buffer: &[u8]) -> io::Result<usize> {
        let count = match &mut self.sink {
            Sink::Whole { file, .. } => file.write(buffer),
            Sink::Stream(sink) => sink.write(buffer),
        }?;
        self.fingerprint.update(&buffer[..count]);
        Ok(count)
    }

    fn flush(&mut self) -> io::Result<()> {
        match &mut self.sink {
            Sink::Whole { file, .. } => file.flush(),
            Sink::Stream(sink) => sink.flush(),
        }
    }
}

/// Makes the outputs of one job appear, all or none: every content is there before the first name is, and a name that cannot
/// be given takes back the new ones before it.
///
/// # Errors
/// Those of the first output that cannot be finished.
pub fn finish_together(mut outputs: Vec<Pending<'_>>, durability: Durability) -> Result<Vec<Written>> {
    for output in &mut outputs {
        let ready = match durability {
            Durability::Handed => output.flush().map_err(Error::from),
            Durability::OnDisk => output.settle(),
        };
        ready.map_err(|error| output.placed(error))?;
    }
    let (mut written, mut folders, mut fresh) = (Vec::new(), BTreeSet::new(), Vec::new());
    for mut output in outputs {
        let new = match &output.sink {
            Sink::Whole { target, .. } if !target.exists() => Some(target.clone()),
            _ => None,
        };
        match output.publish() {
            Ok(folder) => folders.extend(folder),
            Err(error) => {
                // What cannot be taken back stays: the error tells that the job failed.
                fresh.iter().for_each(|path| drop(fs::remove_file(path)));
                return Err(output.placed(error));
            }
        }
        fresh.extend(new);
        written.push(output.written());
    }
    if durability == Durability::OnDisk {
        folders.iter().for_each(|folder| sync_folder(folder));
    }
    Ok(written)
}

/// Finishes the outputs of many jobs at the cost of few waits for the disk: first all contents, then all names, then the
/// folders. Results come in the order of the outputs. Waits run on the threads of the current pool.
pub fn finish_all(outputs: Vec<Pending<'_>>) -> Vec<Result<Written>> {
    let settled: Vec<Result<Pending<'_>>> = outputs
        .into_par_iter()
        .map(|mut output| match output.settle() {
            Ok(()) => Ok(output),
            Err(error) => Err(output.placed(error)),
        })
        .collect();
    let mut folders = BTreeSet::new();
    let results = settled
        .into_iter()
        .map(|output| {
            let mut output = output?;
            let folder = output.publish().map_err(|error| output.placed(error))?;
            folders.extend(folder);
            Ok(output.written())
        })
        .collect();
    folders.iter().for_each(|folder| sync_folder(folder));
    results
}

/// Refuses two outputs under one name, whatever the spelling: the second would replace the first.
///
/// # Errors
/// `Usage` that names the file.
pub fn refuse_twins(paths: &[&Path]) -> Result<()> {
    let resolved: Vec<PathBuf> = paths.iter().map(|path| resolved(path)).collect();
    for (index, path) in resolved.iter().enumerate() {
        // A device takes any number of outputs.
        if resolved[..index].contains(path) && (!path.exists() || path.is_file()) {
            let what = format!("two outputs would go to {:?}", paths[index].display());
            return Err(Error::usage(what).remedy("give each a name of its own"));
        }
    }
    Ok(())
}

/// The path with links followed, as far as it exists.
fn resolved(path: &Path) -> PathBuf {
    fs::canonicalize(path).unwrap_or_else(|_| match (fs::canonicalize(folder_of(path)), path.file_name()) {
        (Ok(folder), Some(name)) => folder.join(name),
        _ => path.to_path_buf(),
    })
}

/// Removes every temporary file of outputs that are not finished. For the program's interrupt handler, right before it ends
/// the process: an output that is still being written can no longer be finished.
pub fn discard_pending() {
    for path in pending().iter() {
        // Already gone, or not ours to remove any more: the process ends either way.
        let _ = fs::remove_file(path);
    }
}

/// Temporary files that would stay behind if the process ended now.
static PENDING: Mutex<Vec<PathBuf>> = Mutex::new(Vec::new());

fn pending() -> MutexGuard<'static, Vec<PathBuf>> {
    PENDING.lock().unwrap_or_else(PoisonError::into_inner)
}

/// An entry among the pending files, struck out when dropped.
struct Listed(PathBuf);

impl Drop for Listed {
    fn drop(&mut self) {
        let mut listed = pending();
        if let Some(index) = listed.iter().position(|path| *path == self.0) {
            listed.swap_remove(index);
        }
    }
}

fn open<'a>(path: &Path, inputs: &[&Path], overwrite: Overwrite) -> Result<Sink<'a>> {
    // A link is followed, so that it stays a link and its file is replaced.
    let target = fs::canonicalize(path).unwrap_or_else(|_| path.to_path_buf());
    let present = fs::metadata(&target).ok();
    if let Some(present) = &present {
        if present.is_dir() {
            return Err(Error::io("a folder stands there").remedy("give the name of a file"));
        }
        if !present.is_file() {
            return Ok(Sink::Stream(Box::new(File::options().write(true).open(&target)?)));
        }
        if inputs.iter().any(|input| is_same_file(input, &target)) {
            return Err(Error::io("this is the input itself, which is never replaced").remedy("give another name"));
        }
        if overwrite == Overwrite::Refuse {
            return Err(Error::io("the file exists").remedy("replace it with --force, or give another name"));
        }
        if present.permissions().readonly() {
            return Err(Error::io("the file is write-protected"));
        }
    }
    let Some(name) = target.file_name() else {
        return Err(Error::io("this is not the name of a file"));
    };
    let folder = folder_of(&target);
    if !folder.is_dir() {
        return Err(Error::io(format!("there is no folder {:?}", folder.display())).remedy("make it first"));
    }
    let prefix = format!(".{}.", name.to_string_lossy().chars().take(NAME_CHARS).collect::<String>());
    // The list is held while the file is made, so that an interrupt finds either both or neither.
    let mut listed = pending();
    let file = temporary(&prefix, present.as_ref())
        .tempfile_in(&folder)
        .map_err(|error| Error::io(format!("cannot write into {:?}: {}", folder.display(), cause(&error))))?;
    listed.push(file.path().to_path_buf());
    drop(listed);
    let listed = Listed(file.path().to_path_buf());
    Ok(Sink::Whole { file, target, overwrite, listed })
}

/// Characters of the target's name that the temporary name repeats: file systems end at 255 bytes.
const NAME_CHARS: usize = 40;

fn temporary<'p>(prefix: &'p str, present: Option<&fs::Metadata>) -> tempfile::Builder<'p, 'static> {
    let mut builder = tempfile::Builder::new();
    builder.prefix(prefix).suffix(".part").rand_bytes(8);
    #[cfg(unix)]
    {
        use std::os::unix::fs::PermissionsExt;
        // As any new file: the process' mask applies. A replaced file hands its own permissions on.
        let mode = present.map_or(0o666, |present| present.permissions().mode() & 0o777);
        builder.permissions(fs::Permissions::from_mode(mode));
    }
    builder
}

fn rename(file: TempPath, target: &Path, overwrite: Overwrite) -> Result<()> {
    if overwrite == Overwrite::Force {
        return Ok(file.persist(target).map_err(|error| error.error)?);
    }
    let Err(refused) = file.persist_noclobber(target) else { return Ok(()) };
    if refused.error.kind() == ErrorKind::AlreadyExists {
        return Err(Error::io("a file has appeared there meanwhile").remedy("replace it with --force"));
    }
    // A file system that knows no such rename: the check before computing stands.
    if target.exists() {
        return Err(refused.error.into());
    }
    Ok(refused.path.persist(target).map_err(|error| error.error)?)
}

/// A new name is safe once its folder is on the disk; file systems without such a wait lose nothing by its failure.
fn sync_folder(folder: &Path) {
    if let Ok(handle) = File::open(folder) {
        let _ = handle.sync_all();
    }
}

fn folder_of(target: &Path) -> PathBuf {
    match target.parent() {
        Some(parent) if !parent.as_os_str().is_empty() => parent.to_path_buf(),
        _ => PathBuf::from("."),
    }
}

/// True where two names lead to one file.
pub fn is_same_file(left: &Path, right: &Path) -> bool {
    #[cfg(unix)]
    {
        use std::os::unix::fs::MetadataExt;
        if let (Ok(left), Ok(right)) = (fs::metadata(left), fs::metadata(right)) {
            return (left.dev(), left.ino()) == (right.dev(), right.ino());
        }
    }
    matches!((fs::canonicalize(left), fs::canonicalize(right)), (Ok(left), Ok(right)) if left == right)
}

/// The cause without the path that the temporary-file library adds: its random name means nothing to anyone.
fn cause(error: &io::Error) -> String {
    match error.raw_os_error() {
        Some(code) => io::Error::from_raw_os_error(code).to_string(),
        None => io::Error::from(error.kind()).to_string(),
    }
}
