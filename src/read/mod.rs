//! Reading a record from a file or a stream: right numbers, or a remark that says which guess was made, or an error that says where.
//!
//! Each format is one row of `READERS`. The row's function sees the stream from its first byte; opening, fingerprint, units
//! and calibration are the same for all and done here.

mod csv;
mod fingerprint;
mod options;
mod selection;
mod wav;

use std::fs::File;
use std::io::{self, Cursor, ErrorKind, Read};
use std::path::{Path, PathBuf};
use std::sync::Arc;

use crate::error::{Error, Kind, Result};
use crate::place::{Place, escape};
use crate::record::{ColumnRole, Format, Layout, RawRecord, Source, TableLayout, TextSource};
use fingerprint::{Fingerprinted, Unchanged};
use selection::Candidate;

pub use fingerprint::Fingerprint;
pub use options::{Calibration, ReadOptions, refuse_beyond};

/// What to read from.
pub enum Input {
    /// A file, directory entry or pipe by path.
    Path(PathBuf),
    /// Standard input or any other stream, called `-` in messages.
    Stream(Box<dyn Read + Send>),
}

/// A format that can be read.
struct Reader {
    format: Format,
    /// True when the first bytes (up to 4096) are of this format; the extension (lower case) helps where they do not tell.
    sniff: fn(first: &[u8], extension: &str) -> bool,
    read: fn(intake: &mut Intake<'_>, options: &ReadOptions) -> Result<RawRecord>,
}

/// What a format's reader gets.
struct Intake<'a> {
    /// The stream, from its first byte.
    stream: &'a mut dyn Read,
    /// The path as the user gave it, or `-`.
    name: &'a str,
    /// The path where the file can be opened again: a regular file.
    path: Option<&'a Path>,
}

/// The formats, in the order in which they are tried; delimited text takes what is left.
static READERS: &[Reader] = &[
    Reader { format: Format::Wav, sniff: wav::is_wave, read: read_wave },
    Reader { format: Format::Csv, sniff: |_, _| true, read: csv::read },
];

/// Files that are no records but are often handed in as one: first bytes, name, what to do.
static FOREIGN: &[(&[u8], &str, &str)] = &[
    (b"\x1f\x8b", "gzip-compressed data", "unpack it first and read from standard input: gunzip -c FILE | ... -"),
    (b"\xfd7zXZ\0", "xz-compressed data", "unpack it first and read from standard input: xz -dc FILE | ... -"),
    (
        b"\x28\xb5\x2f\xfd",
        "zstd-compressed data",
        "unpack it first and read from standard input: zstd -dc FILE | ... -",
    ),
    (b"BZh", "bzip2-compressed data", "unpack it first and read from standard input: bzip2 -dc FILE | ... -"),
    (b"PK\x03\x04", "a zip archive or a spreadsheet workbook", "unpack it, or save the sheet as delimited text"),
    (b"\xd0\xcf\x11\xe0", "a spreadsheet workbook", "save the sheet as delimited text"),
    (b"\x89GRN", "an archive of this program", "restore it first: endgrain restore FILE -o -"),
    (b"\x89HDF\r\n", "an HDF5 file", "export the wanted channels as delimited text or WAV"),
    (b"%PDF", "a PDF document", "export the data as delimited text"),
];

/// Bytes shown to `sniff`.
const SNIFFED: u64 = 4096;

/// Reads a whole record.
///
/// # Errors
/// `Malformed` for what is no readable record, with file, line and column or byte; `Usage` for options that do not fit the
/// file; `Io` where the system refuses.
pub fn read(input: Input, options: &ReadOptions) -> Result<RawRecord> {
    match input {
        Input::Path(path) => {
            let name = path.display().to_string();
            read_path(&path, &name, options).map_err(|error| error.at(Place::file(&name)))
        }
        Input::Stream(stream) => read_stream(stream, "-", None, options)
            .map_err(|error| error.at(Place::file("-")))
            .map(|(record, _)| record),
    }
}

/// The decoded text of a table once more, from its first byte, as UTF-8 without a byte order mark. Reading on to the end
/// fails when the file has changed meanwhile.
///
/// # Errors
/// `Io` when the file cannot be opened again.
pub fn reopen(source: &Source, layout: &TableLayout) -> Result<Box<dyn Read + Send>> {
    match &layout.text {
        TextSource::Held(text) => Ok(Box::new(Cursor::new(Shared(Arc::clone(text))))),
        TextSource::File(path) => {
            let file = File::open(path).map_err(|error| refusal(&error).at(Place::file(path.display().to_string())))?;
            let stream = Unchanged::new(file, source.sha256.clone());
            Ok(Box::new(csv::Decoded::new(stream, layout.encoding)?))
        }
    }
}

