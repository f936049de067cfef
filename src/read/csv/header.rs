//! The lines that name the columns and their units, above the data block.

use std::ops::Range;

use super::column::is_time_name;
use super::dialect::{Beginning, Found};
use super::field::{Look, fields, look, split};
use super::missing::Missing;
use super::name::{Column, columns, is_unit, unit_cell};
use super::shown;
use crate::error::{Error, Finding, Result};
use crate::place::Place;

/// What the head of a table says about its columns.
#[derive(Debug, Clone)]
pub(super) struct Header {
    /// One column a field, an empty last one after a trailing separator left out.
    pub(super) columns: Vec<Column>,
    /// Lines (from 0) of the names: one, or several where quoted names hold line ends.
    pub(super) names: Option<Range<usize>>,
    /// Lines (from 0) of the units.
    pub(super) units: Option<Range<usize>>,
    pub(super) findings: Vec<Finding>,
}

/// A line of the head, or several that a quoted line end joins, and its cells.
type Named = (Range<usize>, Vec<String>);

/// Most lines that quoted line ends join.
const JOINED: usize = 16;

/// Longest text that is taken for a name when deciding whether a line is a header.
const LONGEST_NAME: usize = 60;

/// Finds names and units above the block. `empty_last` says that the last field of the first rows is empty: without a name of
/// its own it stands after a trailing separator. `given` says that the user told where the data start.
///
/// # Errors
/// `Malformed` when the line above the block looks like a header for another number of columns.
pub(super) fn find(beginning: Beginning<'_>, found: &Found, empty_last: bool, given: bool) -> Result<Header> {
    let mut block = named_lines(beginning, found, found.fields);
    let trailing = empty_last && block.first().is_none_or(|(_, cells)| cells.last().is_none_or(String::is_empty));
    let kept = found.fields - usize::from(trailing);
    if trailing {
        block = named_lines(beginning, found, kept);
    }
    let mut findings = Vec::new();
    let (names_at, units_at) = roles(&block);
    let Some((names, headers)) = names_at.map(|at| &block[at]) else {
        if !given {
            refuse_mismatch(beginning, found, kept)?;
        } else if let Some(line) = beginning.above(found.first) {
            let text = format!("no line above the data names {kept} columns: they are called c1, c2, ...");
            findings.push(Finding::new("header_unused", text).at(Place::line(line as u64 + 1)));
        }
        let (columns, _) = columns(&vec![String::new(); kept], &[], None);
        return Ok(Header { columns, names: None, units: None, findings });
    };
    if trailing && !ends_in_separator(beginning.line(names.end - 1), found.dialect.delimiter) {
        let text = "every row ends in a separator that the header lacks: the empty last field is left out";
        findings.push(Finding::new("trailing_separator", text).at(Place::line(found.first as u64 + 1)));
    }
    if let Some(line) = (0..names.start).find(|&line| !given && is_row(beginning, line, found)) {
        let text = "this line looks like data but stands above the header: it is left out (--header-lines)";
        findings.push(Finding::new("rows_above_header", text).at(Place::line(line as u64 + 1)));
    }
    let units = units_at.map(|at| &block[at]);
    let (columns, doubled) = columns(headers, units.map_or(&[][..], |(_, units)| units), Some(names.start as u64 + 1));
    findings.extend(doubled);
    Ok(Header { columns, names: Some(names.clone()), units: units.map(|(lines, _)| lines.clone()), findings })
}

/// True for a line of numbers, stamps and missing values, as many as a row has.
fn is_row(beginning: Beginning<'_>, line: usize, found: &Found) -> bool {
    let missing = Missing::default();
    let cells = fields(beginning.line(line), found.dialect.delimiter);
    let mut looks = cells.iter().map(|cell| look(cell, found.dialect, &missing));
    cells.len() == found.fields
        && looks.clone().any(|look| look == Look::Number)
        && looks.all(|look| look != Look::Text)
}

/// The nearest lines above the block that can name `kept` columns, nearest first.
fn named_lines(beginning: Beginning<'_>, found: &Found, kept: usize) -> Vec<Named> {
    let mut block: Vec<Named> = Vec::new();
    let mut end = found.first;
    while let Some(last) = beginning.above(end) {
        let lines = joined(beginning, last);
        end = lines.start;
        let adjacent = beginning.above(found.first) == Some(last);
        match names(beginning, &lines, found, kept, adjacent) {
            Some(names) => block.push((lines, names)),
            None if block.is_empty() => {}
            None => break,
        }
    }
    block
}

/// The lines up to `last` that an open quote makes one.
fn joined(beginning: Beginning<'_>, last: usize) -> Range<usize> {
    let quotes = |line: usize| memchr::memchr_iter(b'"', beginning.line(line)).count();
    let mut open = quotes(last) % 2;
    let mut first = last;
    while open == 1 && first > 0 && last - first < JOINED {
        first -= 1;
        open = (open + quotes(first)) % 2;
    }
    if open == 0 { first..last + 1 } else { last..last + 1 }
}

