//! Writes a result back into the table it came from: untouched fields byte for byte, conditioned ones anew.

use std::fs::File;
use std::io::{Cursor, Read, Write};
use std::ops::Range;
use std::sync::Arc;

use sha2::{Digest, Sha256};

use super::blocks::pump;
use super::csv::push_cell;
use super::field::{Fields, is_blank, row_end};
use super::header::{self, Change};
use super::number;
use super::{Content, Origin};
use crate::error::{Error, Result};
use crate::place::Place;
use crate::record::{Channel, ColumnRole, TextSource};

/// Whether the result fits the table.
///
/// # Errors
/// `Usage` when channels and columns, or samples and rows, differ in number; `Unsupported` when a changed unit finds no
/// place in the header.
pub(super) fn check(content: &Content<'_>, origin: &Origin<'_>) -> Result<()> {
    if origin.columns.len() != content.record.channel_count() {
        return Err(Error::usage("channels of the result and columns of the table differ in number"));
    }
    if let super::Rows::Each(rows) = origin.rows
        && rows.len() != content.record.len()
    {
        return Err(Error::usage("samples of the result and rows of the table differ in number"));
    }
    head(content, origin).map(|_| ())
}

/// Writes the table.
///
/// # Errors
/// As `check`; `Io` where the source cannot be read again or has changed, and where the sink fails.
pub(super) fn write(content: &Content<'_>, origin: &Origin<'_>, sink: &mut (dyn Write + Send)) -> Result<()> {
    check(content, origin)?;
    let plan = Plan::new(content, origin);
    let mut source = Source::open(origin)?;
    if source.byte_order_mark {
        sink.write_all(BYTE_ORDER_MARK)?;
    }
    sink.write_all(&head(content, origin)?)?;
    let len = content.record.len();
    let (mut row, mut sample) = (0_u64, 0_usize);
    let batch = || -> Result<Option<Vec<Job>>> {
        while sample < len {
            let Some((text, ends)) = source.rows()? else {
                // Samples after the last row are inserted ones, or the file has lost rows.
                let job = Job { text: Arc::default(), bytes: 0..0, row, samples: sample..len };
                sample = len;
                return Ok(Some(vec![job]));
            };
            let mut jobs = Vec::new();
            for (bytes, rows) in ends {
                let (first, start) = (row, sample);
                row += rows;
                sample = origin.rows.first_beyond(sample, row, len);
                if sample > start {
                    jobs.push(Job { text: Arc::clone(&text), bytes, row: first, samples: start..sample });
                }
            }
            if !jobs.is_empty() {
                return Ok(Some(jobs));
            }
        }
        source.finish().map(|()| None)
    };
    pump(sink, batch, |job, out| plan.format(job, out)).map_err(|error| error.at(place(origin)))
}

const BYTE_ORDER_MARK: &[u8] = b"\xef\xbb\xbf";

/// Bytes of text read at a time, and bytes that one worker takes of them.
const BLOCK_BYTES: usize = 4 << 20;
const JOB_BYTES: usize = 256 << 10;

/// Some rows of the source, and the samples that come from them or are inserted among them.
struct Job {
    text: Arc<Vec<u8>>,
    bytes: Range<usize>,
    row: u64,
    samples: Range<usize>,
}

fn head(content: &Content<'_>, origin: &Origin<'_>) -> Result<Vec<u8>> {
    let channels: Vec<Channel<'_>> = content.record.channels().collect();
    let mut changes = Vec::new();
    let mut added = Vec::new();
    for ((channel, column), old) in channels.iter().zip(&origin.columns).zip(&origin.units) {
        match *column {
            Some(column) if old != channel.unit => changes.push(Change { column, old, new: channel.unit }),
            Some(_) => {}
            None => added.push((channel.name.to_owned(), channel.unit.label().to_owned())),
        }
    }
    added.extend(content.extra.iter().map(|extra| (extra.name.to_owned(), String::new())));
    header::rewrite(&origin.layout, &changes, &added)
}

