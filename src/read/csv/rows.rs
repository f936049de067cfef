//! Rows of a block as numbers: the fast path for plain fields, and the general one for quoted fields.

use super::field::{self, Dialect, Field, grouped};
use super::missing::Missing;
use super::ticks::{Form, Ticks};
use super::{number, shown};
use crate::record::RowLines;

/// What to do with one field of every row.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) enum Task {
    /// Pass over it.
    Skip,
    /// Read it as a number of that channel.
    Value(usize),
    /// Read it as the stamp.
    Stamp,
    /// It must be empty: the field after a trailing separator.
    Empty,
}

/// How to read the rows of one file.
#[derive(Debug, Clone)]
pub(super) struct Plan {
    pub(super) dialect: Dialect,
    pub(super) newline: u8,
    /// One task a field.
    pub(super) tasks: Vec<Task>,
    /// Number of channels.
    pub(super) channels: usize,
    pub(super) missing: Missing,
    /// What the stamps are, where there are any.
    pub(super) form: Option<Form>,
}

/// Rows of consecutive lines.
#[derive(Debug, Clone)]
pub(super) struct Rows {
    /// Channels x rows; NaN where missing.
    pub(super) values: Vec<Vec<f64>>,
    /// For each channel the rows without a value, and the first spelling.
    pub(super) missing: Vec<(Vec<usize>, Option<String>)>,
    pub(super) ticks: Option<Ticks>,
    /// Line of each row, the first line of the text being 0.
    pub(super) lines: RowLines,
    /// Lines read.
    pub(super) line_count: u64,
    /// Lines of NUL bytes passed over.
    pub(super) nul_lines: Vec<u64>,
}

/// Where reading stopped.
#[derive(Debug, Clone)]
pub(super) struct Fault {
    /// Byte of the block at which the line starts.
    pub(super) byte: usize,
    /// Field (from 0), where one is at fault.
    pub(super) field: Option<usize>,
    pub(super) cause: Cause,
}

/// Why a line is no row.
#[derive(Debug, Clone, PartialEq, Eq)]
pub(super) enum Cause {
    /// Another number of fields.
    Fields(usize),
    /// A field that should be a number, shortened for people.
    NotANumber(String),
    /// A number with undeclared marks between groups of digits.
    Grouped(String),
    /// A number beyond the range of floats.
    TooLarge(String),
    /// A field that should be a stamp.
    NotAStamp(String),
    /// Text after a trailing separator that ends all other rows.
    NotEmpty(String),
    /// So many NUL bytes.
    Nul(usize),
    /// A quote, which the fast path does not read.
    Quote,
    /// A quote that is never closed.
    OpenQuote,
}

type Outcome = std::result::Result<(), (Option<usize>, Cause)>;

impl Plan {
    /// Reads a block of whole lines up to the first fault into `rows`, which are empty. With `quoted`, fields may be quoted
    /// and hold line ends.
    pub(super) fn read(&self, block: &[u8], quoted: bool, mut rows: Rows) -> (Rows, Option<Fault>) {
        let fault = match (quoted, self.dialect.delimiter) {
            (true, _) => self.read_quoted(block, &mut rows),
            (false, b' ') => self.read_plain::<true>(block, &mut rows),
            (false, _) => self.read_plain::<false>(block, &mut rows),
        };
        (rows, fault)
    }

    fn read_plain<const BLANKS: bool>(&self, block: &[u8], rows: &mut Rows) -> Option<Fault> {
        let (mut at, mut line, mut run_start, mut row) = (0, 0_u64, 0_u64, 0_usize);
        let mut fault = None;
        while at < block.len() {
            let blank = blank_line(&block[at..], self.newline);
            let outcome = match blank {
                Some(length) => Ok(at + length),
                None => self.plain_row::<BLANKS>(block, at, row, rows),
            };
            match outcome {
                Ok(end) if blank.is_none() => {
                    if row == 0 {
                        rows.reserve(block.len() / (end - at) + 1);
                    }
                    row += 1;
                    at = end;
                }
                outcome => {
                    rows.lines.push_consecutive(run_start, line - run_start);
                    run_start = line + 1;
                    let end = memchr::memchr(self.newline, &block[at..]).map_or(block.len(), |length| at + length + 1);
                    if let Err((field, cause)) = outcome {
                        rows.truncate(row);
                        let text = &block[at..end];
                        if let Err(cause) = self.excused(text, cause) {
                            let field = field.filter(|_| !matches!(cause, Cause::Fields(_)));
                            let quote = text.contains(&b'"') && !matches!(cause, Cause::Nul(_));
                            fault = Some(Fault { byte: at, field, cause: if quote { Cause::Quote } else { cause } });
                            break;
                        }
                        rows.nul_lines.push(line);
                    }
                    at = end;
                }
            }
            line += 1;
        }
        if fault.is_none() {
            rows.lines.push_consecutive(run_start, line - run_start);
        }
        rows.line_count = line;
        fault
    }

