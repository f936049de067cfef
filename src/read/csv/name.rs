//! Column names: the unit that a header spells beside them, and how they are made unique.

use crate::error::Finding;
use crate::place::{Place, escape};
use crate::unit::Unit;

/// A column as its header names it.
#[derive(Debug, Clone, PartialEq)]
pub(super) struct Column {
    /// Name, unique in the file.
    pub(super) name: String,
    /// The header's full text, empty where there is none.
    pub(super) header: String,
    /// Unit, from the header's text or from a units row.
    pub(super) unit: Unit,
}

/// Longest name kept, in characters.
const LONGEST: usize = 200;

/// Units without a meaning for calculus that nevertheless make a units row or a bracket.
const OTHER_UNITS: &[&str] = &[
    "V", "mV", "uV", "A", "mA", "Pa", "kPa", "MPa", "bar", "mbar", "hPa", "psi", "N", "kN", "Nm", "°C", "degC", "°F",
    "K", "C", "rpm", "1/min", "U/min", "deg", "°", "rad", "rad/s", "deg/s", "°/s", "dB", "Ohm", "W", "kW", "kg", "uT",
    "pcs", "raw", "counts", "LSB", "bit", "TS", "RN", "a.u.", "au", "FS", "ue", "um/m",
];

/// Units that are also words or parts of names: `v_in`, `t_min`.
const WORDS: &[&str] = &["in", "min", "h", "mil", "ft", "1", "%", "-", "–", "G", "S"];

/// Name and unit of a header text: `ax [g]`, `Acc_X (m/s^2)`, `acc_x_mm/s`, `Time / s`, `pos_mm`.
pub(super) fn name_and_unit(header: &str) -> (String, Unit) {
    let header = header.trim();
    let known = |text: &str| Some(text.trim()).filter(|text| is_unit(text)).map(Unit::parse);
    for (open, close) in [('[', ']'), ('(', ')'), ('<', '>'), ('{', '}')] {
        let Some((name, unit)) = header.strip_suffix(close).and_then(|inner| inner.rsplit_once(open)) else { continue };
        let unit = unit.trim();
        let name = name.trim().trim_end_matches(['_', '/', ',']).trim_end();
        if !name.is_empty() && (open == '[' && !unit.is_empty() && unit.chars().count() <= 16 || is_unit(unit)) {
            return (name.to_owned(), Unit::parse(unit));
        }
        if !name.is_empty() && unit.is_empty() {
            return (name.to_owned(), Unit::unknown());
        }
    }
    for mark in [" / ", " in ", ", "] {
        if let Some((name, unit)) = header.rsplit_once(mark)
            && let Some(unit) = known(unit)
            && !name.trim().is_empty()
        {
            return (name.trim().to_owned(), unit);
        }
    }
    for mark in ['_', ' ', '.'] {
        if let Some((name, unit)) = header.rsplit_once(mark)
            && !name.trim().is_empty()
            && !WORDS.contains(&unit)
            && (mark == '_' || unit.chars().count() > 1)
            && Unit::parse(unit).meaning().is_some()
        {
            return (name.trim().to_owned(), Unit::parse(unit));
        }
    }
    (header.to_owned(), Unit::unknown())
}

/// The unit in a cell of a units row, brackets removed.
pub(super) fn unit_cell(text: &str) -> Unit {
    let text = text.trim();
    if matches!(text.to_lowercase().as_str(), "unit" | "units" | "einheit") {
        return Unit::unknown(); // the title of the row
    }
    let inner = [('[', ']'), ('(', ')'), ('<', '>')]
        .iter()
        .find_map(|&(open, close)| text.strip_prefix(open).and_then(|inner| inner.strip_suffix(close)));
    Unit::parse(inner.unwrap_or(text))
}

/// True for a text that is a unit of the trade.
pub(super) fn is_unit(text: &str) -> bool {
    let unit = Unit::parse(text);
    unit.meaning().is_some() || OTHER_UNITS.contains(&unit.label())
}

