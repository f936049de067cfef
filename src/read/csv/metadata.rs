//! What the lines above the header say: keys and values, and a sampling rate among them.

use std::ops::Range;

use super::dialect::Beginning;
use super::field::{Dialect, Field, fields};
use super::header::uncommented;
use super::name::name_and_unit;
use crate::place::escape;
use crate::read::options;
use crate::record::StatedRate;
use crate::unit::Unit;

/// Pairs kept, and characters of each part.
const PAIRS: usize = 1000;
const LONGEST: usize = 1000;

/// Keys that state a rate, and keys that state the step.
const RATE_KEYS: &[&str] = &[
    "rate",
    "fs",
    "f s",
    "sample rate",
    "samplerate",
    "sampling rate",
    "sample frequency",
    "sampling frequency",
    "sampling freq",
    "scan rate",
    "data rate",
    "output data rate",
    "odr",
    "sps",
    "samples per second",
    "abtastrate",
    "abtastfrequenz",
];
const STEP_KEYS: &[&str] = &[
    "dt",
    "delta t",
    "time step",
    "timestep",
    "sample interval",
    "sampling interval",
    "sample period",
    "sampling period",
    "sample spacing",
    "step",
    "dx",
    "delta x",
    "sample time",
    "abtastintervall",
];

/// Keys and values of the lines `0..first`, without those in `skipped` (names and units).
pub(super) fn pairs(
    beginning: Beginning<'_>,
    first: usize,
    skipped: &[Option<Range<usize>>],
    dialect: Dialect,
) -> Vec<(String, String)> {
    (0..first)
        .filter(|index| !skipped.iter().flatten().any(|lines| lines.contains(index)))
        .flat_map(|index| line_pairs(beginning.line(index), dialect))
        .take(PAIRS)
        .collect()
}

/// `key = value` (several to a line), `key: value`, `key,value`.
fn line_pairs(line: &[u8], dialect: Dialect) -> Vec<(String, String)> {
    let plain = uncommented(line);
    let cells = fields(plain, dialect.delimiter);
    let quoted = cells.len() == 1 && cells[0].quoted;
    let text = if quoted { cells[0].string() } else { String::from_utf8_lossy(plain).into_owned() };
    let equals = split_parts(&text, '=');
    if !equals.is_empty() {
        return equals;
    }
    let two = |cells: &[Field<'_>]| {
        let kept: Vec<String> = cells.iter().map(Field::string).filter(|cell| !cell.is_empty()).collect();
        match &kept[..] {
            [key, value] => pair(key.trim_end_matches(':'), value),
            _ => None,
        }
    };
    let by_field = (dialect.delimiter != b' ').then(|| two(&cells)).flatten();
    let by_other = || [b',', b';', b'\t'].iter().find_map(|&delimiter| two(&fields(plain, delimiter)));
    let colons = split_parts(&text, ':');
    if !colons.is_empty() {
        return colons;
    }
    by_field.or_else(by_other).into_iter().collect()
}

/// Pairs around `mark`, several to a line where commas or semicolons separate them.
fn split_parts(text: &str, mark: char) -> Vec<(String, String)> {
    let mut pairs: Vec<(String, String)> = Vec::new();
    for part in text.split([',', ';']) {
        match part.split_once(mark).and_then(|(key, value)| pair(key, value)) {
            Some(found) => pairs.push(found),
            // `100,5` is one value.
            None => {
                if let Some((_, value)) = pairs.last_mut()
                    && value.ends_with(|c: char| c.is_ascii_digit())
                    && part.starts_with(|c: char| c.is_ascii_digit())
                {
                    value.push(',');
                    value.push_str(part.trim_end());
                }
            }
        }
    }
    pairs
}

fn pair(key: &str, value: &str) -> Option<(String, String)> {
    let key = key.trim().trim_matches('"').trim();
    let value = value.trim().trim_matches('"').trim();
    let named = key.starts_with(char::is_alphabetic) && key.chars().count() <= 64 && !value.is_empty();
    named.then(|| (key.to_owned(), value.chars().take(LONGEST).collect()))
}