fn place(origin: &Origin<'_>) -> Place {
    match &origin.layout.text {
        TextSource::File(path) => Place::file(path.display().to_string()),
        TextSource::Held(_) => Place::default(),
    }
}

fn changed() -> Error {
    Error::io("the file has changed since it was read").remedy("run it again")
}

/// What becomes of each column.
struct Plan<'a> {
    content: Content<'a>,
    origin: &'a Origin<'a>,
    channels: Vec<Channel<'a>>,
    /// Channel that takes the place of each table column.
    replaced: Vec<Option<usize>>,
    /// Channels that become columns at the right.
    added: Vec<usize>,
    /// Columns up to the last replaced one: all that must be looked at where nothing is added.
    looked_at: usize,
}

impl<'a> Plan<'a> {
    fn new(content: &Content<'a>, origin: &'a Origin<'a>) -> Plan<'a> {
        let mut replaced = vec![None; origin.layout.columns.len()];
        let mut added = Vec::new();
        for (channel, column) in origin.columns.iter().enumerate() {
            match column.and_then(|column| replaced.get_mut(column)) {
                Some(slot) => *slot = Some(channel),
                None => added.push(channel),
            }
        }
        let last = replaced.iter().rposition(Option::is_some).map_or(0, |last| last + 1);
        let widened = !added.is_empty() || !content.extra.is_empty();
        let looked_at = if widened { replaced.len() } else { last };
        Plan { content: *content, origin, channels: content.record.channels().collect(), replaced, added, looked_at }
    }

    fn format(&self, job: &Job, out: &mut Vec<u8>) -> Result<()> {
        let text = &job.text[job.bytes.clone()];
        let (mut row, mut sample) = (job.row, job.samples.start);
        let lines = Lines { text, at: 0, line_end: line_end(self.origin) };
        for line in lines {
            while sample < job.samples.end && self.origin.rows.row(sample).is_none() {
                self.inserted(sample, out)?;
                sample += 1;
            }
            if sample < job.samples.end && self.origin.rows.row(sample) == Some(row) {
                self.row(line, sample, out)?;
                sample += 1;
            }
            row += 1;
        }
        for sample in sample..job.samples.end {
            if self.origin.rows.row(sample).is_some() {
                return Err(changed());
            }
            self.inserted(sample, out)?;
        }
        Ok(())
    }

    /// A source row with its conditioned fields replaced.
    fn row(&self, line: &[u8], sample: usize, out: &mut Vec<u8>) -> Result<()> {
        let delimiter = self.origin.layout.delimiter;
        let mut copied = 0;
        let mut column = 0;
        let mut fields = Fields::new(line, delimiter);
        for span in fields.by_ref().take(self.looked_at) {
            if let Some(channel) = self.replaced[column] {
                out.extend_from_slice(&line[copied..span.outer_start]);
                let lead = out.len();
                out.extend_from_slice(&line[span.outer_start..span.start]);
                let quoted = span.start > span.outer_start && line[span.start - 1] == b'"';
                if delimiter == b' ' && !quoted {
                    self.aligned(channel, sample, (lead, span.end - span.outer_start, column), out);
                } else {
                    self.value(channel, sample, quoted, out);
                }
                copied = span.end;
            }
            column += 1;
        }
        if self.added.is_empty() && self.content.extra.is_empty() {
            if column < self.looked_at {
                return Err(changed());
            }
            out.extend_from_slice(&line[copied..]);
        } else {
            // The table's own columns, no more: an empty field after a trailing delimiter would shift the added ones.
            let end = fields
                .next()
                .map_or(line.len(), |rest| rest.outer_start.saturating_sub(usize::from(delimiter != b' ')));
            out.extend_from_slice(&line[copied.min(end)..end]);
            self.blanks(column, out);
            self.right(sample, out)?;
        }
        out.extend_from_slice(self.origin.layout.newline.as_bytes());
        Ok(())
    }

    /// A row that the source does not have.
    fn inserted(&self, sample: usize, out: &mut Vec<u8>) -> Result<()> {
        let layout = &self.origin.layout;
        for (column, replaced) in self.replaced.iter().enumerate() {
            if column > 0 {
                out.push(layout.delimiter);
            }
            match (replaced, layout.columns.get(column), self.origin.stamps) {
                (Some(channel), ..) => self.value(*channel, sample, false, out),
                (None, Some(ColumnRole::Stamps), Some(stamps)) => {
                    super::field::push_field(out, &stamps(sample), layout.delimiter);
                }
                _ => self.blank(out),
            }
        }
        self.right(sample, out)?;
        out.extend_from_slice(layout.newline.as_bytes());
        Ok(())
    }

    /// A conditioned value; in quotes where its decimal mark is the delimiter and the source has none.
    fn value(&self, channel: usize, sample: usize, quoted: bool, out: &mut Vec<u8>) {
        let layout = &self.origin.layout;
        let quote = layout.delimiter == layout.decimal && !quoted;
        out.extend(quote.then_some(b'"'));
        number::push(out, self.channels[channel].samples[sample], self.content.digits, layout.decimal);
        out.extend(quote.then_some(b'"'));
    }

    /// A conditioned value in a column aligned by blanks: it ends where the old one ended, if it is short enough.
    fn aligned(&self, channel: usize, sample: usize, (lead, width, column): (usize, usize, usize), out: &mut Vec<u8>) {
        let start = out.len();
        self.value(channel, sample, true, out);
        let digits = out.len() - start;
        let blanks = width.saturating_sub(digits).max(usize::from(column > 0));
        let kept = start - lead;
        if blanks > kept {
            out.splice(start..start, std::iter::repeat_n(b' ', blanks - kept));
        } else {
            out.drain(lead + blanks..start);
        }
    }

    /// Fills a short row up to the table's width.
    fn blanks(&self, column: usize, out: &mut Vec<u8>) {
        for _ in column..self.replaced.len() {
            out.push(self.origin.layout.delimiter);
            self.blank(out);
        }
    }

    /// A field without a value. Between blanks it needs a word, or the columns would shift.
    fn blank(&self, out: &mut Vec<u8>) {
        if self.origin.layout.delimiter == b' ' {
            out.extend_from_slice(b"nan");
        }
    }

    /// Added channels and extra columns.
    fn right(&self, sample: usize, out: &mut Vec<u8>) -> Result<()> {
        let layout = &self.origin.layout;
        for &channel in &self.added {
            out.push(layout.delimiter);
            self.value(channel, sample, false, out);
        }
        for extra in self.content.extra {
            out.push(layout.delimiter);
            let start = out.len();
            push_cell(out, extra, sample, self.content.digits, layout.decimal)?;
            if out.len() == start {
                self.blank(out);
            } else if out[start..].contains(&layout.delimiter) {
                out.insert(start, b'"');
                out.push(b'"');
            }
        }
        Ok(())
    }
}

fn line_end(origin: &Origin<'_>) -> u8 {
    if origin.layout.newline == "\r" { b'\r' } else { b'\n' }
}

/// Rows of a text without their line ends; blank lines are no rows.
struct Lines<'a> {
    text: &'a [u8],
    at: usize,
    line_end: u8,
}

