//! A coded block: one of four modes, and the way back to samples.

use serde::Serialize;

use crate::basis::Planner;
use crate::codec::bytes::Fields;
use crate::codec::cast::Cast;
use crate::codec::cosine::{Series, segments};
use crate::codec::stepwise;
use crate::error::{Error, Result};

/// Samples of a block at most: what its few bytes can make a reader allocate.
pub const MOST_SAMPLES: usize = 1 << 20;

/// How a block is coded.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Hash, Serialize)]
#[serde(rename_all = "snake_case")]
pub enum Mode {
    /// Steps from what the past foretells.
    Predicted,
    /// Cosine coefficients.
    Cosine,
    /// Cosine coefficients with a lattice of remainders.
    CosineLattice,
    /// The first cosine coefficients as doubles.
    Truncated,
}

/// Modes with their numbers in a file and their names in reports.
pub static MODES: &[(u8, Mode, &str)] = &[
    (1, Mode::Predicted, "predicted"),
    (2, Mode::Cosine, "cosine"),
    (3, Mode::CosineLattice, "cosine + lattice"),
    (4, Mode::Truncated, "truncated cosine"),
];

impl Mode {
    /// The number in a file.
    pub fn number(self) -> u8 {
        MODES.iter().find(|(_, mode, _)| *mode == self).map_or(0, |(number, ..)| *number)
    }

    /// The name in reports.
    pub fn name(self) -> &'static str {
        MODES.iter().find(|(_, mode, _)| *mode == self).map_or("", |(.., name)| name)
    }

    /// The mode of a number.
    pub fn of(number: u8) -> Option<Mode> {
        MODES.iter().find(|(known, ..)| *known == number).map(|(_, mode, _)| *mode)
    }
}

/// A coded block.
#[derive(Debug, Clone, PartialEq)]
pub struct Coded {
    /// How.
    pub mode: Mode,
    /// The bytes.
    pub payload: Vec<u8>,
    /// Cosine coefficients that are not zero, and one past the highest of them.
    pub kept: Option<(usize, usize)>,
    /// Energy of the coefficients that were dropped, where nothing else is lost.
    pub dropped: Option<f64>,
}

impl Coded {
    /// The first coefficients of the cosine basis as they are.
    ///
    /// # Errors
    /// `Unsupported` for no samples.
    pub fn truncated(samples: &[f64], keep: usize, planner: &Planner) -> Result<Coded> {
        let mut coefficients = samples.to_vec();
        segments::transform(&mut coefficients, planner)?;
        let dropped = coefficients.iter().skip(keep).map(|c| c * c).sum();
        coefficients.truncate(keep);
        let payload = coefficients.iter().flat_map(|c| c.to_le_bytes()).collect();
        Ok(Coded { mode: Mode::Truncated, payload, kept: Some((keep, keep)), dropped: Some(dropped) })
    }
}

/// The samples of a block, after the cast. Numbers that were coded as whole steps of a grid or as bits need none.
///
/// # Errors
/// `Malformed` where the payload is none of that mode and length.
pub fn decode(mode: Mode, payload: &[u8], len: usize, cast: Cast, planner: &Planner) -> Result<Vec<f64>> {
    if len > MOST_SAMPLES {
        return Err(Error::malformed(format!("a block of {len} samples, more than {MOST_SAMPLES}")));
    }
    if len == 0 {
        return if payload.is_empty() { Ok(Vec::new()) } else { Err(Error::malformed("bytes of no samples")) };
    }
    let mut samples = before_cast(mode, payload, len, planner)?;
    if mode != Mode::Predicted || matches!(payload.first(), Some(1 | 2)) {
        samples.iter_mut().for_each(|v| *v = cast.apply(*v));
    }
    finite(samples)
}

fn before_cast(mode: Mode, payload: &[u8], len: usize, planner: &Planner) -> Result<Vec<f64>> {
    match mode {
        Mode::Predicted => stepwise::Plan::decode(payload, len),
        Mode::Cosine => Series::decode(payload, len, false)?.0.samples(planner),
        Mode::CosineLattice => {
            let (series, remainder) = Series::decode(payload, len, true)?;
            let mut samples = series.samples(planner)?;
            if let Some(remainder) = remainder {
                remainder.add(&mut samples);
            }
            Ok(samples)
        }
        Mode::Truncated => {
            let mut fields = Fields::new(payload);
            let mut samples = Vec::with_capacity(len);
            while !fields.rest().is_empty() && samples.len() < len {
                samples.push(fields.double()?);
            }
            if !fields.rest().is_empty() {
                return Err(Error::malformed("more coefficients than samples"));
            }
            samples.resize(len, 0.0);
            segments::inverse(&mut samples, planner)?;
            Ok(samples)
        }
    }
}

fn finite(samples: Vec<f64>) -> Result<Vec<f64>> {
    match samples.iter().position(|v| !v.is_finite()) {
        Some(n) => Err(Error::malformed(format!("sample {n} is not finite"))),
        None => Ok(samples),
    }
}