/// WAV: what the options say of tables does not concern it.
fn read_wave(intake: &mut Intake<'_>, options: &ReadOptions) -> Result<RawRecord> {
    let wanted = wav::Options {
        allow_truncated: options.allow_truncated,
        channels: options.channels.as_deref(),
        rate_hz: options.rate.as_ref().filter(|rate| rate.unit.is_time()).map(|rate| rate.rate_base),
        memory: options.memory,
    };
    wav::read(intake.stream, intake.name, &wanted)
}

/// Text in memory, read by several at once.
struct Shared(Arc<Vec<u8>>);

impl AsRef<[u8]> for Shared {
    fn as_ref(&self) -> &[u8] {
        &self.0
    }
}

fn read_path(path: &Path, name: &str, options: &ReadOptions) -> Result<RawRecord> {
    let about = std::fs::metadata(path).map_err(|error| refusal(&error))?;
    if about.is_dir() {
        return Err(Error::malformed("this is a directory").remedy("name the files in it"));
    }
    let file = File::open(path).map_err(|error| refusal(&error))?;
    let again = about.is_file().then_some(path);
    let (record, bytes) = read_stream(Box::new(file), name, again, options)?;
    if about.is_file() && bytes < about.len() {
        let what = format!("the file shrank while it was read: {} bytes at first, then {bytes}", about.len());
        return Err(Error::new(Kind::Io, what).remedy("read it again when nothing writes to it"));
    }
    Ok(record)
}

fn read_stream(
    stream: Box<dyn Read + Send>,
    name: &str,
    path: Option<&Path>,
    options: &ReadOptions,
) -> Result<(RawRecord, u64)> {
    let mut stream = Fingerprinted::new(stream);
    let mut first = Vec::new();
    stream.by_ref().take(SNIFFED).read_to_end(&mut first)?;
    if first.is_empty() {
        return Err(Error::malformed("the file is empty (0 bytes)"));
    }
    if let Some((_, what, remedy)) = FOREIGN.iter().find(|(magic, ..)| first.starts_with(magic)) {
        return Err(Error::malformed(format!("this is {what}")).remedy(*remedy));
    }
    let extension = Path::new(name).extension().map(|e| e.to_string_lossy().to_lowercase()).unwrap_or_default();
    let Some(reader) = READERS.iter().find(|reader| (reader.sniff)(&first, &extension)) else {
        return Err(Error::malformed("no known format"));
    };
    let mut whole = Cursor::new(first).chain(&mut stream);
    let mut record = (reader.read)(&mut Intake { stream: &mut whole, name, path }, options)?;
    let (sha256, bytes) = stream.finish()?;
    record.source = Source { path: name.to_owned(), sha256, bytes, format: reader.format };
    if let Some(rate) = &options.rate {
        record.stated_rate = Some(rate.clone());
    }
    calibrate(&mut record, options)?;
    for finding in &mut record.findings {
        *finding = finding.clone().at(Place::file(name));
    }
    Ok((record, bytes))
}

/// Applies the user's units and factors.
fn calibrate(record: &mut RawRecord, options: &ReadOptions) -> Result<()> {
    if options.units.is_empty() && options.calibrate.is_empty() {
        return Ok(());
    }
    let number = |channel: usize| match &record.layout {
        Layout::Table(table) => {
            table.columns.iter().position(|role| *role == ColumnRole::Channel(channel)).unwrap_or(channel) + 1
        }
        Layout::Wave(_) => channel + 1,
    };
    let candidates: Vec<Candidate> = (record.channels.iter().enumerate())
        .map(|(index, c)| Candidate { name: c.name.clone(), header: c.name.clone(), number: number(index) })
        .collect();
    for calibration in &options.calibrate {
        let channel = &mut record.channels[selection::find(&calibration.channel, &candidates, "--calibrate")?];
        if !calibration.factor.is_finite() || calibration.factor == 0.0 {
            let what = format!("--calibrate {}: a factor of {}", escape(&calibration.channel), calibration.factor);
            return Err(Error::usage(what).remedy("give a finite factor other than 0"));
        }
        channel.values.iter_mut().for_each(|value| *value *= calibration.factor);
        channel.full_scale = channel.full_scale.map(|full| full * calibration.factor.abs());
        if let Some(unit) = &calibration.unit {
            channel.unit = unit.clone();
        }
    }
    for (name, unit) in &options.units {
        record.channels[selection::find(name, &candidates, "--unit")?].unit = unit.clone();
    }
    Ok(())
}

/// What a refusal of the system means for the user: a missing file is unreadable input, the rest is input and output.
fn refusal(error: &io::Error) -> Error {
    match error.kind() {
        ErrorKind::NotFound => Error::malformed("there is no such file"),
        ErrorKind::PermissionDenied => Error::io("permission to read it is denied"),
        _ => Error::from(io::Error::new(error.kind(), error.to_string())),
    }
}
