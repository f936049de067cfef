//! A recipe: the options of a run in a file, with exceptions for some records. Any JSON result is one too.

use globset::{Glob, GlobMatcher};
use serde_json::{Map, Value};
use toml::de::{DeTable, DeValue};

use crate::error::{Error, Result};
use crate::fleet::name::Template;
use crate::place::{Place, escape};
use crate::settings::{Layer, nearest, rows};

/// What a recipe asks for.
#[derive(Debug, Clone, Default)]
pub struct Recipe {
    /// The options for every record.
    pub base: Layer,
    /// How outputs are named, where the recipe tells.
    pub name: Option<Template>,
    /// Exceptions in the order written; a later one wins over an earlier one.
    overrides: Vec<(GlobMatcher, Layer)>,
}

/// Keys that only recipes have.
const NAME: &str = "name";
const OVERRIDE: &str = "override";
const MATCH: &str = "match";

impl Recipe {
    /// Reads a recipe: TOML, or a JSON result whose `settings` are taken. `label` names it in errors.
    ///
    /// # Errors
    /// `Usage` with line and column for what is no TOML or JSON, for unknown keys with the nearest known one, and for values
    /// that do not parse.
    pub fn parse(text: &str, label: &str) -> Result<Recipe> {
        let recipe = if text.trim_start().starts_with(['{', '[']) && serde_json::from_str::<Value>(text).is_ok() {
            from_result(text)
        } else if text.trim_start().starts_with('{') {
            from_lines(text)
        } else {
            from_toml(text)
        };
        recipe.map_err(|error| error.at(Place::file(label)))
    }

    /// Which exceptions are for this path, by their place in the recipe.
    pub fn overrides_of(&self, path: &std::path::Path) -> Vec<usize> {
        (0..self.overrides.len()).filter(|&index| self.overrides[index].0.is_match(path)).collect()
    }

    /// The options for a record that these exceptions are for.
    pub fn layer(&self, overrides: &[usize]) -> Layer {
        overrides.iter().fold(self.base.clone(), |below, &index| self.overrides[index].1.over(&below))
    }
}

/// A JSON result, or the list of results that `audit` writes: all have the same settings.
fn from_result(text: &str) -> Result<Recipe> {
    let value: Value = serde_json::from_str(text).map_err(|error| fault_in_json(&error))?;
    let result = value.as_array().and_then(|list| list.first()).unwrap_or(&value);
    let Some(settings) = result.get("settings").and_then(Value::as_object) else {
        return Err(Error::usage("a JSON file without \"settings\"").remedy("give a result of this program, or TOML"));
    };
    let base = Layer::from_map(settings)?;
    base.settings()?;
    Ok(Recipe { base, ..Recipe::default() })
}

/// The first line of a file of results.
fn from_lines(text: &str) -> Result<Recipe> {
    let mut last = None;
    for (number, line) in text.lines().enumerate() {
        match serde_json::from_str::<Value>(line) {
            Ok(value) if value.get("settings").is_some() => return from_result(line),
            Ok(_) => {}
            Err(error) => {
                last = Some(fault_in_json(&error).at(Place::field(number as u64 + 1, error.column() as u64)));
                break;
            }
        }
    }
    Err(last.unwrap_or_else(|| Error::usage("JSON Lines without \"settings\"").remedy("give a result, or TOML")))
}

fn fault_in_json(error: &serde_json::Error) -> Error {
    let place = Place::field(error.line() as u64, error.column() as u64);
    Error::usage(format!("not JSON: {error}")).at(place)
}

fn from_toml(text: &str) -> Result<Recipe> {
    let place = |byte: usize| {
        let before = text.get(..byte).unwrap_or(text);
        let start = before.rfind('\n').map_or(0, |at| at + 1);
        Place::field(before.matches('\n').count() as u64 + 1, before[start..].chars().count() as u64 + 1)
    };
    let table = DeTable::parse(text).map_err(|error| {
        let fault = Error::usage(format!("not TOML: {}", error.message().trim()));
        let fault = fault.remedy("write one KEY = \"VALUE\" a line; `endgrain generate recipe` shows all keys");
        error.span().map_or(fault.clone(), |span| fault.at(place(span.start)))
    })?;
    let mut recipe = Recipe::default();
    for (key, value) in table.get_ref() {
        let here = || place(key.span().start);
        match (key.get_ref().as_ref(), value.get_ref()) {
            (NAME, DeValue::String(template)) => {
                recipe.name = Some(Template::parse(template).map_err(|error| error.at(here()))?);
            }
            (OVERRIDE, DeValue::Array(list)) => {
                for entry in list.iter() {
                    let at = place(entry.span().start);
                    let Some(table) = entry.get_ref().as_table() else {
                        return Err(Error::usage("an override is a table").remedy("write [[override]]").at(at));
                    };
                    recipe.overrides.push(exception(table, &place).map_err(|error| error.at(at))?);
                }
            }
            (OVERRIDE, _) => {
                return Err(Error::usage("override is no list").remedy("write [[override]]").at(here()));
            }
            (own, value) => option(own, value, &mut recipe.base).map_err(|error| error.at(here()))?,
        }
    }
    Ok(recipe)
}

