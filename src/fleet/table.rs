//! Joined results as one flat table for a spreadsheet: a row for each channel, text that no spreadsheet takes for a formula.

use std::io::Write;

use serde_json::Value;

use crate::error::{Error, Result};

/// A column: its heading and its cell for a record and one of its channels.
struct Column {
    name: &'static str,
    cell: fn(&Value, &Value) -> Cell,
}

enum Cell {
    Blank,
    Number(f64),
    Text(String),
}

/// The value at a path of keys.
pub fn at<'v>(value: &'v Value, path: &str) -> &'v Value {
    path.split('.').fold(value, |value, key| &value[key])
}

fn text(value: &Value) -> Cell {
    match value {
        Value::String(text) => Cell::Text(text.clone()),
        Value::Bool(true) => Cell::Text("yes".to_owned()),
        Value::Bool(false) => Cell::Text("no".to_owned()),
        Value::Number(number) => number.as_f64().map_or(Cell::Blank, Cell::Number),
        _ => Cell::Blank,
    }
}

fn number(value: Option<f64>) -> Cell {
    value.filter(|value| value.is_finite()).map_or(Cell::Blank, Cell::Number)
}

/// The audit of the channel with this name.
fn audited<'v>(line: &'v Value, channel: &Value) -> &'v Value {
    const NONE: &Value = &Value::Null;
    let channels = line["audit"]["channels"].as_array();
    channels.and_then(|all| all.iter().find(|one| one["name"] == channel["name"])).unwrap_or(NONE)
}

/// Of two numbers, where both are there and the lower is positive.
pub fn ratio(above: &Value, below: &Value) -> Option<f64> {
    Some(above.as_f64()? / below.as_f64().filter(|below| *below > 0.0)?)
}

fn last_stamp(line: &Value) -> Option<f64> {
    let axis = at(line, "input.axis");
    Some(axis["start"].as_f64()? + (at(line, "input.samples").as_f64()? - 1.0) * axis["step"].as_f64()?)
}

fn trusted_share(line: &Value, channel: &Value) -> Option<f64> {
    let span = &channel["trusted"];
    let count = span["last"].as_f64()? - span["first"].as_f64()? + 1.0;
    Some(100.0 * count / at(line, "input.samples").as_f64()?)
}

fn clipped(line: &Value, channel: &Value) -> Cell {
    let clipping = &audited(line, channel)["clipping"];
    if clipping.is_null() {
        return Cell::Blank;
    }
    Cell::Text(if clipping["high"].is_null() && clipping["low"].is_null() { "no" } else { "yes" }.to_owned())
}

fn notes(line: &Value, channel: &Value) -> Cell {
    let of = |value: &Value| -> Vec<String> {
        let codes = value.as_array().into_iter().flatten().filter_map(|note| note["code"].as_str());
        codes.map(str::to_owned).collect()
    };
    let mut codes = of(&line["notes"]);
    codes.extend(of(at(line, "audit.findings")));
    codes.extend(of(&channel["notes"]));
    codes.sort();
    codes.dedup();
    if codes.is_empty() { Cell::Blank } else { Cell::Text(codes.join("; ")) }
}

/// Where a record failed, in words; empty where there is no place.
pub fn failure_place(line: &Value) -> String {
    let place = at(line, "failure.place");
    let parts = ["line", "column", "byte", "channel", "sample"].iter().filter_map(|key| match &place[key] {
        Value::Null => None,
        Value::String(text) => Some(format!("{key} {text}")),
        other => Some(format!("{key} {other}")),
    });
    parts.collect::<Vec<_>>().join(", ")
}

