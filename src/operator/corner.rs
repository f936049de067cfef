//! A corner as people write it, with its unit: `40Hz`, `2.5s` (period), `0.8mm` (wavelength), `0.1/m`.

use std::fmt;

use serde::{Deserialize, Serialize};

use crate::error::{Error, Finding, Result};
use crate::numeric::leading_number;
use crate::place::escape;
use crate::record::Axis;
use crate::unit::Unit;

/// What the number of a corner measures.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Hash)]
pub enum Measure {
    /// Cycles per second, held in Hz.
    Frequency,
    /// Seconds per cycle, held in s.
    Period,
    /// Length of a cycle, held in m.
    Wavelength,
    /// Cycles per length, held in 1/m.
    SpatialFrequency,
}

impl Measure {
    /// True where the corner belongs to a time axis, false where it belongs to a length axis.
    pub fn is_time(self) -> bool {
        matches!(self, Measure::Frequency | Measure::Period)
    }

    /// True for cycles per time or length, false for a period or wavelength.
    pub fn is_frequency(self) -> bool {
        matches!(self, Measure::Frequency | Measure::SpatialFrequency)
    }
}

/// A corner, or the width of a transition or notch: a positive number with a unit. It keeps its text and serialises as
/// that text.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
#[serde(try_from = "String", into = "String")]
pub struct Corner {
    text: String,
    measure: Measure,
    base: f64,
}

/// What an error about a corner offers.
const EXAMPLE: &str = "write a number above zero with its unit, as in 40Hz, 2.5s (period), 0.8mm (wavelength) or 0.1/m";
/// Longer texts are no corners; quoting them would flood a terminal.
const LONGEST_TEXT: usize = 64;
/// A corner this many samples long is a million times longer than the longest record (1e9 samples): it can only be a
/// slip, and its Taylor coefficients (fourth power) would leave the range of sound arithmetic.
const LONGEST_SAMPLES: f64 = 1e15;

impl Corner {
    /// Reads a corner. Units: those of time and length, `Hz`, `kHz`, `mHz`, `MHz`, and `/` before a length or time.
    ///
    /// # Errors
    /// `Usage` when the number is missing, not finite or not above zero, or the unit is missing or unknown.
    pub fn parse(text: &str) -> Result<Corner> {
        let text = text.trim();
        let fault = |what: String| Error::usage(format!("{}: {what}", quoted(text))).remedy(EXAMPLE);
        if text.len() > LONGEST_TEXT || text.chars().any(char::is_control) {
            return Err(fault("not a corner".to_owned()));
        }
        let (number, unit) = text.split_at(leading_number::length(text));
        let Ok(value) = number.parse::<f64>() else {
            return Err(fault("does not begin with a number".to_owned()));
        };
        let unit = unit.trim();
        if unit.is_empty() {
            return Err(fault("a corner without a unit".to_owned()));
        }
        let Some((measure, scale)) = meaning(unit) else {
            return Err(fault(format!("unknown unit {}", quoted(unit))));
        };
        let base = value * scale;
        if !(value > 0.0 && base > 0.0 && base.is_finite() && base.recip() > 0.0 && base.recip().is_finite()) {
            return Err(fault("not a finite number above zero".to_owned()));
        }
        Ok(Corner { text: text.to_owned(), measure, base })
    }

    /// The text as written, without blanks around it.
    pub fn text(&self) -> &str {
        &self.text
    }

    /// What the number measures.
    pub fn measure(&self) -> Measure {
        self.measure
    }

    /// The number in Hz, s, m or 1/m, as the measure says.
    pub fn base(&self) -> f64 {
        self.base
    }

    /// The frequency of the corner, in Hz or 1/m.
    pub fn frequency(&self) -> f64 {
        if self.measure.is_frequency() { self.base } else { self.base.recip() }
    }

    /// The corner in cycles per sample on an axis, above 0 and below 0.5. `option` is named in errors (`--lowpass`).
    ///
    /// # Errors
    /// `Usage` for a corner in time on a length axis or the reverse; `Unsupported` at or above the Nyquist frequency,
    /// and for a corner longer than 1e15 samples.
    pub fn resolve(&self, option: &str, axis: &Axis) -> Result<f64> {
        self.check_axis(option, axis)?;
        let cycles = self.frequency() * axis.step_base();
        if cycles >= 0.5 * (1.0 - ROUNDING) {
            let nyquist = figure(0.5 * axis.rate_base());
            let label = axis.frequency_label();
            let own = if self.measure.is_frequency() {
                String::new()
            } else {
                format!(" = {} {label}", figure(self.frequency()))
            };
            return Err(Error::unsupported(format!(
                "{option} {}{own}: at or above the Nyquist frequency of {nyquist} {label}",
                self.text
            ))
            .remedy(format!("choose a corner below {nyquist} {label} for {option}")));
        }
        if cycles * LONGEST_SAMPLES < 1.0 {
            return Err(Error::unsupported(format!(
                "{option} {}: a corner of {} samples is beyond any record",
                self.text,
                figure(cycles.recip())
            ))
            .remedy(format!("choose a corner that the record can show for {option}")));
        }
        Ok(cycles)
    }

