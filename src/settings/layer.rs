//! Options from one origin, as texts by key: a command line, a recipe, a row of a manifest. The nearer layer wins, key by key.

use std::collections::BTreeMap;

use serde_json::{Map, Value};

use super::{Settings, known, rows};
use crate::error::{Error, Result};

/// Some options as written, none of them read yet.
#[derive(Debug, Clone, Default, PartialEq, Eq)]
pub struct Layer {
    texts: BTreeMap<&'static str, Vec<String>>,
}

impl Layer {
    /// Adds the values of a key to those it has in this layer.
    ///
    /// # Errors
    /// `Usage` for an unknown key, with the nearest known one.
    pub fn add(&mut self, key: &str, values: impl IntoIterator<Item = String>) -> Result<()> {
        self.texts.entry(known(key)?.key).or_default().extend(values);
        Ok(())
    }

    /// The options of a JSON object, such as `settings` of a result: `null` stands for a key that is not set.
    ///
    /// # Errors
    /// `Usage` for unknown keys, and for values that are no text, number, switch or list of these.
    pub fn from_map(map: &Map<String, Value>) -> Result<Layer> {
        let mut layer = Layer::default();
        for (key, value) in map {
            let texts = match value {
                Value::Null => continue,
                Value::Array(values) => values.iter().map(|value| text(key, value)).collect::<Result<Vec<_>>>()?,
                single => vec![text(key, single)?],
            };
            if !texts.is_empty() {
                layer.add(key, texts)?;
            }
        }
        Ok(layer)
    }

    /// This layer, with the keys it leaves open taken from the one below it.
    #[must_use]
    pub fn over(&self, below: &Layer) -> Layer {
        let mut texts = below.texts.clone();
        texts.extend(self.texts.iter().map(|(key, values)| (*key, values.clone())));
        Layer { texts }
    }

    /// Without the keys for which `keep` is false.
    #[must_use]
    pub fn only(mut self, keep: impl Fn(&str) -> bool) -> Layer {
        self.texts.retain(|key, _| keep(key));
        self
    }

    /// True when nothing is set.
    pub fn is_empty(&self) -> bool {
        self.texts.is_empty()
    }

    /// Reads the values.
    ///
    /// # Errors
    /// `Usage` that names the option of a value that does not parse.
    pub fn settings(&self) -> Result<Settings> {
        let mut settings = Settings::default();
        // In the order of the table: the same options give the same settings wherever they came from.
        for row in rows() {
            for text in self.texts.get(row.key).into_iter().flatten() {
                settings.set(row.key, text)?;
            }
        }
        Ok(settings)
    }
}

fn text(key: &str, value: &Value) -> Result<String> {
    match value {
        Value::String(text) => Ok(text.clone()),
        Value::Number(number) => Ok(number.to_string()),
        Value::Bool(switch) => Ok(switch.to_string()),
        _ => Err(Error::usage(format!("{key}: neither a text, a number, a switch nor a list of these"))),
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn layer(json: &str) -> Layer {
        Layer::from_map(serde_json::from_str::<Value>(json).expect("JSON").as_object().expect("an object"))
            .expect("known keys")
    }

    #[test]
    fn the_nearer_layer_wins_key_by_key() {
        let below = layer(r#"{"lowpass": ["40Hz"], "notch": ["50Hz:2Hz", "60Hz:2Hz"], "decimals": 5, "strict": true}"#);
        let above = layer(r#"{"notch": "100Hz:2Hz", "strict": false, "rate": null, "channel": []}"#);
        let map = above.over(&below).settings().expect("good values").to_map();
        assert_eq!(map["lowpass"], serde_json::json!(["40Hz"]));
        assert_eq!(map["notch"], serde_json::json!(["100Hz:2Hz"]));
        assert_eq!((&map["decimals"], &map["strict"]), (&Value::from("5"), &Value::from(false)));
    }

    #[test]
    fn what_results_show_gives_the_same_settings_again() {
        let first = layer(r#"{"lowpass": ["40Hz", "20Hz"], "highpass": "1Hz", "regrid": "auto", "baseline": "line"}"#);
        let map = first.settings().expect("good values").to_map();
        let again = Layer::from_map(&map).expect("known keys").settings().expect("good values");
        assert_eq!(again.to_map(), map);
        assert_eq!(again.requests, first.settings().expect("good values").requests);
    }
}