    /// Reads one row of plain fields from byte `at` and gives the byte behind its line end.
    #[inline]
    fn plain_row<const BLANKS: bool>(
        &self,
        block: &[u8],
        mut at: usize,
        row: usize,
        rows: &mut Rows,
    ) -> std::result::Result<usize, (Option<usize>, Cause)> {
        let (delimiter, newline, decimal) = (self.dialect.delimiter, self.newline, self.dialect.decimal);
        let separates = |byte: u8| if BLANKS { byte == b' ' || byte == b'\t' } else { byte == delimiter };
        let last = self.tasks.len() - 1;
        for (index, &task) in self.tasks.iter().enumerate() {
            while let Some(b' ' | b'\t') = block.get(at)
                && (BLANKS || block[at] != delimiter)
            {
                at += 1;
            }
            if let Some(length) = self.everyday(block, at, task, index == last, &separates, rows) {
                at += length;
                continue;
            }
            let rest = &block[at..];
            let closes = |length: usize| match rest.get(length) {
                Some(b'\r') => newline == b'\r' || rest.get(length + 1).is_none_or(|&next| next == newline),
                Some(&byte) => separates(byte) || byte == newline,
                None => true,
            };
            let printed = match task {
                Task::Value(_) => number::scan(rest, decimal).filter(|n| closes(n.len)),
                Task::Stamp if self.form == Some(Form::Number) => number::scan(rest, decimal).filter(|n| closes(n.len)),
                _ => None,
            };
            let taken = match (&printed, task) {
                (Some(n), Task::Value(channel)) => {
                    let value = number::value(n, rest, decimal);
                    self.take_value(channel, value, &rest[..n.len], row, rows).map_err(|cause| (Some(index), cause))?;
                    Some(n.len)
                }
                (Some(n), Task::Stamp) => {
                    if let Some(ticks) = &mut rows.ticks {
                        ticks.push_printed(n, rest);
                    }
                    Some(n.len)
                }
                _ => None,
            };
            at += match taken {
                Some(length) => length,
                None => {
                    let length = rest.iter().position(|&byte| separates(byte) || byte == newline).unwrap_or(rest.len());
                    let text = rest[..length].trim_ascii();
                    self.take_text(task, text, row, rows).map_err(|cause| (Some(index), cause))?;
                    length
                }
            };
            if BLANKS {
                while let Some(b' ' | b'\t') = block.get(at) {
                    at += 1;
                }
            }
            if block.get(at) == Some(&b'\r') && newline != b'\r' {
                at += 1;
            }
            let ends = block.get(at).is_none_or(|&byte| byte == newline);
            if ends != (index == last) {
                return Err((None, Cause::Fields(0))); // counted when it is reported
            }
            // Between blanks the next field starts here.
            at += usize::from(!BLANKS || ends);
        }
        Ok(at.min(block.len()))
    }

    /// Takes an everyday number with nothing but its separator or line end after it, which nearly all fields are, and gives the
    /// bytes passed; the separator too, unless blanks separate.
    #[inline(always)]
    fn everyday(
        &self,
        block: &[u8],
        at: usize,
        task: Task,
        last: bool,
        separates: &impl Fn(u8) -> bool,
        rows: &mut Rows,
    ) -> Option<usize> {
        let span: &[u8; number::SPAN] = block.get(at..at + number::SPAN)?.try_into().ok()?;
        let printed = number::short(span, self.dialect.decimal)?;
        let (next, after) = (span[printed.len], span[printed.len + 1]);
        let closing = match last {
            false if separates(next) => usize::from(self.dialect.delimiter != b' '),
            true if next == self.newline => 1,
            true if next == b'\r' && after == self.newline => 2,
            _ => return None,
        };
        match task {
            Task::Value(channel) if !self.missing.has_sentinels() => {
                rows.values[channel].push(number::short_value(&printed))
            }
            Task::Stamp if self.form == Some(Form::Number) => rows.ticks.as_mut()?.push_printed(&printed, span),
            _ => return None,
        }
        Some(printed.len + closing)
    }

