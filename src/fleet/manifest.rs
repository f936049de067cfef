//! A manifest: one row a record with its path, its output's name and its own options, as CSV or JSON Lines.

use std::io::Read;
use std::path::PathBuf;

use serde_json::{Map, Value};

use crate::error::{Error, Result};
use crate::fleet::list::Item;
use crate::fleet::recipe::layer_of;
use crate::place::{Place, escape};
use crate::settings::{find, nearest, rows};

/// Columns that are no options.
const PATH: &str = "path";
const OUTPUT: &str = "output";

/// Reads a manifest. The first column names are `path` and, where wanted, `output`; all others are options, such as
/// `channel`, `calibrate`, `assert`. In CSV several values stand in one cell with `;` between them, and an empty cell leaves
/// the option to recipe and command line.
///
/// # Errors
/// `Usage` with the line for unknown columns, values that do not parse, and rows without a path; `Io` where it cannot be
/// read.
pub fn read(mut source: impl Read, label: &str) -> Result<Vec<Item>> {
    let mut text = String::new();
    source.read_to_string(&mut text).map_err(|error| Error::from(error).at(Place::file(label)))?;
    let text = text.strip_prefix('\u{feff}').unwrap_or(&text);
    let items = if text.trim_start().starts_with('{') { from_lines(text) } else { from_table(text) };
    items.map_err(|error| error.at(Place::file(label)))
}

fn from_lines(text: &str) -> Result<Vec<Item>> {
    let lines = text.lines().enumerate().filter(|(_, line)| !line.trim().is_empty());
    let item = |(number, line): (usize, &str)| {
        let place = Place::line(number as u64 + 1);
        let map: Map<String, Value> = serde_json::from_str(line)
            .map_err(|error| Error::usage(format!("not a JSON object: {error}")).at(place.clone()))?;
        item_of(map).map_err(|error| error.at(place))
    };
    lines.map(item).collect()
}

fn from_table(text: &str) -> Result<Vec<Item>> {
    let fault = |error: csv::Error| {
        let line = error.position().map_or(0, csv::Position::line);
        Error::usage(format!("not a table: {error}")).at(Place::line(line))
    };
    let mut reader = csv::ReaderBuilder::new().trim(csv::Trim::All).from_reader(text.as_bytes());
    let header = reader.headers().map_err(fault)?.clone();
    for (column, key) in header.iter().enumerate() {
        check_key(key).map_err(|error| error.at(Place::field(1, column as u64 + 1)))?;
    }
    let mut items = Vec::new();
    for row in reader.records() {
        let row = row.map_err(fault)?;
        let mut map = Map::new();
        for (key, cell) in header.iter().zip(row.iter()).filter(|(_, cell)| !cell.is_empty()) {
            let value = match key {
                PATH | OUTPUT => Value::from(cell),
                _ => cell.split(';').map(str::trim).filter(|part| !part.is_empty()).map(Value::from).collect(),
            };
            map.insert(key.to_owned(), value);
        }
        let place = Place::line(row.position().map_or(0, csv::Position::line));
        items.push(item_of(map).map_err(|error| error.at(place))?);
    }
    Ok(items)
}

fn item_of(mut map: Map<String, Value>) -> Result<Item> {
    for key in map.keys() {
        check_key(key)?;
    }
    let mut name = |key: &str| match map.remove(key) {
        None | Some(Value::Null) => Ok(None),
        Some(Value::String(text)) if !text.is_empty() => Ok(Some(PathBuf::from(text))),
        Some(_) => Err(Error::usage(format!("{key}: not a name"))),
    };
    let (path, output) = (name(PATH)?, name(OUTPUT)?);
    let path = path.ok_or_else(|| Error::usage("a row without \"path\"").remedy("name the record in column path"))?;
    Ok(Item { path, output, layer: layer_of(&map)? })
}

fn check_key(key: &str) -> Result<()> {
    if matches!(key, PATH | OUTPUT) || find(key).is_some() {
        return Ok(());
    }
    let all = rows();
    let error = Error::usage(format!("unknown column \"{}\"", escape(key)));
    Err(match nearest(key, all.iter().map(|row| row.key).chain([PATH, OUTPUT])) {
        Some(known) => error.remedy(format!("did you mean \"{known}\"?")),
        None => error.remedy("columns are path, output and the options without their dashes"),
    })
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_table_and_json_lines_say_the_same() {
        let table = "path,output,channel,calibrate,assert\na.csv,one.csv,ax;ay,ax=9.81m/s2;ay=2,left:zero-slope\n\"b,c.csv\",,,,\n";
        let lines = r#"{"path":"a.csv","output":"one.csv","channel":["ax","ay"],"calibrate":["ax=9.81m/s2","ay=2"],"assert":"left:zero-slope"}
{"path":"b,c.csv"}
"#;
        let items = read(table.as_bytes(), "m.csv").expect("a manifest");
        assert_eq!(items, read(lines.as_bytes(), "m.jsonl").expect("a manifest"));
        assert_eq!(items[0].output, Some(PathBuf::from("one.csv")));
        assert_eq!(items[0].layer.settings().expect("values").read.calibrate.len(), 2);
        assert!(items[1].layer.is_empty());
    }

    #[test]
    fn faults_tell_line_and_column() {
        for (text, told) in [
            ("path,chanel\na,b\n", "m:1:2: unknown column \"chanel\"; did you mean \"channel\"?"),
            ("path,lowpass\na.csv,4Hz\nb.csv,4\n", "m:3: --lowpass"),
            ("path,lowpass\n,4Hz\n", "m:2: a row without \"path\""),
            ("path\na,b\n", "m:2: not a table"),
            ("{\"path\": \"a\"}\n{\"path\": 3}\n", "m:2: path: not a name"),
            ("{\"path\"\n", "m:1: not a JSON object"),
        ] {
            let error = read(text.as_bytes(), "m").expect_err(text).to_string();
            assert!(error.contains(told), "{text}: {error}");
        }
    }
}
