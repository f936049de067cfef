//! The first part of a text: where the data start, what the columns are called, and what each of them is.

use std::io::Read;
use std::ops::Range;

use super::blocks::{Blocks, LONGEST_LINE};
use super::column::{self, Roles};
use super::dialect::{self, Beginning, Found};
use super::field::{Field, MOST, fields};
use super::header::{self, Header};
use super::{WINDOW, metadata, shown};
use crate::error::{Error, Finding, Result};
use crate::place::Place;
use crate::read::ReadOptions;

/// Bytes without data after which the search ends, once there are lines enough.
const LONGEST_HEAD: usize = 4 << 20;
/// Rows from which the columns are judged.
const ROWS: usize = 256;

/// What the first part of the text tells.
#[derive(Debug)]
pub(super) struct Opening {
    pub(super) found: Found,
    pub(super) header: Header,
    pub(super) roles: Roles,
    pub(super) metadata: Vec<(String, String)>,
    /// The text above the data block.
    pub(super) head: String,
    /// Bytes above the data block.
    pub(super) data_start: usize,
    /// Line end of the data block.
    pub(super) newline: &'static str,
    /// True when fields of the first rows are quoted.
    pub(super) quoted: bool,
}

/// Looks at as much of the text as settles where the data start, and leaves the blocks at its beginning.
///
/// # Errors
/// `Malformed` when there are no data or they can be read in two ways; as `header::find` and `column::roles`.
pub(super) fn open<R: Read>(blocks: &mut Blocks<R>, options: &ReadOptions) -> Result<Opening> {
    let mut window = WINDOW;
    loop {
        let (text, complete) = blocks.peek(window)?;
        let newline = if memchr::memchr(b'\n', text).is_none() && text.contains(&b'\r') { b'\r' } else { b'\n' };
        let lines = lines(text, newline, complete);
        let beginning = Beginning { text, lines: &lines, complete };
        if let Some(mut found) = dialect::detect(beginning, options)? {
            dialect::reach_up(beginning, &mut found, options)?;
            let opening = judge(beginning, found, newline, options)?;
            blocks.newline = newline;
            return Ok(opening);
        }
        let searched = text.len() >= LONGEST_HEAD && lines.len() > 1000 || text.len() >= LONGEST_LINE;
        if complete || searched {
            return Err(no_data(beginning, options));
        }
        window = (4 * window).min(LONGEST_LINE);
    }
}

/// The lines of the text without their ends; an unfinished last one only when the text is complete.
fn lines(text: &[u8], newline: u8, complete: bool) -> Vec<Range<usize>> {
    let mut lines = Vec::new();
    let mut start = 0;
    for end in memchr::memchr_iter(newline, text) {
        lines.push(start..end);
        start = end + 1;
    }
    if complete && start < text.len() {
        lines.push(start..text.len());
    }
    lines
}

fn judge(beginning: Beginning<'_>, mut found: Found, newline: u8, options: &ReadOptions) -> Result<Opening> {
    let mut header = header::find(beginning, &found, empty_last(beginning, &found), options.header_lines.is_some())?;
    if options.header_lines.is_none() {
        let below = header.names.as_ref().map_or(0, |names| names.end)..found.first;
        let units = header.units.clone().unwrap_or_default();
        let below: Vec<usize> = below.filter(|line| !units.contains(line) && !beginning.is_blank(*line)).collect();
        dialect::take_in(beginning, &mut found, &below, header.names.is_some(), options);
        if header.names.is_some() {
            let between = below.into_iter().take_while(|&line| line < found.first);
            header.findings.extend(between.filter_map(|line| left_out(beginning, line, &found)));
        }
    }
    let rows_of = |lines: Range<usize>| -> Vec<Vec<Field<'_>>> {
        lines
            .filter(|&index| !beginning.is_blank(index))
            .take(ROWS)
            .map(|index| fields(beginning.line(index), found.dialect.delimiter))
            .filter(|row| row.len() == found.fields)
            .collect()
    };
    let rows = rows_of(found.first..found.end);
    let later = rows_of(found.end..beginning.lines.len());
    let roles = column::roles(&header, &rows, &later, &found, options)?;
    let data = beginning.lines[found.first].clone();
    let skipped = [header.names.clone(), header.units.clone()];
    Ok(Opening {
        metadata: metadata::pairs(beginning, found.first, &skipped, found.dialect),
        head: String::from_utf8_lossy(&beginning.text[..data.start]).into_owned(),
        data_start: data.start,
        newline: match beginning.text[data].last() {
            _ if newline == b'\r' => "\r",
            Some(b'\r') => "\r\n",
            _ => "\n",
        },
        quoted: rows.iter().flatten().any(|cell| cell.quoted),
        found,
        header,
        roles,
    })
}

/// A remark on a line between header and data that is neither a ruler nor a row of words as wide as the data.
fn left_out(beginning: Beginning<'_>, line: usize, found: &Found) -> Option<Finding> {
    let text = beginning.line(line);
    let ruler = text.iter().all(|byte| matches!(byte, b'-' | b'=' | b'_' | b'+' | b'|' | b'#' | b' ' | b'\t' | b'\r'));
    let wide = fields(text, found.dialect.delimiter).len() == found.fields && !text.iter().any(u8::is_ascii_digit);
    let said = format!("a line between the header and the data is left out: {}", shown(text));
    (!ruler && !wide).then(|| Finding::new("line_left_out", said).at(Place::line(line as u64 + 1)))
}

/// True when the last field of the block's first rows is always empty.
fn empty_last(beginning: Beginning<'_>, found: &Found) -> bool {
    let mut rows = (found.first..found.end)
        .filter(|&index| !beginning.is_blank(index))
        .map(|index| fields(beginning.line(index), found.dialect.delimiter))
        .filter(|row| row.len() == found.fields);
    let empty = |row: Vec<Field<'_>>| row.last().is_some_and(|cell| cell.text.is_empty() && !cell.quoted);
    found.fields > 1 && found.dialect.delimiter != b' ' && rows.all(empty)
}

fn no_data(beginning: Beginning<'_>, options: &ReadOptions) -> Error {
    let filled: Vec<usize> = (0..beginning.lines.len()).filter(|&index| !beginning.is_blank(index)).take(2).collect();
    let Some(&first) = filled.first() else {
        return Error::malformed(if beginning.lines.is_empty() {
            "the first line does not end within 64 MiB"
        } else {
            "the text holds nothing but blanks"
        });
    };
    let line = beginning.line(first);
    let place = Place::line(first as u64 + 1);
    let separators = |delimiter: u8| memchr::memchr_iter(delimiter, line).count();
    if [b',', b';', b'\t', b'|', b' '].into_iter().any(|delimiter| separators(delimiter) > MOST) {
        return Error::malformed(format!("more than {MOST} fields on one line")).at(place);
    }
    if memchr::memchr(0, line).is_some() {
        return Error::malformed("NUL bytes on the first line: this is no text").at(place);
    }
    if filled.len() == 1 && beginning.complete {
        let what = format!("there are no data rows, only one line: {}", shown(line));
        return Error::malformed(what).at(place);
    }
    let start = options.header_lines.map_or(String::new(), |lines| format!(" after {lines} header lines"));
    Error::malformed(format!("no rows of numbers were found{start}; the text starts with {}", shown(line)))
        .at(place)
        .remedy("say how to read it with --delimiter, --decimal and --header-lines")
}
