//! The settings that the records of a batch share, and those in which they differ.

use std::collections::BTreeMap;

use serde_json::{Map, Value};

/// Settings over many records.
#[derive(Debug, Clone, Default)]
pub struct Agreement {
    records: u64,
    keys: BTreeMap<String, Key>,
}

#[derive(Debug, Clone, Default)]
struct Key {
    value: Option<Value>,
    records: u64,
    differs: bool,
    used: bool,
}

impl Agreement {
    /// Takes the settings of a line of results in. A record that failed does not tell what its output would have resolved.
    pub fn count(&mut self, line: &Value) {
        let Some(settings) = line["settings"].as_object().filter(|settings| !settings.is_empty()) else { return };
        self.records += 1;
        let failed = line["status"] == "failed";
        for (name, value) in settings {
            let key = self.keys.entry(name.clone()).or_default();
            key.records += 1;
            if failed && value.is_null() {
                continue;
            }
            key.differs |= key.value.as_ref().is_some_and(|known| known != value);
            key.value.get_or_insert_with(|| value.clone());
            key.used |=
                !matches!(value, Value::Null | Value::Bool(false)) && value.as_array().is_none_or(|v| !v.is_empty());
        }
    }

    /// The settings that are the same everywhere.
    pub fn shared(&self) -> Map<String, Value> {
        let same = self.keys.iter().filter(|(_, key)| self.is_shared(key));
        same.map(|(name, key)| (name.clone(), key.value.clone().unwrap_or_default())).collect()
    }

    /// Names of the others.
    pub fn differing(&self) -> Vec<String> {
        self.keys.iter().filter(|(_, key)| !self.is_shared(key)).map(|(name, _)| name.clone()).collect()
    }

    /// True where any record was given this one.
    pub fn uses(&self, name: &str) -> bool {
        self.keys.get(name).is_some_and(|key| key.used)
    }

    fn is_shared(&self, key: &Key) -> bool {
        !key.differs && key.records == self.records
    }
}

#[cfg(test)]
mod tests {
    use serde_json::json;

    use super::*;

    #[test]
    fn what_differs_or_is_lacking_is_not_shared() {
        let mut settings = Agreement::default();
        settings.count(&json!({"settings": {"lowpass": ["3Hz"], "decimals": "5", "require": "within"}}));
        settings.count(&json!({"settings": {}}));
        settings.count(&json!({"status": "failed", "settings": {"lowpass": ["3Hz"], "decimals": null}}));
        settings.count(&json!({"settings": {"lowpass": ["12Hz"], "decimals": "5"}}));
        assert_eq!(Value::from(settings.shared()), json!({"decimals": "5"}));
        assert_eq!(settings.differing(), ["lowpass", "require"]);
        assert!(settings.uses("require") && !settings.uses("weighting"));
    }
}