/// The cells of some lines where they can name `kept` columns: as many, none of them a number or a stamp; numbers after a name
/// of the time count as names right above the data.
fn names(
    beginning: Beginning<'_>,
    lines: &Range<usize>,
    found: &Found,
    kept: usize,
    adjacent: bool,
) -> Option<Vec<String>> {
    let line = &beginning.text[beginning.lines[lines.start].start..beginning.lines[lines.end - 1].end];
    let plain = uncommented(line);
    if plain.len() < line.trim_ascii().len() && plain.iter().any(|byte| matches!(byte, b'=' | b':')) {
        return None; // `# key = value`
    }
    if memchr::memchr(0, line).is_some() {
        return None; // lost data
    }
    let missing = Missing::default();
    let mut cells = Vec::new();
    // No NUL byte ends a line here, so that quoted line ends stay within their cell.
    if lines.len() == 1 || split(plain, 0, found.dialect.delimiter, 0, &mut cells).is_none() {
        cells = fields(plain, found.dialect.delimiter);
    }
    let looks: Vec<Look> = cells.iter().map(|cell| look(cell, found.dialect, &missing)).collect();
    let mut cells: Vec<String> =
        cells.iter().map(|cell| cell.string().split_whitespace().collect::<Vec<_>>().join(" ")).collect();
    let timed = adjacent && looks.first() == Some(&Look::Text) && is_time_name(&cells[0]);
    let text = looks.iter().all(|look| match look {
        Look::Text | Look::Missing => true,
        Look::Number => timed,
        Look::Stamp | Look::Grouped => false,
    });
    if found.dialect.delimiter == b' ' && cells.len() != kept {
        cells = spaced_names(plain, kept);
    }
    while cells.len() > kept && cells.last().is_some_and(String::is_empty) {
        cells.pop();
    }
    (text && cells.len() == kept && cells.iter().any(|cell| !cell.is_empty())).then_some(cells)
}

/// Names between blanks where they hold blanks themselves: units in brackets go with the name before; otherwise two blanks
/// or a tab separate.
fn spaced_names(line: &[u8], kept: usize) -> Vec<String> {
    let text = String::from_utf8_lossy(line);
    let mut glued: Vec<String> = Vec::new();
    for word in text.split_whitespace() {
        match glued.last_mut() {
            Some(last) if word.starts_with(['[', '(']) || last.contains('[') && !last.contains(']') => {
                last.push(' ');
                last.push_str(word);
            }
            _ => glued.push(word.to_owned()),
        }
    }
    if glued.len() == kept {
        return glued;
    }
    text.split("  ")
        .flat_map(|part| part.split('\t'))
        .map(|part| part.trim().to_owned())
        .filter(|part| !part.is_empty())
        .collect()
}

/// Which lines of the block (nearest to the data first) hold names and units.
fn roles(block: &[Named]) -> (Option<usize>, Option<usize>) {
    if block.len() < 2 {
        return ((!block.is_empty()).then_some(0), None);
    }
    // A dash, "1", says as little as a missing value does.
    let unit = |cell: &String| is_unit(unit_cell(cell).label()) && unit_cell(cell).label() != "1";
    let units = |cells: &[String]| cells.iter().filter(|cell| unit(cell)).count();
    let short = |cells: &[String]| cells.iter().all(|cell| cell.chars().count() <= 16);
    // A units row stands under the names and holds more units than they do.
    let found = (0..block.len() - 1).find(|&at| {
        let (below, above) = (&block[at].1, &block[at + 1].1);
        short(below) && units(below) > 0 && units(below) > units(above)
    });
    if let Some(at) = found {
        return (Some(at + 1), Some(at));
    }
    // A row of remarks may stand under the names.
    let full = |cells: &[String]| cells.iter().all(|cell| !cell.is_empty());
    let timed = |cells: &[String]| cells.iter().any(|cell| is_time_name(cell));
    let names = (block.iter().position(|(_, cells)| full(cells) && timed(cells)))
        .or_else(|| block.iter().position(|(_, cells)| timed(cells)))
        .or_else(|| block.iter().position(|(_, cells)| full(cells)));
    (Some(names.unwrap_or(0)), None)
}

/// An error where the line above the data is a header of another width.
fn refuse_mismatch(beginning: Beginning<'_>, found: &Found, kept: usize) -> Result<()> {
    let Some(index) = beginning.above(found.first) else { return Ok(()) };
    let line = beginning.line(index);
    if uncommented(line).len() < line.trim_ascii().len() {
        return Ok(());
    }
    let cells = fields(line, found.dialect.delimiter);
    let missing = Missing::default();
    let text = cells.iter().all(|cell| look(cell, found.dialect, &missing) == Look::Text);
    let names =
        cells.iter().all(|cell| cell.text.len() <= LONGEST_NAME && !cell.text.iter().any(|b| matches!(b, b'=' | b':')));
    if cells.len() < 2 || !text || !names || found.dialect.delimiter == b' ' {
        return Ok(());
    }
    let what = format!("the header ({}) has {} fields, the data {kept}", shown(line), cells.len());
    let data = beginning.line(found.first);
    let error = Error::malformed(what).at(Place::field(found.first as u64 + 1, 1));
    Err(if found.dialect.delimiter == b',' && !data.contains(&b'.') {
        error.remedy("if commas are decimal marks here, export with another separator or quoted fields")
    } else {
        error.remedy(
            "say how many lines stand above the data with --header-lines, or how to split them with --delimiter",
        )
    })
}

/// The line without blanks around it and without a comment mark at its start.
pub(super) fn uncommented(line: &[u8]) -> &[u8] {
    let line = line.trim_ascii();
    let marks = line.iter().take_while(|byte| matches!(byte, b'#' | b'%' | b'!')).count();
    line.strip_prefix(b"//").unwrap_or(&line[marks..]).trim_ascii()
}

fn ends_in_separator(line: &[u8], delimiter: u8) -> bool {
    let end = line.iter().rposition(|&byte| byte != b'\r' && byte != b' ');
    end.is_some_and(|end| line[end] == delimiter)
}