    fn read_quoted(&self, block: &[u8], rows: &mut Rows) -> Option<Fault> {
        let mut fields: Vec<Field<'_>> = Vec::with_capacity(self.tasks.len());
        let (mut at, mut row) = (0, 0);
        while at < block.len() {
            let end = field::split(block, at, self.dialect.delimiter, self.newline, &mut fields);
            let Some(end) = end else {
                return Some(Fault { byte: at, field: None, cause: Cause::OpenQuote });
            };
            let record = block[at..end].trim_ascii();
            if !record.is_empty() {
                match self.quoted_row(&fields, row, rows) {
                    Ok(()) => {
                        rows.lines.push(rows.line_count);
                        row += 1;
                    }
                    Err((field, cause)) => {
                        rows.truncate(row);
                        match self.excused(record, cause) {
                            Ok(()) => rows.nul_lines.push(rows.line_count),
                            Err(cause) => return Some(Fault { byte: at, field, cause }),
                        }
                    }
                }
            }
            let ended = block[at..end].last() == Some(&self.newline);
            rows.line_count += memchr::memchr_iter(self.newline, &block[at..end]).count() as u64 + u64::from(!ended);
            at = end;
        }
        None
    }

    fn quoted_row(&self, fields: &[Field<'_>], row: usize, rows: &mut Rows) -> Outcome {
        if fields.len() != self.tasks.len() {
            return Err((None, Cause::Fields(fields.len())));
        }
        for (index, (task, field)) in self.tasks.iter().zip(fields).enumerate() {
            let text: &[u8] = &field.text;
            let whole = match (*task, number::scan(text, self.dialect.decimal)) {
                (Task::Value(channel), Some(n)) if n.len == text.len() => {
                    let value = number::value(&n, text, self.dialect.decimal);
                    Some(self.take_value(channel, value, text, row, rows))
                }
                _ => None,
            };
            whole.unwrap_or_else(|| self.take_text(*task, text, row, rows)).map_err(|cause| (Some(index), cause))?;
        }
        Ok(())
    }

    #[inline]
    fn take_value(
        &self,
        channel: usize,
        value: f64,
        text: &[u8],
        row: usize,
        rows: &mut Rows,
    ) -> std::result::Result<(), Cause> {
        if self.missing.sentinel(value) {
            rows.miss(channel, row, text);
        } else if value.is_finite() {
            rows.values[channel].push(value);
        } else {
            return Err(Cause::TooLarge(shown(text)));
        }
        Ok(())
    }

    /// A field that is no plain number.
    fn take_text(&self, task: Task, text: &[u8], row: usize, rows: &mut Rows) -> std::result::Result<(), Cause> {
        match task {
            Task::Skip => Ok(()),
            Task::Empty if text.is_empty() => Ok(()),
            Task::Empty => Err(Cause::NotEmpty(shown(text))),
            Task::Stamp => {
                let pushed = rows.ticks.as_mut().and_then(|ticks| match ticks.form {
                    Form::Number => {
                        let plain = self.ungrouped(text)?;
                        let whole = ticks.push_number(&plain)? == plain.len();
                        if !whole {
                            ticks.truncate(row);
                        }
                        whole.then_some(())
                    }
                    _ => ticks.push_civil(text),
                });
                pushed.ok_or_else(|| Cause::NotAStamp(shown(text)))
            }
            Task::Value(channel) => match field::number(text, self.dialect) {
                Some(value) => self.take_value(channel, value, text, row, rows),
                None if self.missing.spelling(text) => {
                    rows.miss(channel, row, text);
                    Ok(())
                }
                None if grouped(text, self.dialect.decimal) => Err(Cause::Grouped(shown(text))),
                None => Err(Cause::NotANumber(shown(text))),
            },
        }
    }

    /// The text without declared marks between groups of digits.
    fn ungrouped(&self, text: &[u8]) -> Option<Vec<u8>> {
        field::number(text, self.dialect)?;
        Some(text.iter().copied().filter(|&byte| Some(byte) != self.dialect.thousands).collect())
    }

    /// What to make of a faulty line: NUL bytes or another number of fields explain it better than what they led to. `Ok` when the line is a declared
    /// loss; without stamps nobody could tell how long it is.
    fn excused(&self, line: &[u8], cause: Cause) -> std::result::Result<(), Cause> {
        let nuls = memchr::memchr_iter(0, line).count();
        match cause {
            _ if nuls > 0 && self.missing.nul_rows() && self.form.is_some() => Ok(()),
            _ if nuls > 0 => Err(Cause::Nul(nuls)),
            cause => match field::fields(line, self.dialect.delimiter).len() {
                count if count == self.tasks.len() && !matches!(cause, Cause::Fields(_)) => Err(cause),
                count => Err(Cause::Fields(count)),
            },
        }
    }
}

impl Rows {
    /// No rows yet.
    pub(super) fn new(plan: &Plan) -> Rows {
        Rows {
            values: vec![Vec::new(); plan.channels],
            missing: vec![(Vec::new(), None); plan.channels],
            ticks: plan.form.map(|form| Ticks::new(form, plan.dialect.decimal)),
            lines: RowLines::new(),
            line_count: 0,
            nul_lines: Vec::new(),
        }
    }

