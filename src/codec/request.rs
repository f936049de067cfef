//! The error that is allowed, as the user states it and as a channel resolves it.

use std::fmt;
use std::str::FromStr;

use super::goal::Limit;
use crate::error::{Error, Result};
use crate::numeric::noise;
use crate::operator::Corner;
use crate::place::escape;
use crate::record::Axis;
use crate::unit::Unit;

/// A size of error: in units, as a share of the range, or as a multiple of the noise.
#[derive(Debug, Clone, PartialEq)]
pub enum Size {
    /// In the channel's unit, or in the unit named.
    Value(f64, Option<Unit>),
    /// Share of the channel's range, greatest less least value.
    Range(f64),
    /// Multiple of the channel's noise sigma, from third differences.
    Noise(f64),
}

/// What is asked of an archive.
#[derive(Debug, Clone, PartialEq)]
pub enum Request {
    /// No sample is off by more.
    Max(Size),
    /// The root of the mean squared error is at most this.
    Rms(Size),
    /// Every sample comes back as it was.
    Lossless,
    /// The first coefficients of the cosine basis, and no others.
    Keep(u64),
    /// The coefficients below a corner.
    Corner(Corner),
}

impl FromStr for Size {
    type Err = Error;

    fn from_str(text: &str) -> Result<Size> {
        let wrong = || {
            Error::usage(format!("not an error: \"{}\"", escape(text)))
                .remedy("write it in the channel's unit (0.01 or 0.01g), as a share of the range (0.1%) or as a multiple of the noise (0.5x)")
        };
        let text = text.trim();
        let split = (1..=text.len())
            .rev()
            .find(|&n| text.is_char_boundary(n) && text[..n].trim().parse::<f64>().is_ok_and(f64::is_finite))
            .ok_or_else(wrong)?;
        let value: f64 = text[..split].trim().parse().map_err(|_| wrong())?;
        if value <= 0.0 {
            return Err(wrong());
        }
        Ok(match text[split..].trim() {
            "" => Size::Value(value, None),
            "%" => Size::Range(value / 100.0),
            "x" => Size::Noise(value),
            unit => Size::Value(value, Some(Unit::parse(unit))),
        })
    }
}

impl fmt::Display for Size {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        match self {
            Size::Value(value, unit) => write!(f, "{value}{}", unit.as_ref().map_or("", Unit::label)),
            Size::Range(share) => write!(f, "{}% of range", share * 100.0),
            Size::Noise(factor) => write!(f, "{factor} x noise"),
        }
    }
}

impl fmt::Display for Request {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        match self {
            Request::Max(size) => write!(f, "max error {size}"),
            Request::Rms(size) => write!(f, "RMS error {size}"),
            Request::Lossless => f.write_str("lossless"),
            Request::Keep(count) => write!(f, "first {count} coefficients"),
            Request::Corner(corner) => write!(f, "coefficients below {}", corner.text()),
        }
    }
}

impl Request {
    /// For one channel: `samples` are its values, `axis` its spacing where it is even.
    ///
    /// # Errors
    /// `Usage` where units do not fit, or a corner is asked of a record without an even axis; `Unsupported` where the
    /// channel has neither range nor noise to take a share of.
    pub fn resolve(&self, samples: &[f64], unit: &Unit, axis: Option<&Axis>) -> Result<Limit> {
        match self {
            Request::Max(size) => size.resolve(samples, unit).map(Limit::Max),
            Request::Rms(size) => size.resolve(samples, unit).map(Limit::Rms),
            Request::Lossless => Ok(Limit::Lossless),
            Request::Keep(count) => Ok(Limit::Keep((*count).clamp(1, samples.len().max(1) as u64))),
            Request::Corner(corner) => {
                let axis = axis.ok_or_else(|| {
                    Error::usage("--corner needs evenly spaced samples").remedy("give --keep or a bound on the error")
                })?;
                let cycles = corner.resolve("corner", axis)?;
                // Coefficient k stands for k / (2 N) cycles a sample.
                let count = (cycles * 2.0 * samples.len() as f64).ceil().max(1.0);
                Ok(Limit::Keep((count as u64).min(samples.len().max(1) as u64)))
            }
        }
    }
}

impl Size {
    fn resolve(&self, samples: &[f64], unit: &Unit) -> Result<f64> {
        let value = match self {
            Size::Value(value, None) => *value,
            Size::Value(value, Some(own)) => {
                let same = |a: &Unit, b: &Unit| a.label() == b.label();
                match (own.meaning(), unit.meaning()) {
                    _ if same(own, unit) => *value,
                    (Some(a), Some(b)) if (a.length, a.time) == (b.length, b.time) => value * (a.scale / b.scale),
                    _ => {
                        let text = format!("an error in {own} says nothing of a channel in {unit}");
                        return Err(Error::usage(text)
                            .remedy("leave the unit out, choose channels with --channel, or give a share (0.1%)"));
                    }
                }
            }
            Size::Range(share) => share * range(samples),
            Size::Noise(factor) => factor * noise::sigma(samples),
        };
        if value > 0.0 && value.is_finite() {
            return Ok(value);
        }
        // A channel of one value has no range and no noise: it is kept exactly at no cost.
        Ok(0.0)
    }
}

/// Greatest less least value; 0 without one.
pub fn range(samples: &[f64]) -> f64 {
    let (low, high) = samples.iter().fold((f64::INFINITY, f64::NEG_INFINITY), |(a, b), v| (a.min(*v), b.max(*v)));
    if high > low { high - low } else { 0.0 }
}
