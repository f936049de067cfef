//! The records and the sub-records to be judged.

use std::collections::BTreeMap;
use std::fs;
use std::path::Path;
use std::sync::Arc;

use serde::Deserialize;

/// One sub-record of a longer record.
pub struct Window {
    pub file: String,
    pub group: String,
    pub whole: Arc<Vec<f64>>,
    pub start: usize,
    pub len: usize,
}

impl Window {
    pub fn samples(&self) -> &[f64] {
        &self.whole[self.start..self.start + self.len]
    }
}

#[derive(Deserialize)]
struct Place {
    file: String,
    start: usize,
    n: usize,
}

#[derive(Deserialize)]
struct Entry {
    file: String,
    group: String,
}

/// All windows that are not constant, in the order of `windows.json`.
pub fn load(folder: &Path) -> Result<Vec<Window>, String> {
    let read = |name: &str| {
        let path = folder.join(name);
        fs::read_to_string(&path).map_err(|e| format!("{}: {e}", path.display()))
    };
    let places: Vec<Place> = serde_json::from_str(&read("windows.json")?).map_err(|e| format!("windows.json: {e}"))?;
    let entries: Vec<Entry> =
        serde_json::from_str(&read("manifest.json")?).map_err(|e| format!("manifest.json: {e}"))?;
    let groups: BTreeMap<String, String> = entries.into_iter().map(|e| (e.file, e.group)).collect();
    let mut files: BTreeMap<String, Arc<Vec<f64>>> = BTreeMap::new();
    let mut windows = Vec::new();
    for place in places {
        let whole = match files.get(&place.file) {
            Some(whole) => Arc::clone(whole),
            None => {
                let text = read(&place.file)?;
                let values: Result<Vec<f64>, _> = text.lines().skip(1).map(|line| line.trim().parse()).collect();
                let values = Arc::new(values.map_err(|e| format!("{}: {e}", place.file))?);
                files.insert(place.file.clone(), Arc::clone(&values));
                values
            }
        };
        let group = groups.get(&place.file).cloned().unwrap_or_default();
        let window = Window { file: place.file, group, whole, start: place.start, len: place.n };
        let first = window.samples()[0];
        if window.samples().iter().any(|&v| v != first) {
            windows.push(window);
        }
    }
    Ok(windows)
}