    /// No rows, in the memory of these.
    pub(super) fn cleared(self, plan: &Plan) -> Rows {
        let mut empty = Rows::new(plan);
        for (slot, mut values) in empty.values.iter_mut().zip(self.values) {
            values.clear();
            *slot = values;
        }
        if let (Some(empty), Some(mut ticks)) = (&mut empty.ticks, self.ticks) {
            ticks.ticks.clear();
            empty.ticks = ticks.ticks;
        }
        empty
    }

    /// Joins the next rows.
    pub(super) fn append(&mut self, next: &Rows) {
        let before = self.lines.rows() as usize;
        for (values, more) in self.values.iter_mut().zip(&next.values) {
            values.extend_from_slice(more);
        }
        for ((missing, spelling), (more, next_spelling)) in self.missing.iter_mut().zip(&next.missing) {
            missing.extend(more.iter().map(|row| row + before));
            if spelling.is_none() {
                spelling.clone_from(next_spelling);
            }
        }
        if let (Some(ticks), Some(more)) = (&mut self.ticks, &next.ticks) {
            ticks.append(more);
        }
        self.nul_lines.extend(next.nul_lines.iter().map(|line| line + self.line_count));
        self.lines.append(&next.lines, self.line_count);
        self.line_count += next.line_count;
    }

    /// Makes room for so many rows.
    fn reserve(&mut self, rows: usize) {
        self.values.iter_mut().for_each(|values| values.reserve(rows));
        if let Some(ticks) = &mut self.ticks {
            ticks.ticks.reserve(rows);
        }
    }

    fn miss(&mut self, channel: usize, row: usize, text: &[u8]) {
        self.values[channel].push(f64::NAN);
        let (rows, spelling) = &mut self.missing[channel];
        rows.push(row);
        if spelling.is_none() {
            *spelling = Some(String::from_utf8_lossy(text).into_owned());
        }
    }

    /// Drops what a faulty row left behind.
    fn truncate(&mut self, rows: usize) {
        self.values.iter_mut().for_each(|values| values.truncate(rows));
        for (missing, spelling) in &mut self.missing {
            missing.truncate(missing.partition_point(|&row| row < rows));
            if missing.is_empty() {
                *spelling = None;
            }
        }
        if let Some(ticks) = &mut self.ticks {
            ticks.truncate(rows);
        }
    }
}

/// Bytes of the line end and before it where `text` starts with a line of blanks.
#[inline]
fn blank_line(text: &[u8], newline: u8) -> Option<usize> {
    let first = *text.first()?;
    if first > b' ' {
        return None;
    }
    let length = memchr::memchr(newline, text).unwrap_or(text.len());
    text[..length].iter().all(u8::is_ascii_whitespace).then(|| (length + 1).min(text.len()))
}