/// The columns, in order. A heading ends in its unit where the unit is not a column of its own.
#[rustfmt::skip]
static COLUMNS: &[Column] = &[
    Column { name: "record", cell: |line, _| text(&line["record"]) },
    Column { name: "path", cell: |line, _| text(&line["path"]) },
    Column { name: "output", cell: |line, _| text(&line["outputs"][0]["path"]) },
    Column { name: "status", cell: |line, _| text(&line["status"]) },
    Column { name: "failure", cell: |line, _| text(at(line, "failure.kind")) },
    Column { name: "failure_text", cell: |line, _| text(at(line, "failure.text")) },
    Column { name: "failure_place", cell: |line, _| Cell::Text(failure_place(line)) },
    Column { name: "failure_remedy", cell: |line, _| text(at(line, "failure.remedy")) },
    Column { name: "same_as_record", cell: |line, _| text(&line["same_as"]) },
    Column { name: "samples", cell: |line, _| text(at(line, "input.samples")) },
    Column { name: "rate_per_s_or_m", cell: |line, _| text(at(line, "input.axis.rate")) },
    Column { name: "start", cell: |line, _| text(at(line, "input.axis.start")) },
    Column { name: "end", cell: |line, _| number(last_stamp(line)) },
    Column { name: "axis_unit", cell: |line, _| text(at(line, "input.axis.unit")) },
    Column { name: "channel", cell: |_, channel| text(&channel["name"]) },
    Column { name: "unit", cell: |_, channel| text(&channel["unit"]) },
    Column { name: "extension", cell: |_, channel| text(at(channel, "extension.kind")) },
    Column { name: "chosen_by", cell: |_, channel| text(at(channel, "extension.how")) },
    Column { name: "baseline", cell: |_, channel| text(&channel["baseline"]) },
    Column { name: "reach_samples", cell: |_, channel| text(&channel["reach_samples"]) },
    Column { name: "adequacy", cell: |_, channel| text(at(channel, "verdict.adequacy")) },
    Column { name: "edge_error", cell: |_, channel| text(at(channel, "verdict.predicted_error")) },
    Column { name: "edge_error_percent_of_deviation", cell: |_, channel| {
        number(ratio(at(channel, "verdict.predicted_error"), at(channel, "verdict.output_deviation")).map(|share| 100.0 * share))
    } },
    Column { name: "edge_error_bound", cell: |_, channel| text(at(channel, "verdict.bound")) },
    Column { name: "tolerance", cell: |_, channel| text(at(channel, "verdict.tolerance")) },
    Column { name: "requirement_met", cell: |line, _| text(&line["requirement_met"]) },
    Column { name: "trusted_from", cell: |_, channel| text(at(channel, "trusted.from")) },
    Column { name: "trusted_to", cell: |_, channel| text(at(channel, "trusted.to")) },
    Column { name: "trusted_percent", cell: |line, channel| number(trusted_share(line, channel)) },
    Column { name: "rms_in", cell: |_, channel| text(at(channel, "rms.in")) },
    Column { name: "rms_out", cell: |_, channel| text(at(channel, "rms.out")) },
    Column { name: "noise", cell: |line, channel| text(&audited(line, channel)["noise"]) },
    Column { name: "clipped", cell: clipped },
    Column { name: "spikes", cell: |line, channel| text(at(audited(line, channel), "spikes.count")) },
    Column { name: "missing_values", cell: |line, channel| text(&audited(line, channel)["missing"]) },
    Column { name: "notes", cell: notes },
    Column { name: "input_sha256", cell: |line, _| text(&line["input_sha256"]) },
];

/// The table being written.
pub struct Sheet<W: Write> {
    writer: csv::Writer<W>,
}

impl<W: Write> Sheet<W> {
    /// A table with its headings.
    ///
    /// # Errors
    /// `Io` where they cannot be written.
    pub fn new(sink: W) -> Result<Sheet<W>> {
        let mut writer = csv::Writer::from_writer(sink);
        writer.write_record(COLUMNS.iter().map(|column| column.name)).map_err(fault)?;
        Ok(Sheet { writer })
    }

