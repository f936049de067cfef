//! Reads an archive: its header and index without decoding, any stretch of rows, and what is left of a damaged one.

use super::{END, Gaps, Header, MAGIC, VERSION};
use crate::basis::Planner;
use crate::codec::block::{self, MOST_SAMPLES, Mode};
use crate::codec::bytes::Fields;
use crate::error::{Error, Result};
use crate::place::Place;

/// An archive in memory, its header read and its blocks found.
#[derive(Debug)]
pub struct Archive<'a> {
    bytes: &'a [u8],
    /// What it says of its record.
    pub header: Header,
    /// Its blocks, in the order of the file.
    pub entries: Vec<Entry>,
    /// What is damaged; empty unless it was opened for recovery.
    pub lost: Vec<Lost>,
}

/// One block.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Entry {
    /// Channel, or the stamps after the last channel.
    pub stream: usize,
    /// First row.
    pub first: u64,
    /// Rows.
    pub rows: usize,
    /// Where it stands in the file.
    pub at: usize,
    /// Its bytes, checksum included.
    pub bytes: usize,
    /// How it is coded.
    pub mode: Mode,
}

/// A block that cannot be read.
#[derive(Debug, Clone, PartialEq)]
pub struct Lost {
    /// Channel and rows, where the index still tells them.
    pub rows: Option<(usize, u64, usize)>,
    /// Where it stands in the file.
    pub at: usize,
    /// Why.
    pub why: String,
}

/// The parts of a block.
struct Body<'a> {
    stream: usize,
    first: u64,
    rows: usize,
    gaps: Gaps,
    mode: Mode,
    payload: &'a [u8],
}

