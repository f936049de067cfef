//! Writes a result back into the table it came from: untouched fields byte for byte, conditioned ones anew.

use std::io::{Read, Write};
use std::ops::Range;
use std::sync::Arc;

use super::blocks::pump;
use super::csv::push_cell;
use super::field::{Fields, row_end};
use super::header::{self, Change};
use super::number;
use super::{Content, Origin};
use crate::error::{Error, Result};
use crate::place::Place;
use crate::read;
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
    if let Some(sample) = origin.without_line(content.record.len()) {
        let place = Place { sample: Some(sample as u64), ..Place::default() };
        return Err(Error::usage("the result has more samples than the table has rows").at(place));
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
    sink.write_all(&head(content, origin)?)?;
    let len = content.record.len();
    let (mut line, mut sample) = (origin.layout.data_line, 0_usize);
    let at_source = |error: Error| error.at(place(origin));
    let batch = || -> Result<Option<Vec<Job>>> {
        while sample < len {
            let Some((text, ends)) = source.rows().map_err(at_source)? else {
                // Samples after the last row are inserted ones, or the file has lost rows.
                let job = Job { text: Arc::default(), bytes: 0..0, line, samples: sample..len };
                sample = len;
                return Ok(Some(vec![job]));
            };
            let mut jobs = Vec::new();
            for (bytes, lines) in ends {
                let (first, start) = (line, sample);
                line += lines;
                sample = origin.first_beyond(sample, line, len);
                if sample > start {
                    jobs.push(Job { text: Arc::clone(&text), bytes, line: first, samples: start..sample });
                }
            }
            if !jobs.is_empty() {
                return Ok(Some(jobs));
            }
        }
        source.finish().map_err(at_source).map(|()| None)
    };
    pump(sink, batch, |job, out| plan.format(job, out))
}

/// Bytes of text read at a time, and bytes that one worker takes of them.
const BLOCK_BYTES: usize = 4 << 20;
const JOB_BYTES: usize = 256 << 10;

