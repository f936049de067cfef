//! Where the data block of a text file starts, and which separator and decimal mark it is printed with, chosen jointly.

use std::ops::Range;

use super::field::{Dialect, Field, Look, MOST, fields, fields_into, look};
use super::missing::Missing;
use super::shown;
use crate::error::{Error, Result};
use crate::place::Place;
use crate::read::ReadOptions;

/// Lines that settle the start of the data block.
const RUN: usize = 8;
/// Lines of the block that are looked at.
const SAMPLE: usize = 256;
/// Separators, the preferred one first where the reading is the same.
const DELIMITERS: [u8; 5] = [b',', b';', b'\t', b'|', b' '];

/// Separators that text within one field hardly holds.
const SPLITTERS: [u8; 3] = [b';', b'\t', b'|'];

/// The data block as found in the first part of the text.
#[derive(Debug, Clone)]
pub(super) struct Found {
    pub(super) dialect: Dialect,
    /// Index of the block's first line.
    pub(super) first: usize,
    /// Index behind the last line that was found to belong to it; more may follow.
    pub(super) end: usize,
    /// Fields of its lines.
    pub(super) fields: usize,
    /// Looks of the fields in each of its first lines, blank lines left out.
    pub(super) looks: Vec<Vec<Look>>,
}

/// The first part of a text, cut into lines.
#[derive(Debug, Clone, Copy)]
pub(super) struct Beginning<'a> {
    pub(super) text: &'a [u8],
    pub(super) lines: &'a [Range<usize>],
    /// True when the text ends with the last line.
    pub(super) complete: bool,
}

impl<'a> Beginning<'a> {
    /// Line `index` (from 0), without its line end.
    pub(super) fn line(&self, index: usize) -> &'a [u8] {
        &self.text[self.lines[index].clone()]
    }

    /// True when line `index` holds nothing but blanks.
    pub(super) fn is_blank(&self, index: usize) -> bool {
        self.line(index).trim_ascii().is_empty()
    }

    /// Index of the nearest line above `index` that is not blank.
    pub(super) fn above(&self, index: usize) -> Option<usize> {
        (0..index).rev().find(|&line| !self.is_blank(line))
    }
}

/// How strictly lines are taken for data.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
enum Measure {
    /// Numbers, stamps and missing values only.
    Pure,
    /// Columns of text beside at least one of numbers.
    WithText,
}

/// Finds the data block: the first run of at least 8 lines, or of all remaining lines, with an equal number of fields and
/// numeric or time-stamp content under one pair of separator and decimal mark. `None` when more text is needed to tell.
///
/// # Errors
/// `Malformed` when two pairs read the block differently and nothing decides between them.
pub(super) fn detect(beginning: Beginning<'_>, options: &ReadOptions) -> Result<Option<Found>> {
    let pairs = pairs(beginning.text, options);
    let need = if beginning.complete { [RUN, 0, 1].as_slice() } else { [RUN].as_slice() };
    for &least in need {
        for measure in [Measure::Pure, Measure::WithText] {
            let runs: Vec<Found> =
                pairs.iter().filter_map(|&dialect| run(beginning, dialect, measure, least, options)).collect();
            if let Some(found) = choose(beginning, runs)? {
                return Ok(Some(found));
            }
        }
    }
    Ok(None)
}

/// The pairs that the options leave open. A comma separates and marks decimals at once only where fields are quoted, which
/// the fields themselves show. Of separators that do not occur at all the first stands for the others: under each of them a
/// line is one field.
fn pairs(text: &[u8], options: &ReadOptions) -> Vec<Dialect> {
    let marks = [b'.', b','];
    let mut stood_for = false;
    let delimiters = DELIMITERS.iter().copied().chain(options.delimiter.filter(|d| !DELIMITERS.contains(d)));
    delimiters
        .filter(|&delimiter| options.delimiter.is_none_or(|given| given == delimiter))
        .filter(|&delimiter| {
            let absent = delimiter != b' ' && memchr::memchr(delimiter, text).is_none();
            !absent || options.delimiter.is_some() || !std::mem::replace(&mut stood_for, true)
        })
        .flat_map(|delimiter| marks.map(|decimal| Dialect { delimiter, decimal, thousands: options.thousands }))
        .filter(|dialect| options.decimal.is_none_or(|given| given == dialect.decimal))
        .collect()
}

