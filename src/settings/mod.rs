//! Everything that changes a result, under one name each: command line, recipes and JSON share these keys.

mod layer;
mod parse;
mod spectral;
mod table;

use std::collections::BTreeMap;

use serde_json::{Map, Value};

use crate::codec::Wanted;
use crate::compare::{Assertion, ToleranceRequest};
use crate::condition::Stage;
use crate::error::{Error, Result};
use crate::operator::{Conditions, Offset, Request, Shape};
use crate::read::ReadOptions;
use crate::record::Format;
use crate::regularise::RegulariseOptions;
use crate::verdict::Adequacy;

pub use layer::Layer;
pub use parse::bytes;
pub use spectral::{Against, Method, SegmentLength, SpectrumOptions};
pub use table::{Arity, COMPARE, COMPRESS, CONDITION, Group, OptionRow, SPECTRUM, find, known, nearest, rows};

/// Settings of a run. `Settings::default()` is what runs without any option.
#[derive(Debug, Clone, Default)]
pub struct Settings {
    /// How the file is read.
    pub read: ReadOptions,
    /// Cut and repair.
    pub regularise: RegulariseOptions,
    /// Extension, baseline, seat.
    pub stage: Stage,
    /// Operators, in the order given; they commute.
    pub requests: Vec<Request>,
    /// Roll-off of all filters.
    pub shape: Shape,
    /// End conditions of an integral; there is no default.
    pub conditions: Option<Conditions>,
    /// The sensor's offset, where the end conditions do not solve it.
    pub offset: Option<Offset>,
    /// Take end conditions that the record speaks against.
    pub insist: bool,
    /// Uncertainty of an integral that is aimed at: the report names the high-pass that gives it.
    pub target_sigma: Option<ToleranceRequest>,
    /// Columns that stand beside the result.
    pub beside: Vec<Beside>,
    /// Integration time of the running RMS, in s.
    pub running_rms: Option<f64>,
    /// What is known about the ends.
    pub assertion: Assertion,
    /// How a spectrum is formed and what is read from it.
    pub spectrum: SpectrumOptions,
    /// Edge error that is tolerable.
    pub tolerance: ToleranceRequest,
    /// Edge error that must be met, or the run counts as insufficient.
    pub require: Option<Adequacy>,
    /// What an audited record must be, or the audit counts as insufficient.
    pub fitness: Option<Fitness>,
    /// What happens to output outside the trusted span.
    pub edges: Edges,
    /// Format of the output; that of the input when `None`.
    pub format: Option<Format>,
    /// Sample type of WAV output, by name in `write`'s table; float32 when `None`.
    pub encoding: Option<String>,
    /// Fixed decimals of CSV output; shortest digits when `None`.
    pub decimals: Option<u8>,
    /// What an archive may lose.
    pub archive: Wanted,
    /// Columns tell which samples were mended.
    pub mark_repairs: bool,
    /// Notes are errors.
    pub strict: bool,
    /// What was set, as written.
    texts: BTreeMap<&'static str, Vec<String>>,
}

/// A column that stands beside each channel of the result.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Beside {
    /// Standard deviation of an integral from the noise of the record.
    Sigma,
    /// The record as corrected: filtered, less offset and drift, high-passed; the result is its integral.
    Corrected,
}

/// What an audit can be required to find.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Fitness {
    /// Nothing at all: no note, no fault.
    Clean,
}

/// What happens to output outside the trusted span.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Default)]
pub enum Edges {
    /// It is written like the rest.
    #[default]
    Keep,
    /// A column tells which samples are trusted.
    Mark,
    /// Its cells stay empty.
    Blank,
    /// It is cut off.
    Trim,
}

impl Settings {
    /// Sets one key from its text; a key that may be repeated gains a value.
    ///
    /// # Errors
    /// `Usage` for an unknown key (with the nearest known one), for a value that does not parse, and for a second value
    /// of a key that takes one.
    pub fn set(&mut self, key: &str, text: &str) -> Result<()> {
        let row = known(key)?;
        let texts = self.texts.entry(row.key).or_default();
        if row.arity != Arity::Many && !texts.is_empty() {
            return Err(Error::usage(format!("--{key} is given twice")));
        }
        texts.push(text.to_owned());
        parse::set(self, row.key, text)
    }

    /// True for a key that was set, if only to its default.
    pub fn is_given(&self, key: &str) -> bool {
        self.texts.contains_key(key)
    }

    /// Every setting as resolved, for results: what was not given stands as its default, `null` where it is decided by
    /// the record.
    pub fn to_map(&self) -> Map<String, Value> {
        rows()
            .into_iter()
            // An archive's options say nothing of other results.
            .filter(|row| row.group != Group::Archive || self.texts.contains_key(row.key))
            .map(|row| {
                let texts = self.texts.get(row.key);
                let value = match row.arity {
                    Arity::Switch => Value::Bool(texts.is_some_and(|t| t.last().is_some_and(|v| v == "true"))),
                    Arity::Many => Value::from(texts.cloned().unwrap_or_default()),
                    Arity::Once => match texts.and_then(|t| t.last()) {
                        Some(text) => Value::from(text.clone()),
                        None => parse::default_of(self, row.key).map_or(Value::Null, Value::from),
                    },
                };
                (row.key.to_owned(), value)
            })
            .collect()
    }

    /// The same for a result in a format: what the settings leave to the output stands as it was resolved.
    pub fn to_map_for(&self, format: Format) -> Map<String, Value> {
        let mut map = self.to_map();
        map.extend(parse::resolved(self, format).into_iter().map(|(key, text)| (key.to_owned(), Value::from(text))));
        map
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn an_unknown_key_names_the_nearest() {
        let error = Settings::default().set("lowpas", "40Hz").expect_err("unknown");
        assert_eq!(error.to_string(), "unknown setting \"lowpas\"; did you mean \"lowpass\"?");
    }

    #[test]
    fn a_map_set_again_gives_the_same_map() {
        let mut settings = Settings::default();
        for (key, text) in [
            ("lowpass", "40Hz"),
            ("notch", "50Hz:2Hz"),
            ("notch", "60Hz:2Hz"),
            ("extension", "odd"),
            ("baseline", "line"),
            ("tolerance", "5%"),
            ("edges", "mark"),
            ("seat", "whole-sample"),
            ("shape", "gaussian"),
            ("channel", "ax"),
            ("from", "1s"),
            ("strict", "true"),
        ] {
            settings.set(key, text).expect("a good value");
        }
        let map = settings.to_map();
        let mut again = Settings::default();
        for (key, value) in &map {
            match value {
                Value::String(text) => again.set(key, text).expect("a good value"),
                Value::Bool(true) => again.set(key, "true").expect("a good value"),
                Value::Array(texts) => {
                    texts.iter().filter_map(Value::as_str).for_each(|t| again.set(key, t).expect("a good value"));
                }
                _ => {}
            }
        }
        assert_eq!(again.to_map(), map);
    }

    #[test]
    fn every_row_has_a_parser() {
        for row in rows() {
            // A value no option takes: it must be refused as a value, never as an unknown key.
            if let Err(error) = Settings::default().set(row.key, "\u{1}") {
                assert!(!error.what().contains("unknown setting"), "{}", row.key);
            }
        }
    }
}