/// The sampling rate that the pairs state, where one does.
pub(super) fn stated_rate(pairs: &[(String, String)]) -> Option<StatedRate> {
    pairs.iter().find_map(|(key, value)| {
        let (name, unit) = name_and_unit(key);
        let plain: String = name.to_lowercase().replace(['_', '-'], " ");
        let plain = plain.split_whitespace().collect::<Vec<_>>().join(" ");
        let value = value.replace(',', ".");
        let (rate_base, axis) = if RATE_KEYS.contains(&plain.as_str()) {
            rate(&value, &unit)?
        } else if STEP_KEYS.contains(&plain.as_str()) {
            step(&value, &unit)?
        } else {
            return None;
        };
        let origin = format!("header key \"{}\"", escape(key));
        Some(StatedRate { rate_base, unit: axis, given: false, origin })
    })
}

/// A rate with its unit beside it or in the key: `100`, `1.6 kHz`, `2/mm`.
fn rate(value: &str, key_unit: &Unit) -> Option<(f64, Unit)> {
    let (rate_base, axis) = options::rate(value)?;
    let bare = value.trim().parse::<f64>().is_ok();
    match key_unit.meaning() {
        Some(meaning) if bare && meaning.time == -1 && meaning.length == 0 => Some((rate_base * meaning.scale, axis)),
        _ => Some((rate_base, axis)),
    }
}

/// A step with its unit beside it or in the key, seconds otherwise.
fn step(value: &str, key_unit: &Unit) -> Option<(f64, Unit)> {
    let value = value.trim();
    let digits =
        value.find(|c: char| !(c.is_ascii_digit() || matches!(c, '.' | '-' | '+' | 'e' | 'E'))).unwrap_or(value.len());
    let number: f64 = value[..digits].parse().ok()?;
    let unit = match value[digits..].trim() {
        "" if key_unit.is_unknown() => Unit::parse("s"),
        "" => key_unit.clone(),
        suffix => Unit::parse(suffix),
    };
    let scale = unit.meaning().filter(|_| unit.is_time() || unit.is_length())?.scale;
    let rate_base = 1.0 / (number * scale);
    let axis = if unit.is_time() { Unit::parse("s") } else { unit };
    (rate_base.is_finite() && rate_base > 0.0).then_some((rate_base, axis))
}

#[cfg(test)]
mod tests {
    use super::*;

    const COMMA: Dialect = Dialect { delimiter: b',', decimal: b'.', thousands: None };

    #[test]
    fn pairs_are_found_in_their_usual_forms() {
        for (line, expected) in [
            ("# rate = 100 Hz, range = 16 g, unit three", &[("rate", "100 Hz"), ("range", "16 g")][..]),
            ("rate,100", &[("rate", "100")]),
            ("Start: 2026-03-01 10:00:00", &[("Start", "2026-03-01 10:00:00")]),
            ("\"Sample rate: 100,5\"", &[("Sample rate", "100,5")]),
            ("# dt = 0,01 s", &[("dt", "0,01 s")]),
            ("a free line of text", &[]),
            ("t,ax,ay", &[]),
        ] {
            let found = line_pairs(line.as_bytes(), COMMA);
            let found: Vec<(&str, &str)> = found.iter().map(|(k, v)| (k.as_str(), v.as_str())).collect();
            assert_eq!(found, expected, "{line}");
        }
    }

    #[test]
    fn a_stated_rate_is_read_with_its_unit() {
        for (key, value, rate_base) in [
            ("rate", "100", 100.0),
            ("Sample rate [kHz]", "1.6", 1600.0),
            ("sample_rate", "100 Hz", 100.0),
            ("dt", "0,01 s", 100.0),
            ("sampling interval (ms)", "5", 200.0),
            ("dx", "0.5 mm", 2000.0),
        ] {
            let rate = stated_rate(&[(key.to_owned(), value.to_owned())]).map(|rate| rate.rate_base);
            assert!(rate.is_some_and(|rate| (rate / rate_base - 1.0).abs() < 1e-12), "{key} {value}: {rate:?}");
        }
        assert_eq!(stated_rate(&[("rate".into(), "fast".into()), ("range".into(), "16".into())]), None);
    }
}