/// Looks of the fields of a line that may be data; `cells` is lent.
fn shape<'a>(
    line: &'a [u8],
    dialect: Dialect,
    measure: Measure,
    missing: &Missing,
    cells: &mut Vec<Field<'a>>,
) -> Option<Vec<Look>> {
    fields_into(line, dialect.delimiter, cells);
    if cells.len() > MOST {
        return None;
    }
    let (mut looks, mut numeric) = (Vec::new(), false);
    for field in cells.iter() {
        let look = look(field, dialect, missing);
        let kept = measure == Measure::WithText && (field.quoted || !field.text.iter().any(|b| SPLITTERS.contains(b)));
        if look == Look::Text && !kept {
            return None;
        }
        numeric |= matches!(look, Look::Number | Look::Grouped);
        looks.push(look);
    }
    numeric.then_some(looks)
}

/// True when two lines can belong to one table: as many fields, of the same kinds where neither is missing.
fn alike(a: &[Look], b: &[Look]) -> bool {
    let kind = |look: Look| if look == Look::Grouped { Look::Number } else { look };
    a.len() == b.len() && a.iter().zip(b).all(|(&a, &b)| a == Look::Missing || b == Look::Missing || kind(a) == kind(b))
}

/// The first run of `least` lines at least; with `least` 0 the run that reaches the end of the text; with 1 the longest.
fn run(
    beginning: Beginning<'_>,
    dialect: Dialect,
    measure: Measure,
    least: usize,
    options: &ReadOptions,
) -> Option<Found> {
    let missing = Missing::new(&options.missing, dialect.decimal);
    let mut best: Option<Found> = None;
    let mut current: Option<Found> = None;
    let mut cells = Vec::new();
    for index in options.header_lines.unwrap_or(0)..beginning.lines.len() {
        if beginning.is_blank(index) {
            continue;
        }
        let looks = shape(beginning.line(index), dialect, measure, &missing, &mut cells);
        let goes_on = match (&current, &looks) {
            (Some(run), Some(looks)) => run.looks.iter().rev().take(RUN).all(|line| alike(line, looks)),
            _ => false,
        };
        if !goes_on {
            if let Some(done) = current.take() {
                if least == RUN && done.looks.len() >= RUN || options.header_lines.is_some() {
                    return Some(done);
                }
                if least == 1 && best.as_ref().is_none_or(|best| best.looks.len() < done.looks.len()) {
                    best = Some(done);
                }
            } else if options.header_lines.is_some() && looks.is_none() {
                return None;
            }
            current =
                looks.as_ref().map(|l| Found { dialect, first: index, end: index, fields: l.len(), looks: Vec::new() });
        }
        if let (Some(run), Some(looks)) = (&mut current, looks) {
            run.looks.push(looks);
            run.end = index + 1;
            if run.looks.len() == SAMPLE {
                return current;
            }
        }
    }
    match (least, current) {
        (RUN, Some(done)) => (done.looks.len() >= RUN).then_some(done),
        (0, done) => done,
        (_, Some(done)) => Some(best.filter(|best| best.looks.len() >= done.looks.len()).unwrap_or(done)),
        (_, None) => best,
    }
}

/// The one reading among `runs`, or an error that shows two.
fn choose(beginning: Beginning<'_>, mut runs: Vec<Found>) -> Result<Option<Found>> {
    let longest = runs.iter().map(|run| run.looks.len()).max().unwrap_or(0);
    runs.retain(|run| run.looks.len() == longest);
    // Blanks separate only where nothing else does: a date and a clock time have one between them.
    if runs.iter().any(|run| run.dialect.delimiter != b' ' && run.fields > 1) {
        runs.retain(|run| run.dialect.delimiter != b' ');
    }
    // The reading that leaves the fewest fields as text.
    let texts = |run: &Found| run.looks.iter().flatten().filter(|look| **look == Look::Text).count();
    let fewest = runs.iter().map(texts).min().unwrap_or(0);
    runs.retain(|run| texts(run) == fewest);
    let mut readings: Vec<(Vec<Option<u64>>, Found)> = Vec::new();
    for run in runs {
        let reading = reading(beginning, &run);
        if !readings.iter().any(|(known, _)| *known == reading) {
            readings.push((reading, run));
        }
    }
    if readings.len() > 1 {
        let agreeing: Vec<bool> = readings.iter().map(|(_, run)| header_agrees(beginning, run)).collect();
        if agreeing.iter().filter(|agrees| **agrees).count() == 1 {
            let mut agreeing = agreeing.into_iter();
            readings.retain(|_| agreeing.next().unwrap_or(false));
        }
    }
    if let [(_, a), (_, b), ..] = &readings[..] {
        let line = beginning.line(a.first);
        let text = format!("{} can be read as {} or as {}", shown(line), described(line, a), described(line, b));
        return Err(Error::malformed(text)
            .at(Place::line(a.first as u64 + 1))
            .remedy("say which with --delimiter and --decimal"));
    }
    Ok(readings.pop().map(|(_, run)| run))
}