    /// A width about `centre` in cycles per sample: a difference of frequencies, or of periods or wavelengths when the
    /// centre is one. A width `w` about a wavelength `l` is 1/(l - w/2) - 1/(l + w/2), laid centrally about 1/l.
    ///
    /// # Errors
    /// `Usage` when the measures do not match, or half the width reaches the centre's own wavelength.
    pub fn resolve_width(&self, option: &str, centre: &Corner, axis: &Axis) -> Result<f64> {
        self.check_axis(option, axis)?;
        if self.measure.is_frequency() {
            return Ok(self.base * axis.step_base());
        }
        if self.measure != centre.measure {
            return Err(Error::usage(format!(
                "{option}: the width {} is no difference of frequencies, but the corner {} is a frequency",
                self.text, centre.text
            ))
            .remedy(format!("write the width of {option} in {}", axis.frequency_label())));
        }
        let (shorter, longer) = (centre.base - self.base / 2.0, centre.base + self.base / 2.0);
        if shorter <= 0.0 {
            return Err(Error::usage(format!("{option}: a width of {} reaches zero from {}", self.text, centre.text))
                .remedy(format!("choose a width below twice the corner for {option}")));
        }
        Ok((shorter.recip() - longer.recip()) * axis.step_base())
    }

    /// A remark when a cycle of the corner is longer than the record of `len` samples.
    pub fn note(&self, option: &str, axis: &Axis, len: usize) -> Option<Finding> {
        let samples = (self.frequency() * axis.step_base()).recip();
        (samples > len as f64).then(|| {
            Finding::new(
                "corner_longer_than_record",
                format!(
                    "{option} {}: one cycle takes {} samples and the record holds {len}; what lies beyond the ends decides",
                    self.text,
                    figure(samples)
                ),
            )
        })
    }

    fn check_axis(&self, option: &str, axis: &Axis) -> Result<()> {
        if self.measure.is_time() == axis.is_time() {
            return Ok(());
        }
        let (axis_kind, own_kind, example) =
            if axis.is_time() { ("time", "length", "40Hz or 2.5s") } else { ("length", "time", "0.8mm or 0.1/m") };
        Err(Error::usage(format!(
            "{option} {}: a corner in {own_kind}, but the record's axis is {axis_kind} in {}",
            self.text,
            axis.unit()
        ))
        .remedy(format!("give {option} as in {example}")))
    }
}

/// Relative rounding allowed where two ways of writing one frequency meet.
pub(super) const ROUNDING: f64 = 1e-12;

impl fmt::Display for Corner {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        f.write_str(&self.text)
    }
}

impl TryFrom<String> for Corner {
    type Error = Error;
    fn try_from(text: String) -> Result<Corner> {
        Corner::parse(&text)
    }
}

impl From<Corner> for String {
    fn from(corner: Corner) -> String {
        corner.text
    }
}

/// A number as messages show it: at most six digits.
pub(super) fn figure(value: f64) -> String {
    match format!("{value:.5e}").parse::<f64>() {
        Ok(short) if (1e-4..1e9).contains(&short.abs()) || short == 0.0 => short.to_string(),
        Ok(short) => format!("{short:e}"),
        Err(_) => value.to_string(),
    }
}

/// Text from outside in quotation marks, cut and escaped for a terminal.
pub(super) fn quoted(text: &str) -> String {
    let escaped = escape(text);
    let mut short: String = escaped.chars().take(LONGEST_TEXT).collect();
    if short.len() < escaped.len() {
        short.push('…');
    }
    format!("\"{short}\"")
}

/// Measure and size in base units of a unit's text.
fn meaning(text: &str) -> Option<(Measure, f64)> {
    if let Some(below) = text.strip_prefix("1/").or_else(|| text.strip_prefix('/')) {
        let unit = Unit::parse(below);
        let scale = unit.meaning()?.scale.recip();
        return if unit.is_time() {
            Some((Measure::Frequency, scale))
        } else if unit.is_length() {
            Some((Measure::SpatialFrequency, scale))
        } else {
            None
        };
    }
    match text {
        // Prefixes of the hertz that no channel is measured in.
        "mHz" => return Some((Measure::Frequency, 1e-3)),
        "MHz" => return Some((Measure::Frequency, 1e6)),
        _ => {}
    }
    let meaning = Unit::parse(text).meaning()?;
    let measure = match (meaning.length, meaning.time) {
        (0, -1) => Measure::Frequency,
        (0, 1) => Measure::Period,
        (1, 0) => Measure::Wavelength,
        (-1, 0) => Measure::SpatialFrequency,
        _ => return None,
    };
    Some((measure, meaning.scale))
}

#[cfg(test)]
mod tests;