impl<'a> Archive<'a> {
    /// Opens an archive and checks every checksum.
    ///
    /// # Errors
    /// `Malformed` with the byte where it is no archive, cut, or damaged anywhere.
    pub fn open(bytes: &'a [u8]) -> Result<Archive<'a>> {
        let (header, start) = read_header(bytes)?;
        let index = read_index(bytes)?;
        let mut archive = Archive { bytes, header, entries: Vec::new(), lost: Vec::new() };
        let mut at = start;
        for (stream, first, rows, length) in index.blocks {
            let entry = archive.entry(at, Some(length)).map_err(|error| error.at(Place::byte(at as u64, None)))?;
            if (entry.stream, entry.first, entry.rows) != (stream, first, rows) {
                return Err(damaged(at, "a block that is not the one of the index"));
            }
            at += entry.bytes;
            archive.entries.push(entry);
        }
        if at != index.at {
            return Err(damaged(at, "bytes that belong to no block"));
        }
        archive.is_complete()?;
        Ok(archive)
    }

    /// Opens what is left of a damaged archive; what is lost is named in `lost`.
    ///
    /// # Errors
    /// `Malformed` where the header itself is damaged: nothing then tells what the samples are.
    pub fn recover(bytes: &'a [u8]) -> Result<Archive<'a>> {
        let (header, start) = read_header(bytes)?;
        let mut archive = Archive { bytes, header, entries: Vec::new(), lost: Vec::new() };
        let index = read_index(bytes);
        let mut at = start;
        match index {
            Ok(index) => {
                for (stream, first, rows, length) in index.blocks {
                    match archive.entry(at, Some(length)) {
                        Ok(entry) if (entry.stream, entry.first, entry.rows) == (stream, first, rows) => {
                            archive.entries.push(entry);
                        }
                        Ok(_) => archive.lose(Some((stream, first, rows)), at, "not the block of the index"),
                        Err(error) => archive.lose(Some((stream, first, rows)), at, error.what()),
                    }
                    at = at.saturating_add(length);
                }
            }
            Err(error) => {
                archive.lose(None, bytes.len(), error.what());
                while at < bytes.len() && bytes[at] != 0 {
                    match archive.entry(at, None) {
                        Ok(entry) => {
                            at += entry.bytes;
                            archive.entries.push(entry);
                        }
                        Err(error) => {
                            archive.lose(None, at, error.what());
                            // The length of the block may still be right: the next one then starts behind it.
                            let Some(next) = frame(&bytes[at..]).ok().map(|(_, _, total)| at + total) else { break };
                            at = next;
                        }
                    }
                }
            }
        }
        Ok(archive)
    }

    /// Samples of a stream from row `first` up to before row `end`; NaN where there is no value or its block is lost.
    ///
    /// # Errors
    /// `Malformed` with the byte of a block that does not decode.
    pub fn samples(&self, stream: usize, first: u64, end: u64, planner: &Planner) -> Result<Vec<f64>> {
        // A row costs no byte where its block is lost: what a damaged header claims must not be allocated.
        let most = (self.entries.len() + self.lost.len() + 1) as u64 * MOST_SAMPLES as u64;
        if end.saturating_sub(first) > most {
            return Err(Error::malformed(format!("{end} rows in so few blocks cannot be")));
        }
        let mut out: Vec<f64> = Vec::new();
        let mut due = first;
        let mut blocks: Vec<&Entry> = self.entries.iter().filter(|entry| entry.stream == stream).collect();
        blocks.sort_by_key(|entry| entry.first);
        for entry in blocks {
            let stop = entry.first + entry.rows as u64;
            if stop <= due || entry.first >= end {
                continue;
            }
            out.extend(std::iter::repeat_n(f64::NAN, (entry.first.saturating_sub(due)) as usize));
            due = due.max(entry.first);
            let rows = self.rows(entry, planner).map_err(|error| error.at(Place::byte(entry.at as u64, None)))?;
            let upto = stop.min(end);
            out.extend(&rows[(due - entry.first) as usize..(upto - entry.first) as usize]);
            due = upto;
        }
        out.extend(std::iter::repeat_n(f64::NAN, (end.saturating_sub(due)) as usize));
        Ok(out)
    }

    /// All rows of a block.
    fn rows(&self, entry: &Entry, planner: &Planner) -> Result<Vec<f64>> {
        let body = self.body(entry.at, Some(entry.bytes))?.0;
        let missing: usize = body.gaps.iter().map(|(_, missing)| missing).sum();
        let values =
            block::decode(body.mode, body.payload, body.rows - missing, self.header.cast(body.stream), planner)?;
        if body.gaps.is_empty() {
            return Ok(values);
        }
        let mut out = Vec::with_capacity(body.rows);
        let mut rest = &values[..];
        for (before, missing) in &body.gaps {
            let (head, tail) = rest.split_at(*before);
            out.extend(head);
            out.extend(std::iter::repeat_n(f64::NAN, *missing));
            rest = tail;
        }
        out.extend(rest);
        Ok(out)
    }

    fn entry(&self, at: usize, length: Option<usize>) -> Result<Entry> {
        let (body, bytes) = self.body(at, length)?;
        Ok(Entry { stream: body.stream, first: body.first, rows: body.rows, at, bytes, mode: body.mode })
    }

    fn body(&self, at: usize, length: Option<usize>) -> Result<(Body<'a>, usize)> {
        let rest = self.bytes.get(at..).unwrap_or_default();
        let (whole, head, total) = frame(rest)?;
        if length.is_some_and(|length| length != total) {
            return Err(Error::malformed("a block of another length than the index says"));
        }
        check(&rest[..total])?;
        let mut fields = Fields::new(&whole[head..]);
        let stream = fields.length(self.header.streams().saturating_sub(1))?;
        let first = fields.count()?;
        let rows = fields.length(MOST_SAMPLES)?;
        if first.checked_add(rows as u64).is_none_or(|end| end > self.header.rows) {
            return Err(Error::malformed("a block past the last row"));
        }
        let count = fields.length(rows)?;
        let (mut gaps, mut covered) = (Gaps::new(), 0);
        for _ in 0..count {
            let gap = (fields.length(rows)?, fields.length(rows)?);
            covered += gap.0 + gap.1;
            if covered > rows {
                return Err(Error::malformed("gaps past the end of their block"));
            }
            gaps.push(gap);
        }
        let number = fields.byte()?;
        let mode = Mode::of(number).ok_or_else(|| Error::malformed(format!("a block of an unknown mode {number}")))?;
        Ok((Body { stream, first, rows, gaps, mode, payload: fields.rest() }, total))
    }

    fn lose(&mut self, rows: Option<(usize, u64, usize)>, at: usize, why: &str) {
        self.lost.push(Lost { rows, at, why: why.to_owned() });
    }

    /// Every row of every stream exactly once.
    fn is_complete(&self) -> Result<()> {
        let mut spans: Vec<(usize, u64, u64)> =
            self.entries.iter().map(|entry| (entry.stream, entry.first, entry.first + entry.rows as u64)).collect();
        spans.sort_unstable();
        let (mut stream, mut due) = (0, 0);
        let missing = |row: u64| Error::malformed(format!("rows missing or doubled from row {row} on"));
        for (own, first, end) in spans {
            if own == stream + 1 && due == self.header.rows {
                (stream, due) = (own, 0);
            }
            if own != stream || first != due {
                return Err(missing(due));
            }
            due = end;
        }
        if stream + 1 != self.header.streams() || due != self.header.rows { Err(missing(due)) } else { Ok(()) }
    }
}

/// The length field and body of the block that a slice starts with, where the body starts in it, and the block's bytes with
/// its checksum.
fn frame(rest: &[u8]) -> Result<(&[u8], usize, usize)> {
    let mut fields = Fields::new(rest);
    let length = fields.length(rest.len())?;
    let head = rest.len() - fields.rest().len();
    let total = head + length + 4;
    if length == 0 || total > rest.len() {
        return Err(Error::malformed("a block that is cut off"));
    }
    Ok((&rest[..head + length], head, total))
}

/// The checksum in the last four bytes.
fn check(sealed: &[u8]) -> Result<()> {
    let Some((content, sum)) = sealed.split_last_chunk::<4>() else {
        return Err(Error::malformed("no room for a checksum"));
    };
    if crc32c::crc32c(content) == u32::from_le_bytes(*sum) {
        return Ok(());
    }
    Err(Error::malformed("a checksum that does not agree: the bytes are damaged"))
}

fn read_header(bytes: &[u8]) -> Result<(Header, usize)> {
    let mut fields = Fields::new(bytes);
    if fields.take(MAGIC.len()).ok() != Some(&MAGIC[..]) {
        return Err(damaged(0, "not an archive of this program"));
    }
    let version = fields.byte()?;
    if version != VERSION {
        return Err(damaged(4, &format!("version {version} of the layout, not {VERSION}")));
    }
    let length = fields.length(fields.rest().len()).map_err(|error| error.at(Place::byte(5, None)))?;
    let start = bytes.len() - fields.rest().len();
    let end = start + length + 4;
    let sealed = bytes.get(..end).ok_or_else(|| damaged(start, "the header is cut off"))?;
    check(sealed).map_err(|error| error.at(Place::byte(0, None)))?;
    let header =
        Header::decode(&bytes[start..start + length]).map_err(|error| error.at(Place::byte(start as u64, None)))?;
    Ok((header, end))
}

/// Stream, first row, rows and bytes of each block, and where the index starts.
struct Index {
    blocks: Vec<(usize, u64, usize, usize)>,
    at: usize,
}

fn read_index(bytes: &[u8]) -> Result<Index> {
    let cut = || damaged(bytes.len(), "the end of the archive is missing");
    let (body, end) = bytes.split_last_chunk::<4>().ok_or_else(cut)?;
    if *end != END {
        return Err(cut());
    }
    let (body, length) = body.split_last_chunk::<4>().ok_or_else(cut)?;
    let at = body.len().checked_sub(u32::from_le_bytes(*length) as usize).ok_or_else(cut)?;
    check(&body[at..]).map_err(|error| error.at(Place::byte(at as u64, None)))?;
    let mut fields = Fields::new(&body[at..body.len() - 4]);
    if fields.byte()? != 0 {
        return Err(damaged(at, "not an index"));
    }
    // A block takes four bytes of the index at least.
    let count = fields.length(fields.rest().len() / 4)?;
    let mut blocks = Vec::with_capacity(count);
    for _ in 0..count {
        let most = bytes.len();
        blocks.push((
            fields.length(u32::MAX as usize)?,
            fields.count()?,
            fields.length(MOST_SAMPLES)?,
            fields.length(most)?,
        ));
    }
    if !fields.rest().is_empty() {
        return Err(damaged(at, "bytes after the index"));
    }
    Ok(Index { blocks, at })
}

fn damaged(at: usize, what: &str) -> Error {
    Error::malformed(what).at(Place::byte(at as u64, None))
}
