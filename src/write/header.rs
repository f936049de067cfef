//! The header of a table with units that have changed: same names, same brackets, new unit.

use super::field::{Fields, push_field};
use crate::error::{Error, Result};
use crate::place::Place;
use crate::record::TableLayout;
use crate::unit::Unit;

/// A unit that changed in a column of a table.
pub(super) struct Change<'a> {
    pub column: usize,
    pub old: &'a Unit,
    pub new: &'a Unit,
}

/// The head of a table with changed units put in and `added` columns (name and unit) at the right. Everything else stays
/// byte for byte.
///
/// # Errors
/// `Unsupported` when a unit changed and the header's fields do not match the table's columns.
pub(super) fn rewrite(layout: &TableLayout, changes: &[Change<'_>], added: &[(String, String)]) -> Result<Vec<u8>> {
    let mut out = Vec::with_capacity(layout.head.len() + 64);
    for (number, whole) in lines(&layout.head).enumerate() {
        let line = whole.trim_end_matches(['\r', '\n']);
        let is_header = layout.header_line == Some(number);
        let is_units = layout.units_line == Some(number);
        if !is_header && !is_units || changes.is_empty() && added.is_empty() {
            out.extend_from_slice(whole.as_bytes());
            continue;
        }
        let Some(mut cells) = cells(line, layout) else {
            let at = Place::line(number as u64 + 1);
            return Err(Error::unsupported(
                "the header's fields do not match the columns, so its units cannot be changed",
            )
            .at(at)
            .remedy("write another format with --format, or name the columns in the file"));
        };
        for change in changes {
            let Some(cell) = cells.get_mut(change.column) else { continue };
            let inner = cell.text.replace("\"\"", "\"");
            let text = match (is_units, layout.units_line.is_some()) {
                (true, _) => in_units_row(&inner, change.new),
                (false, units_row) => in_name(&inner, change, units_row),
            };
            if let Some(text) = text {
                cell.text = if cell.quoted { text.replace('"', "\"\"") } else { text };
            }
        }
        for (index, cell) in cells.iter().enumerate() {
            if index > 0 && layout.delimiter != b' ' {
                out.push(layout.delimiter);
            }
            out.extend_from_slice(cell.before.as_bytes());
            out.extend_from_slice(cell.text.as_bytes());
            out.extend_from_slice(cell.after.as_bytes());
        }
        let mut taken: Vec<String> = cells.iter().map(|cell| bare(&cell.text).to_owned()).collect();
        for (name, unit) in added {
            let name = free_name(name, &mut taken);
            out.push(layout.delimiter);
            let units_row = layout.units_line.is_some();
            let text = match (is_units, units_row || unit.is_empty()) {
                (true, _) => unit.clone(),
                (false, true) => name,
                (false, false) => format!("{name} [{unit}]"),
            };
            push_field(&mut out, &text, layout.delimiter);
        }
        out.extend_from_slice(&whole.as_bytes()[line.len()..]);
    }
    Ok(out)
}

/// `name`, or where a column has it already, the name with the first free number from 2 on behind it; it is then taken.
pub(super) fn free_name(name: &str, taken: &mut Vec<String>) -> String {
    let numbered = (2..).map(|n| format!("{name} {n}"));
    let free = std::iter::once(name.to_owned()).chain(numbered).find(|candidate| !taken.contains(candidate));
    let free = free.unwrap_or_else(|| name.to_owned());
    taken.push(free.clone());
    free
}

/// A column's name without its unit.
fn bare(name: &str) -> &str {
    name.split(['[', '(', '{']).next().unwrap_or_default().trim()
}

/// One field of a header line and what stands around it.
struct Cell {
    before: String,
    text: String,
    after: String,
    quoted: bool,
}

/// The fields of a header line, as many as the table has columns (one empty field more is dropped).
fn cells(line: &str, layout: &TableLayout) -> Option<Vec<Cell>> {
    let mut cells: Vec<Cell> = Vec::new();
    for span in Fields::new(line.as_bytes(), layout.delimiter) {
        let before = line.get(span.outer_start..span.start)?;
        let text = line.get(span.start..span.end)?;
        let cell = Cell {
            before: before.to_owned(),
            text: text.to_owned(),
            after: line.get(span.end..span.outer_end)?.to_owned(),
            quoted: before.ends_with('"'),
        };
        // Names parted by blanks: `ax [g]` is one name with its unit.
        match cells.last_mut() {
            Some(last) if layout.delimiter == b' ' && text.starts_with(['[', '(', '{']) => {
                last.text.push_str(before);
                last.text.push_str(text);
            }
            _ => cells.push(cell),
        }
    }
    let columns = layout.columns.len();
    if cells.len() == columns + 1 && cells.last().is_some_and(|cell| cell.text.is_empty()) {
        cells.pop();
    }
    (cells.len() == columns).then_some(cells)
}

/// A name with its unit replaced, or the new unit put after it; `None` where a units row carries it instead.
fn in_name(name: &str, change: &Change<'_>, units_row: bool) -> Option<String> {
    let is_old = |text: &str| {
        let unit = Unit::parse(text);
        unit == *change.old || (unit.meaning().is_some() && !text.trim().is_empty())
    };
    for (open, close) in BRACKETS {
        let (Some(from), Some(to)) = (name.rfind(open), name.rfind(close)) else { continue };
        if from < to && is_old(&name[from + 1..to]) {
            return Some(format!("{}{}{}", &name[..=from], change.new.label(), &name[to..]));
        }
    }
    if let Some(at) = name.rfind(['_', ' '])
        && !change.old.is_unknown()
        && Unit::parse(&name[at + 1..]) == *change.old
    {
        return Some(format!("{}{}", &name[..=at], change.new.label()));
    }
    (!units_row).then(|| format!("{name} [{}]", change.new.label()))
}

/// A cell of a units row, its brackets kept.
fn in_units_row(cell: &str, new: &Unit) -> Option<String> {
    for (open, close) in BRACKETS {
        if cell.starts_with(open) && cell.ends_with(close) {
            return Some(format!("{open}{}{close}", new.label()));
        }
    }
    Some(new.label().to_owned())
}

const BRACKETS: [(char, char); 3] = [('[', ']'), ('(', ')'), ('{', '}')];

/// Lines with their ends: line feed, carriage return, or both.
fn lines(text: &str) -> impl Iterator<Item = &str> {
    let mut rest = text;
    std::iter::from_fn(move || {
        if rest.is_empty() {
            return None;
        }
        let end = match rest.find(['\r', '\n']) {
            Some(at) if rest[at..].starts_with("\r\n") => at + 2,
            Some(at) => at + 1,
            None => rest.len(),
        };
        let (line, next) = rest.split_at(end);
        rest = next;
        Some(line)
    })
}

#[cfg(test)]
mod tests {
    use super::*;

    fn named(name: &str, old: &str, new: &str) -> String {
        let (old, new) = (Unit::parse(old), Unit::parse(new));
        in_name(name, &Change { column: 0, old: &old, new: &new }, false).unwrap()
    }

    #[test]
    fn a_unit_is_replaced_in_its_own_style() {
        assert_eq!(named("ax [g]", "g", "m/s"), "ax [m/s]");
        assert_eq!(named("Acc_X (m/s^2)", "m/s2", "m/s"), "Acc_X (m/s)");
        assert_eq!(named("acc_x_mm/s", "mm/s", "mm"), "acc_x_mm");
        assert_eq!(named("ax", "g", "m/s"), "ax [m/s]");
        assert_eq!(named("ax (left)", "", "s"), "ax (left) [s]");
        assert_eq!(in_units_row("[g]", &Unit::parse("m/s")).unwrap(), "[m/s]");
    }

    #[test]
    fn lines_keep_their_ends() {
        let found: Vec<&str> = lines("a\r\nb\rc\n\nd").collect();
        assert_eq!(found, ["a\r\n", "b\r", "c\n", "\n", "d"]);
    }
}