/// Columns from header texts (one a field) and units of a row of their own, with unique names; `line` is the header's.
pub(super) fn columns(headers: &[String], units: &[String], line: Option<u64>) -> (Vec<Column>, Vec<Finding>) {
    let mut columns: Vec<Column> = headers
        .iter()
        .enumerate()
        .map(|(index, header)| {
            let (name, unit) = name_and_unit(header);
            let name = if name.is_empty() { format!("c{}", index + 1) } else { name.chars().take(LONGEST).collect() };
            Column { name, header: header.trim().chars().take(2 * LONGEST).collect(), unit }
        })
        .collect();
    for (column, unit) in columns.iter_mut().zip(units) {
        if column.unit.is_unknown() {
            column.unit = unit_cell(unit);
        }
    }
    // Names that differ only by their unit keep it.
    let counts = |columns: &[Column]| {
        let mut counts = std::collections::HashMap::new();
        columns.iter().for_each(|column| *counts.entry(column.name.clone()).or_insert(0_usize) += 1);
        counts
    };
    let stripped = counts(&columns);
    for column in &mut columns {
        if stripped[&column.name] > 1 && !column.header.is_empty() {
            column.name = column.header.chars().take(LONGEST).collect();
        }
    }
    let mut taken: std::collections::HashSet<String> = columns.iter().map(|column| column.name.clone()).collect();
    let mut seen: std::collections::HashMap<String, usize> = std::collections::HashMap::new();
    let mut findings = Vec::new();
    for (index, column) in columns.iter_mut().enumerate() {
        let count = seen.entry(column.name.clone()).or_insert(0);
        *count += 1;
        if *count == 1 {
            continue;
        }
        let bare = column.name.clone();
        while !taken.insert(format!("{bare}#{count}")) {
            *count += 1;
        }
        column.name = format!("{bare}#{count}");
        let text =
            format!("the name \"{}\" stands twice: this column is called \"{}\"", escape(&bare), escape(&column.name));
        let place = Place { line, column: Some(index as u64 + 1), ..Place::default() };
        findings.push(Finding::new("duplicate_name", text).at(place));
    }
    (columns, findings)
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn units_are_found_in_the_usual_spellings() {
        for (header, name, unit) in [
            ("ax [g]", "ax", "g"),
            ("Acc_X (m/s^2)", "Acc_X", "m/s2"),
            ("acc_x_mm/s", "acc_x", "mm/s"),
            ("ax (m/s2)", "ax", "m/s2"),
            ("ax [m/s²]", "ax", "m/s2"),
            ("Weg [µm]", "Weg", "um"),
            ("Weg_um", "Weg", "um"),
            ("Zeit / s", "Zeit", "s"),
            ("time_ms", "time", "ms"),
            ("Time ms", "Time", "ms"),
            ("U [Foo]", "U", "Foo"),
            ("Acc (left)", "Acc (left)", ""),
            ("v_in", "v_in", ""),
            ("t_min", "t_min", ""),
            ("g", "g", ""),
            ("x[mm]", "x", "mm"),
            ("ax []", "ax", ""),
        ] {
            let (found, found_unit) = name_and_unit(header);
            assert_eq!((found.as_str(), found_unit.label()), (name, unit), "{header}");
        }
    }

    #[test]
    fn names_become_unique() {
        let headers: Vec<String> = ["t", "a [g]", "a [mm/s]", "b", "b", "b#2", ""].map(str::to_owned).to_vec();
        let (columns, findings) = columns(&headers, &[], Some(1));
        let names: Vec<&str> = columns.iter().map(|c| c.name.as_str()).collect();
        assert_eq!(names, ["t", "a [g]", "a [mm/s]", "b", "b#3", "b#2", "c7"]);
        assert_eq!(findings.len(), 1);
    }
}