    /// A row for each channel of a line of results; one for a record without.
    ///
    /// # Errors
    /// `Io` where they cannot be written.
    pub fn add(&mut self, line: &Value) -> Result<()> {
        let none = [Value::Null];
        let channels = line["channels"].as_array().filter(|all| !all.is_empty()).map_or(&none[..], Vec::as_slice);
        for channel in channels {
            let cells = COLUMNS.iter().map(|column| match (column.cell)(line, channel) {
                Cell::Blank => String::new(),
                Cell::Number(value) => value.to_string(),
                Cell::Text(text) => defused(text),
            });
            self.writer.write_record(cells).map_err(fault)?;
        }
        Ok(())
    }

    /// Everything to the sink.
    ///
    /// # Errors
    /// `Io` where it cannot be written.
    pub fn finish(mut self) -> Result<()> {
        Ok(self.writer.flush()?)
    }
}

fn fault(error: csv::Error) -> Error {
    match error.into_kind() {
        csv::ErrorKind::Io(error) => error.into(),
        other => Error::io(format!("the table cannot be written: {other:?}")),
    }
}

/// Text that a spreadsheet would run as a formula gets an apostrophe in front (OWASP, CSV Injection).
fn defused(text: String) -> String {
    let head = text.trim_start_matches([' ', '\u{a0}']).chars().next();
    match head {
        Some('=' | '+' | '-' | '@' | '\t' | '\r' | '\n' | '\u{ff1d}' | '\u{ff0b}' | '\u{ff0d}' | '\u{ff20}') => {
            format!("'{text}")
        }
        _ => text,
    }
}

/// How bad a record is: failures first, then the largest edge error for its tolerance, then what was not judged.
pub fn rank(line: &Value) -> f64 {
    if line["status"] == "failed" {
        return f64::INFINITY;
    }
    let channels = line["channels"].as_array().map_or(&[][..], Vec::as_slice);
    let shares = channels.iter().filter_map(|c| ratio(at(c, "verdict.predicted_error"), at(c, "verdict.tolerance")));
    shares.fold(-1.0, f64::max)
}

#[cfg(test)]
mod tests {
    use serde_json::json;

    use super::*;

    #[test]
    fn formulas_are_defused_and_numbers_are_not() {
        let line = json!({
            "record": 3, "path": "=cmd|' /C calc'!A0", "status": "done", "input": {"samples": 5, "axis": {"start": -1.0, "step": 0.5}},
            "channels": [{"name": "@x", "rms": {"in": -2.5}}, {"name": "-1+1", "trusted": {"first": 1, "last": 3}}],
        });
        let mut bytes = Vec::new();
        let mut sheet = Sheet::new(&mut bytes).expect("headings");
        sheet.add(&line).expect("rows");
        sheet.finish().expect("flushed");
        // An independent look at the bytes: no cell begins as a formula but the numbers do not change.
        let text = String::from_utf8(bytes).expect("UTF-8");
        let rows: Vec<&str> = text.lines().collect();
        assert_eq!(rows.len(), 3);
        assert!(rows[1].starts_with("3,'=cmd|' /C calc'!A0,,done,"), "{}", rows[1]);
        assert!(rows[1].contains(",'@x,") && rows[1].contains(",-2.5,"), "{}", rows[1]);
        assert!(rows[2].contains(",'-1+1,") && rows[2].contains(",60,"), "{}", rows[2]);
        assert!(rows[1].contains(",5,,-1,1,"), "start and end: {}", rows[1]);
    }

    #[test]
    fn the_worst_come_first() {
        let of = |error: f64| json!({"status": "done", "channels": [{"verdict": {"predicted_error": error, "tolerance": 2.0}}]});
        let failed = rank(&json!({"status": "failed"}));
        let (bad, good, open) = (rank(&of(4.0)), rank(&of(1.0)), rank(&json!({"status": "done", "channels": []})));
        assert!(failed > bad && bad > good && good > open, "{failed} {bad} {good} {open}");
    }
}