/// The numbers of the block's first lines, so that two dialects can be compared by what they read.
fn reading(beginning: Beginning<'_>, run: &Found) -> Vec<Option<u64>> {
    let lines = (run.first..beginning.lines.len()).filter(|&index| !beginning.is_blank(index)).take(run.looks.len());
    let mut numbers = vec![Some(run.first as u64), Some(run.fields as u64)];
    for index in lines {
        for field in fields(beginning.line(index), run.dialect.delimiter) {
            numbers.push(super::field::number(&field.text, run.dialect).map(f64::to_bits));
        }
    }
    numbers
}

/// True when the line above the block has as many fields, none of which holds another separator.
fn header_agrees(beginning: Beginning<'_>, run: &Found) -> bool {
    beginning.above(run.first).is_some_and(|index| {
        let names = fields(beginning.line(index), run.dialect.delimiter);
        let split = |byte: &u8| *byte == b',' || SPLITTERS.contains(byte);
        names.len() == run.fields && names.iter().all(|field| field.quoted || !field.text.iter().any(split))
    })
}

fn described(line: &[u8], run: &Found) -> String {
    let read = |field: &Field<'_>| match super::field::number(&field.text, run.dialect) {
        Some(value) => format!("{value}"),
        None => shown(&field.text),
    };
    let fields: Vec<String> = fields(line, run.dialect.delimiter).iter().map(read).collect();
    let delimiter = match run.dialect.delimiter {
        b'\t' => "tab".to_owned(),
        b' ' => "blanks".to_owned(),
        other => format!("\"{}\"", char::from(other)),
    };
    let (count, decimal) = (fields.len(), char::from(run.dialect.decimal));
    let plural = if count == 1 { "" } else { "s" };
    format!("{count} field{plural} ({}; separator {delimiter}, decimal mark \"{decimal}\")", fields.join(" and "))
}

/// Moves the start of the block up over data lines that a faulty line cut off, so that the fault is met and named rather
/// than taken for the end of a preamble.
///
/// # Errors
/// `Malformed` when the line above the block is numeric but has another number of fields.
pub(super) fn reach_up(beginning: Beginning<'_>, found: &mut Found, options: &ReadOptions) -> Result<()> {
    if options.header_lines.is_some() {
        return Ok(());
    }
    let missing = Missing::new(&options.missing, found.dialect.decimal);
    let first = found.first;
    let Some(model) = found.looks.first().cloned() else { return Ok(()) };
    let mut other_width = None;
    for index in (0..first).rev().filter(|&index| !beginning.is_blank(index)) {
        let fields = fields(beginning.line(index), found.dialect.delimiter);
        let looks: Vec<Look> = fields.iter().map(|field| look(field, found.dialect, &missing)).collect();
        let names = looks.len() == found.fields && looks.iter().all(|look| matches!(look, Look::Text | Look::Missing));
        if names {
            break;
        }
        let values = looks.iter().filter(|look| matches!(look, Look::Number | Look::Grouped)).count();
        if alike(&looks, &model) && values > 0 {
            found.first = index;
        } else if beginning.above(first) == Some(index) && values == looks.len() && looks.len() != found.fields {
            other_width = Some(looks.len());
        }
    }
    match other_width.filter(|_| found.first == first) {
        Some(width) => Err(Error::malformed(format!("{} fields where the line above has {width}", found.fields))
            .at(Place::line(first as u64 + 1))
            .remedy("say how to split it with --delimiter and --decimal, or where the data start with --header-lines")),
        None => Ok(()),
    }
}

/// Takes lines above the block in as data that must be rows, whatever is wrong with them: of the lines `below` the
/// header, those with as many fields and a number or stamp among them; without a header, those
/// of nothing but values, and the one right above when it starts with a value.
pub(super) fn take_in(
    beginning: Beginning<'_>,
    found: &mut Found,
    below: &[usize],
    named: bool,
    options: &ReadOptions,
) {
    let missing = Missing::new(&options.missing, found.dialect.decimal);
    let valued = |look: &Look| matches!(look, Look::Number | Look::Grouped | Look::Stamp);
    let next = beginning.above(found.first);
    for &index in below {
        let cells = fields(beginning.line(index), found.dialect.delimiter);
        let looks: Vec<Look> = cells.iter().map(|cell| look(cell, found.dialect, &missing)).collect();
        let values = looks.iter().any(valued);
        let data = match named {
            true => values,
            false if next == Some(index) && looks.first().is_some_and(valued) => true,
            false => values && !looks.contains(&Look::Text),
        };
        if data && cells.len() == found.fields {
            found.first = index;
            return;
        }
    }
}