impl<'a> Iterator for Lines<'a> {
    type Item = &'a [u8];

    fn next(&mut self) -> Option<&'a [u8]> {
        while self.at < self.text.len() {
            let end = row_end(self.text, self.at, self.line_end).unwrap_or(self.text.len());
            let line = &self.text[self.at..end];
            self.at = end + 1;
            let line = line.strip_suffix(b"\r").unwrap_or(line);
            if !line.iter().all(|&byte| is_blank(byte)) {
                return Some(line);
            }
        }
        None
    }
}

/// The data block of the source, read again.
struct Source<'a> {
    reader: Box<dyn Read + Send + 'a>,
    byte_order_mark: bool,
    line_end: u8,
    /// Start of a row whose end is not read yet.
    carried: Vec<u8>,
    fingerprint: Option<(Sha256, &'a str)>,
    ended: bool,
}

impl<'a> Source<'a> {
    fn open(origin: &'a Origin<'_>) -> Result<Source<'a>> {
        let reader: Box<dyn Read + Send + 'a> = match &origin.layout.text {
            TextSource::Held(bytes) => Box::new(Cursor::new(&bytes[..])),
            TextSource::File(path) => Box::new(File::open(path).map_err(|error| Error::from(error).at(place(origin)))?),
        };
        let fingerprint = origin.sha256.as_deref().map(|expected| (Sha256::new(), expected));
        let mut source = Source {
            reader,
            byte_order_mark: false,
            line_end: line_end(origin),
            carried: Vec::new(),
            fingerprint,
            ended: false,
        };
        source.pass_head(origin.layout.head.as_bytes()).map_err(|error| error.at(place(origin)))?;
        Ok(source)
    }

    /// Passes over the head, which must be as it was; a byte order mark before it belongs to the file, not to the text.
    fn pass_head(&mut self, head: &[u8]) -> Result<()> {
        let mut lead = Vec::new();
        self.pull(&mut lead, BYTE_ORDER_MARK.len())?;
        self.byte_order_mark = lead == BYTE_ORDER_MARK && !head.starts_with(BYTE_ORDER_MARK);
        if self.byte_order_mark {
            lead.clear();
        }
        if head.len() > lead.len() {
            let missing = head.len() - lead.len();
            self.pull(&mut lead, missing)?;
        }
        let Some(rest) = lead.strip_prefix(head) else { return Err(changed()) };
        self.carried = rest.to_vec();
        Ok(())
    }

    /// Appends up to `count` bytes of the file.
    fn pull(&mut self, text: &mut Vec<u8>, count: usize) -> Result<()> {
        let start = text.len();
        let got = (&mut self.reader).take(count as u64).read_to_end(text)?;
        self.ended |= got < count;
        if let Some((hash, _)) = &mut self.fingerprint {
            hash.update(&text[start..]);
        }
        Ok(())
    }

    /// The next whole rows, and where to part them: byte ranges with their numbers of rows. `None` at the end.
    #[expect(clippy::type_complexity, reason = "a pair of the text and its parts, used once")]
    fn rows(&mut self) -> Result<Option<(Arc<Vec<u8>>, Vec<(Range<usize>, u64)>)>> {
        let mut text = std::mem::take(&mut self.carried);
        let (mut parts, mut at, mut start, mut rows) = (Vec::new(), 0, 0, 0);
        loop {
            if !self.ended {
                text.reserve_exact(BLOCK_BYTES);
                self.pull(&mut text, BLOCK_BYTES)?;
            }
            let last = if self.ended { Some(text.len()) } else { None };
            while at < text.len() {
                let Some(end) = row_end(&text, at, self.line_end).or(last) else { break };
                rows += u64::from(!text[at..end].iter().all(|&byte| is_blank(byte) || byte == b'\r'));
                at = (end + 1).min(text.len());
                if at - start >= JOB_BYTES {
                    parts.push((start..at, rows));
                    (start, rows) = (at, 0);
                }
            }
            // One row longer than a block: read on.
            if at > 0 || self.ended {
                break;
            }
        }
        if at > start {
            parts.push((start..at, rows));
        }
        self.carried = text[at..].to_vec();
        Ok((!parts.is_empty()).then(|| (Arc::new(text), parts)))
    }

    /// Reads what is left and compares the fingerprint.
    fn finish(&mut self) -> Result<()> {
        let mut text = Vec::new();
        while self.fingerprint.is_some() && !self.ended {
            text.clear();
            self.pull(&mut text, BLOCK_BYTES)?;
        }
        let Some((hash, expected)) = self.fingerprint.take() else { return Ok(()) };
        let found: String = hash.finalize().iter().map(|byte| format!("{byte:02x}")).collect();
        if found == expected { Ok(()) } else { Err(changed()) }
    }
}