/// Some rows of the source, and the samples that come from them or are inserted among them.
struct Job {
    text: Arc<Vec<u8>>,
    bytes: Range<usize>,
    /// Line of the file (from 1) that the bytes start with.
    line: u64,
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
        let (mut number, mut sample) = (job.line, job.samples.start);
        let lines = Lines { text, at: 0, marks: Marks::of(self.origin) };
        for (line, count) in lines {
            while sample < job.samples.end && self.origin.line(sample).is_none() {
                self.inserted(sample, out)?;
                sample += 1;
            }
            if sample < job.samples.end && self.origin.line(sample) == Some(number) {
                self.row(line, sample, out)?;
                sample += 1;
            }
            number += count;
        }
        for sample in sample..job.samples.end {
            if self.origin.line(sample).is_some() {
                return Err(changed().at(place(self.origin)));
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
                return Err(changed().at(place(self.origin)));
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
        if self.content.is_blank(channel, sample) {
            return self.blank(out);
        }
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

/// What parts fields and rows.
#[derive(Debug, Clone, Copy)]
struct Marks {
    delimiter: u8,
    line_end: u8,
}

impl Marks {
    fn of(origin: &Origin<'_>) -> Marks {
        let line_end = if origin.layout.newline == "\r" { b'\r' } else { b'\n' };
        Marks { delimiter: origin.layout.delimiter, line_end }
    }

    fn row_end(self, text: &[u8], from: usize) -> Option<(usize, u64)> {
        row_end(text, from, self.delimiter, self.line_end)
    }
}

/// Rows of a text without their line ends, each with the number of lines that it takes: more than one where line ends stand
/// in quotes.
struct Lines<'a> {
    text: &'a [u8],
    at: usize,
    marks: Marks,
}

impl<'a> Iterator for Lines<'a> {
    type Item = (&'a [u8], u64);

    fn next(&mut self) -> Option<(&'a [u8], u64)> {
        if self.at >= self.text.len() {
            return None;
        }
        let (end, count) = self.marks.row_end(self.text, self.at).unwrap_or((self.text.len(), 1));
        let line = &self.text[self.at..end];
        self.at = end + 1;
        Some((line.strip_suffix(b"\r").unwrap_or(line), count))
    }
}

/// The data block of the source, read again.
struct Source {
    reader: Box<dyn Read + Send>,
    marks: Marks,
    /// Start of a row whose end is not read yet.
    carried: Vec<u8>,
    ended: bool,
}

/// Whole rows, and where to part them: byte ranges with their numbers of lines.
type Parted = (Arc<Vec<u8>>, Vec<(Range<usize>, u64)>);

impl Source {
    fn open(origin: &Origin<'_>) -> Result<Source> {
        let reader = read::reopen(&origin.source, &origin.layout)?;
        let mut source = Source { reader, marks: Marks::of(origin), carried: Vec::new(), ended: false };
        let mut head = Vec::new();
        source.pull(&mut head, origin.layout.head.len()).map_err(|error| error.at(place(origin)))?;
        if head == origin.layout.head.as_bytes() { Ok(source) } else { Err(changed().at(place(origin))) }
    }

    /// Appends up to `count` bytes of the text.
    fn pull(&mut self, text: &mut Vec<u8>, count: usize) -> Result<()> {
        let got = (&mut self.reader).take(count as u64).read_to_end(text)?;
        self.ended |= got < count;
        Ok(())
    }

    /// The next whole rows; `None` at the end.
    fn rows(&mut self) -> Result<Option<Parted>> {
        let mut text = std::mem::take(&mut self.carried);
        let (mut parts, mut at, mut start, mut lines) = (Vec::new(), 0, 0, 0);
        // More than once only where one row is longer than a block.
        while at == 0 && (!self.ended || !text.is_empty()) {
            if !self.ended {
                text.reserve_exact(BLOCK_BYTES);
                self.pull(&mut text, BLOCK_BYTES)?;
            }
            let rest = self.ended.then_some((text.len(), 1));
            // Without a quote every line end ends a row: they need only be counted.
            let plain = memchr::memchr(b'"', &text).is_none();
            while plain && at < text.len() {
                let Some((end, count)) = self.plain_job(&text, at) else { break };
                parts.push((at..end, count));
                (at, start) = (end, end);
            }
            while !plain && at < text.len() {
                let Some((end, count)) = self.marks.row_end(&text, at).or(rest) else { break };
                lines += count;
                at = (end + 1).min(text.len());
                if at - start >= JOB_BYTES {
                    parts.push((start..at, lines));
                    (start, lines) = (at, 0);
                }
            }
        }
        if at > start {
            parts.push((start..at, lines));
        }
        self.carried = text[at..].to_vec();
        Ok((!parts.is_empty()).then(|| (Arc::new(text), parts)))
    }

    /// The end of a job's worth of rows from `at` on in a text without quotes, and their number.
    fn plain_job(&self, text: &[u8], at: usize) -> Option<(usize, u64)> {
        let line_end = self.marks.line_end;
        let goal = (at + JOB_BYTES).min(text.len());
        let within = memchr::memrchr(line_end, &text[at..goal]).map(|found| at + found + 1);
        let beyond = || memchr::memchr(line_end, &text[goal..]).map(|found| goal + found + 1);
        if let Some(end) = within.or_else(beyond) {
            return Some((end, memchr::memchr_iter(line_end, &text[at..end]).count() as u64));
        }
        self.ended.then_some((text.len(), 1))
    }

    /// Reads what is left, so that a file that has changed is noticed.
    fn finish(&mut self) -> Result<()> {
        let mut text = Vec::new();
        while !self.ended {
            text.clear();
            self.pull(&mut text, BLOCK_BYTES)?;
        }
        Ok(())
    }
}
