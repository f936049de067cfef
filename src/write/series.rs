//! The series of a spectrum as delimited text: a header with units, one row a line.

use super::field::push_field;
use super::number::{self, Digits};
use crate::report::{ChannelSpectrum, SpectrumReport};

/// A named column.
struct Column<'a> {
    name: String,
    values: Values<'a>,
}

#[derive(Clone, Copy, PartialEq)]
enum Values<'a> {
    All(&'a [f64]),
    Some(&'a [Option<f64>]),
    Counted(usize),
}

impl Values<'_> {
    fn len(&self) -> usize {
        match self {
            Values::All(values) => values.len(),
            Values::Some(values) => values.len(),
            Values::Counted(count) => *count,
        }
    }

    fn at(&self, row: usize) -> Option<f64> {
        match self {
            Values::All(values) => values.get(row).copied(),
            Values::Some(values) => values.get(row).copied().flatten(),
            Values::Counted(count) => (row < *count).then_some(row as f64),
        }
    }
}

/// Every series of a spectrum in columns, commas between them, the shortest digits that give the same numbers again. Columns
/// of frequency stand before the first column that needs them; shorter columns end in blank cells.
pub fn spectrum_csv(report: &SpectrumReport) -> Vec<u8> {
    let mut columns: Vec<Column<'_>> = Vec::new();
    for channel in &report.channels {
        of_channel(channel, report, &mut columns);
    }
    let rows = columns.iter().map(|column| column.values.len()).max().unwrap_or(0);
    let mut out = Vec::new();
    for (index, column) in columns.iter().enumerate() {
        if index > 0 {
            out.push(b',');
        }
        push_field(&mut out, &column.name, b',');
    }
    out.push(b'\n');
    for row in 0..rows {
        for (index, column) in columns.iter().enumerate() {
            if index > 0 {
                out.push(b',');
            }
            if let Some(value) = column.values.at(row).filter(|value| value.is_finite()) {
                number::push(&mut out, value, Digits::Shortest, b'.');
            }
        }
        out.push(b'\n');
    }
    out
}

fn of_channel<'a>(channel: &'a ChannelSpectrum, report: &'a SpectrumReport, columns: &mut Vec<Column<'a>>) {
    let several = channel.traces.len() > 1;
    for trace in &channel.traces {
        let name = |what: &str, unit: &str| {
            let label = if several { format!(" {}", trace.label) } else { String::new() };
            let unit = if unit.is_empty() { String::new() } else { format!(" [{unit}]") };
            format!("{}{label} {what}{unit}", channel.name)
        };
        if let Some((density, series)) = trace.density.as_ref().and_then(|d| d.series.as_ref().map(|s| (d, s))) {
            frequencies(columns, &series.frequency, density.frequency_unit);
            for (what, values) in [("density", &series.density), ("lower", &series.lower), ("upper", &series.upper)] {
                columns.push(Column { name: name(what, &density.unit), values: Values::All(values) });
            }
        }
        if let Some((found, series)) = trace.coefficients.as_ref().and_then(|c| c.series.as_ref().map(|s| (c, s))) {
            if frequencies(columns, &series.frequency, found.frequency_unit) {
                columns.push(Column { name: "half-cycles".to_owned(), values: Values::All(&series.half_cycles) });
            }
            let unit = found.unit.label();
            columns.push(Column { name: name("coefficient", unit), values: Values::All(&series.value) });
            columns.push(Column { name: name("amplitude", unit), values: Values::All(&series.amplitude) });
        }
    }
    if let Some(gain) = &channel.gain
        && report.channels.first().is_some_and(|first| std::ptr::eq(first, channel))
    {
        columns.push(Column { name: "gain".to_owned(), values: Values::All(gain) });
    }
    if let Some(ratio) = &channel.ratio {
        for (what, values) in [("ratio", &ratio.ratio), ("ratio lower", &ratio.lower), ("ratio upper", &ratio.upper)] {
            columns.push(Column { name: format!("{} {what}", channel.name), values: Values::Some(values) });
        }
    }
}

/// Adds index and frequency unless the last frequencies are the same; tells whether it did.
fn frequencies<'a>(columns: &mut Vec<Column<'a>>, values: &'a [f64], unit: &str) -> bool {
    let name = format!("frequency [{unit}]");
    let last = columns.iter().rev().find(|column| column.name == name);
    if last.is_some_and(|column| column.values == Values::All(values)) {
        return false;
    }
    if columns.is_empty() {
        columns.push(Column { name: "index".to_owned(), values: Values::Counted(values.len()) });
    }
    columns.push(Column { name, values: Values::All(values) });
    true
}