/// An exception: the pattern of its paths and its options.
fn exception(table: &DeTable<'_>, place: &dyn Fn(usize) -> Place) -> Result<(GlobMatcher, Layer)> {
    let (mut pattern, mut layer) = (None, Layer::default());
    for (key, value) in table {
        let read = match (key.get_ref().as_ref(), value.get_ref()) {
            (MATCH, DeValue::String(text)) => glob(text).map(|matcher| pattern = Some(matcher)),
            (own, value) => option(own, value, &mut layer),
        };
        read.map_err(|error| error.at(place(key.span().start)))?;
    }
    let without =
        || Error::usage("an override without \"match\"").remedy("add match = \"PATTERN\", such as \"*/tower_*.csv\"");
    Ok((pattern.ok_or_else(without)?, layer))
}

fn glob(text: &str) -> Result<GlobMatcher> {
    let glob = Glob::new(text)
        .map_err(|error| Error::usage(format!("match: not a pattern: \"{}\": {}", escape(text), error.kind())))?;
    Ok(glob.compile_matcher())
}

/// One option: known, and of a value that parses.
fn option(key: &str, value: &DeValue<'_>, layer: &mut Layer) -> Result<()> {
    let values = match value {
        DeValue::Array(values) => {
            values.iter().map(|value| text_of(key, value.get_ref())).collect::<Result<Vec<_>>>()?
        }
        single => vec![text_of(key, single)?],
    };
    if crate::settings::find(key).is_none() {
        let all = rows();
        let keys = all.iter().map(|row| row.key).chain([NAME, OVERRIDE, MATCH]);
        let error = Error::usage(format!("unknown key \"{}\"", escape(key)));
        return Err(match nearest(key, keys) {
            Some(known) => error.remedy(format!("did you mean \"{known}\"?")),
            None => error.remedy("`endgrain generate recipe` shows all keys"),
        });
    }
    // Alone first: a fault is then told with the line of this key.
    let mut alone = Layer::default();
    alone.add(key, values.clone())?;
    alone.settings()?;
    layer.add(key, values)
}

fn text_of(key: &str, value: &DeValue<'_>) -> Result<String> {
    match value {
        DeValue::String(text) => Ok(text.to_string()),
        DeValue::Integer(number) => Ok(number.to_string()),
        DeValue::Float(number) => Ok(number.to_string()),
        DeValue::Boolean(switch) => Ok(switch.to_string()),
        _ => Err(Error::usage(format!("{key}: neither a text, a number, a switch nor a list of these"))),
    }
}

/// The options of one line of a manifest in JSON.
pub(super) fn layer_of(map: &Map<String, Value>) -> Result<Layer> {
    let layer = Layer::from_map(map)?;
    layer.settings()?;
    Ok(layer)
}

#[cfg(test)]
mod tests {
    use std::path::Path;

    use super::*;

    const RECIPE: &str = r#"
# every log
lowpass = "40Hz"
notch = ["50Hz:2Hz", "100Hz:2Hz"]
decimals = 5
strict = true
name = "{stem}_clean.csv"

[[override]]
match = "**/tower_*.csv"
lowpass = "20Hz"

[[override]]
match = "north/*"
strict = false
"#;

    #[test]
    fn exceptions_replace_what_they_name() {
        let recipe = Recipe::parse(RECIPE, "r.toml").expect("a recipe");
        let map = |path: &str| recipe.layer(&recipe.overrides_of(Path::new(path))).settings().expect("values").to_map();
        assert_eq!(map("a.csv")["lowpass"], serde_json::json!(["40Hz"]));
        assert_eq!(map("a.csv")["notch"], serde_json::json!(["50Hz:2Hz", "100Hz:2Hz"]));
        assert_eq!(map("x/tower_1.csv")["lowpass"], serde_json::json!(["20Hz"]));
        assert_eq!(map("north/tower_1.csv")["strict"], false);
        assert_eq!(map("x/tower_1.csv")["strict"], true);
        assert!(recipe.name.is_some());
    }

    #[test]
    fn faults_tell_line_and_remedy() {
        for (text, told) in [
            ("lowpas = \"4Hz\"\n", "r.toml:1:1: unknown key \"lowpas\"; did you mean \"lowpass\"?"),
            ("\n\nlowpass = \"4\"\n", "r.toml:3:1: --lowpass: \"4\": a corner without a unit"),
            ("a = \n", "r.toml:1:"),
            ("[[override]]\nlowpass = \"4Hz\"\n", "an override without \"match\""),
            ("[[override]]\nmatch = \"[\"\n", "r.toml:2:1: match: not a pattern"),
            ("rate = 2001-01-01\n", "r.toml:1:1: rate: neither"),
            ("{\"a\": 1}", "without \"settings\""),
            ("{\"settings\": {\"lowpas\": \"4Hz\"}}", "did you mean"),
        ] {
            let error = Recipe::parse(text, "r.toml").expect_err(text).to_string();
            assert!(error.contains(told), "{text}: {error}");
        }
    }
}
