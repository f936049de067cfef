//! The numbers behind a page's figures, as CSV and as JSON.

use serde::Serialize;
use serde_json::{Value, json};

use crate::error::{Error, Result};
use crate::report::page::{Figure, Page};
use crate::report::{SCHEMA, to_json};

/// One row a point: `figure,line,place,place_unit,value,value_unit,low,high`; bands have limits instead of a value.
pub fn figures_csv(page: &Page) -> String {
    let mut text = String::from("figure,line,place,place_unit,value,value_unit,low,high\n");
    for figure in page.figures() {
        let (title, across, upwards) = (field(&figure.title), field(&figure.x.unit), field(&figure.y.unit));
        for line in &figure.lines {
            let name = field(&line.name);
            for [x, y] in &line.points {
                // A break in a line has a place but no value.
                let y = if y.is_finite() { y.to_string() } else { String::new() };
                text.push_str(&format!("{title},{name},{x},{across},{y},{upwards},,\n"));
            }
        }
        for band in &figure.bands {
            let name = field(&band.name);
            for [x, low, high] in &band.points {
                text.push_str(&format!("{title},{name},{x},{across},,{upwards},{low},{high}\n"));
            }
        }
    }
    text
}

/// A result with the figures of its page under `figures`.
///
/// # Errors
/// `Io` when a value cannot be represented, which no report contains.
pub fn figures_json<T: Serialize>(report: &T, page: &Page) -> Result<String> {
    let figures: Vec<&Figure> = page.figures().collect();
    let mut value = serde_json::to_value(report).map_err(|e| Error::io(format!("no JSON: {e}")))?;
    match &mut value {
        Value::Object(map) => {
            map.insert("figures".to_owned(), json!(figures));
        }
        other => *other = json!({ "schema": SCHEMA, "results": other.take(), "figures": figures }),
    }
    to_json(&value)
}

/// A text as a CSV field (RFC 4180, 2.5 to 2.7). One that a spreadsheet would take for a formula gains an apostrophe.
fn field(text: &str) -> String {
    let formula = text.starts_with(['=', '+', '-', '@', '\t', '\r']);
    let text = if formula { format!("'{text}") } else { text.to_owned() };
    if text.contains(['"', ',', '\n', '\r']) { format!("\"{}\"", text.replace('"', "\"\"")) } else { text }
}

#[cfg(test)]
mod tests {
    use super::field;

    #[test]
    fn hostile_names_stay_text() {
        assert_eq!(field("=1+1"), "'=1+1");
        assert_eq!(field("a,\"b\""), "\"a,\"\"b\"\"\"");
        assert_eq!(field("ax"), "ax");
    }
}
