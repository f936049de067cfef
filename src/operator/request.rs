//! An operator as asked for on the command line or in a recipe.

use std::fmt;
use std::sync::Arc;

use serde::de::{MapAccess, Visitor};
use serde::ser::SerializeMap;
use serde::{Deserialize, Deserializer, Serialize, Serializer};

use crate::error::{Error, Result};

use super::corner::quoted;
use super::step::{Effect, Frame, Setting, Step};
use super::table::STEPS;

/// One operator with its argument, read but not yet related to a record. It serialises as `{"lowpass": "40Hz"}`.
#[derive(Debug, Clone)]
pub struct Request {
    step: &'static Step,
    value: String,
    setting: Arc<dyn Setting>,
}

impl Request {
    /// Reads the argument of the operator `key` (`lowpass`, `notch`, ...).
    ///
    /// # Errors
    /// `Usage` for an unknown operator or an argument that it does not take.
    pub fn parse(key: &str, value: &str) -> Result<Request> {
        let Some(step) = STEPS.iter().find(|step| step.key == key) else {
            let keys: Vec<&str> = STEPS.iter().map(|step| step.key).collect();
            return Err(Error::usage(format!("no operator {}", quoted(key)))
                .remedy(format!("choose one of {}", keys.join(", "))));
        };
        let setting = (step.read)(value).map_err(|e| {
            let remedy = e.advice().map_or_else(|| format!("write it as in --{key} {}", step.example), str::to_owned);
            Error::new(e.kind(), format!("{}: {}", step.option(), e.what())).at(e.place().clone()).remedy(remedy)
        })?;
        Ok(Request { step, value: value.trim().to_owned(), setting: Arc::from(setting) })
    }

    /// The operator.
    pub fn step(&self) -> &'static Step {
        self.step
    }

    /// The argument as written.
    pub fn value(&self) -> &str {
        &self.value
    }

    pub(super) fn resolve(&self, frame: &Frame<'_>) -> Result<Effect> {
        self.setting.resolve(frame)
    }
}

impl PartialEq for Request {
    fn eq(&self, other: &Self) -> bool {
        self.step.key == other.step.key && self.value == other.value
    }
}

impl fmt::Display for Request {
    /// As typed: `--lowpass 40Hz`.
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        write!(f, "--{} {}", self.step.key, self.value)
    }
}

impl Serialize for Request {
    fn serialize<S: Serializer>(&self, serializer: S) -> std::result::Result<S::Ok, S::Error> {
        let mut map = serializer.serialize_map(Some(1))?;
        map.serialize_entry(self.step.key, &self.value)?;
        map.end()
    }
}

impl<'de> Deserialize<'de> for Request {
    fn deserialize<D: Deserializer<'de>>(deserializer: D) -> std::result::Result<Request, D::Error> {
        deserializer.deserialize_map(OneEntry)
    }
}

struct OneEntry;

impl<'de> Visitor<'de> for OneEntry {
    type Value = Request;

    fn expecting(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        f.write_str("one operator with its argument, such as lowpass = \"40Hz\"")
    }

    fn visit_map<A: MapAccess<'de>>(self, mut map: A) -> std::result::Result<Request, A::Error> {
        use serde::de::Error as _;
        let Some((key, value)) = map.next_entry::<String, String>()? else {
            return Err(A::Error::invalid_length(0, &self));
        };
        if map.next_key::<String>()?.is_some() {
            return Err(A::Error::invalid_length(2, &self));
        }
        Request::parse(&key, &value).map_err(A::Error::custom)
    }
}

#[cfg(test)]
mod tests {
    use proptest::prelude::*;

    use super::*;

    #[test]
    fn every_step_reads_its_own_example_and_comes_back_from_json() {
        // The example of a response is the name of a file that is not here.
        for step in STEPS.iter().filter(|step| step.key != "response") {
            let request = Request::parse(step.key, step.example).unwrap();
            assert_eq!(request.to_string(), format!("--{} {}", step.key, step.example));
            let json = serde_json::to_string(&request).unwrap();
            assert_eq!(json, format!("{{{:?}:{:?}}}", step.key, step.example));
            assert_eq!(serde_json::from_str::<Request>(&json).unwrap(), request);
        }
        for json in ["{}", "{\"lowpass\":\"40Hz\",\"notch\":\"50Hz:2Hz\"}", "[]", "{\"lowpass\":40}", "{\"x\":\"1\"}"] {
            assert!(serde_json::from_str::<Request>(json).is_err(), "{json}");
        }
    }

    #[test]
    fn faulty_arguments_name_their_option() {
        for (key, value, message) in [
            (
                "lowpass",
                "40",
                "--lowpass: \"40\": a corner without a unit; write a number above zero with its unit, as in 40Hz, 2.5s (period), 0.8mm (wavelength) or 0.1/m",
            ),
            (
                "notch",
                "50Hz",
                "--notch: \"50Hz\": no centre and width; write a notch as centre and full width, as in 50Hz:2Hz, 50Hz:2Hz:5 or 50Hz:2Hz:all",
            ),
            ("integrate", "3", "--integrate: \"3\": neither 1 nor 2; write once as 1, twice as 2"),
            ("differentiate", "", "--differentiate: \"\": neither 1 nor 2; write once as 1, twice as 2"),
            (
                "allpass",
                "1",
                "no operator \"allpass\"; choose one of despike, response, weighting, lowpass, highpass, bandpass, bandstop, notch, split, integrate, differentiate, smooth, resample, decimate",
            ),
        ] {
            assert_eq!(Request::parse(key, value).unwrap_err().to_string(), message);
        }
    }

    proptest! {
        #[test]
        fn no_text_panics(value in ".{0,40}", row in 0..STEPS.len()) {
            let _ = Request::parse(STEPS[row].key, &value);
            let _ = Request::parse(&value, &value);
        }
    }
}
