//! The uniform axis of a record: time or length, start, step, and how the step was found.

use serde::Serialize;

use crate::error::{Error, Result};
use crate::numeric::rational::Rational;
use crate::unit::Unit;

/// A uniform axis in time (`s`, `ms`) or length (`m`, `mm`).
#[derive(Debug, Clone, PartialEq)]
pub struct Axis {
    unit: Unit,
    start: f64,
    step: f64,
    len: usize,
    interval: Option<[f64; 2]>,
    rate: Option<Rational>,
    spacing: Option<Spacing>,
    source: RateSource,
    epoch: Option<String>,
}

/// Where the sampling step came from.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Serialize)]
#[serde(rename_all = "snake_case")]
pub enum RateSource {
    /// The user gave it.
    Given,
    /// The file's header states it.
    Header,
    /// Found from the stamps of a time or position column.
    Stamps,
}

/// What a column of stamps says about the spacing of its rows.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Hash, Serialize)]
#[serde(rename_all = "snake_case")]
pub enum Spacing {
    /// Even to the print resolution of the stamps.
    Uniform,
    /// Even but for deviations too small to matter.
    NearUniform,
    /// The rate wanders slowly.
    Drifting,
    /// The clock jumped by a part of a step.
    Slipped,
    /// Single stamps scatter by up to half a step.
    Jittered,
    /// No even grid fits.
    Irregular,
    /// The stamps are too coarse to tell.
    Unresolved,
    /// A stamp repeats the one before it.
    Repeated,
    /// A stamp lies before the one above it.
    Backwards,
    /// Fewer than two rows: there is no step to see.
    Single,
}

impl Axis {
    /// An axis of `len` samples: first stamp `start` and `step` in `unit`.
    ///
    /// # Errors
    /// `Unsupported` when the unit is neither time nor length, the step is not a positive finite number, or the start is
    /// not finite.
    pub fn new(unit: Unit, start: f64, step: f64, len: usize, source: RateSource) -> Result<Axis> {
        if !unit.is_time() && !unit.is_length() {
            return Err(Error::unsupported(format!("an axis needs a unit of time or length, not {:?}", unit.label())));
        }
        if !(step.is_finite() && step > 0.0 && start.is_finite()) {
            return Err(Error::unsupported(format!("a sampling step of {step} {unit} makes no axis")));
        }
        Ok(Axis { unit, start, step, len, interval: None, rate: None, spacing: None, source, epoch: None })
    }

    /// A time axis from a sampling rate in Hz, starting at 0 s.
    ///
    /// # Errors
    /// As `new`.
    pub fn from_rate_hz(rate_hz: f64, len: usize, source: RateSource) -> Result<Axis> {
        Axis::new(Unit::parse("s"), 0.0, 1.0 / rate_hz, len, source)
    }

    /// The same axis with a hard interval for the step (in the axis unit), as the stamps allow.
    #[must_use]
    pub fn with_interval(mut self, interval: [f64; 2]) -> Axis {
        self.interval = Some(interval);
        self
    }

    /// The same axis with its rate as a fraction of samples per second or metre; the step follows it.
    #[must_use]
    pub fn with_rate(mut self, rate: Rational) -> Axis {
        let scale = self.unit.meaning().map_or(1.0, |m| m.scale);
        self.step = rate.reciprocal().value() / scale;
        self.rate = Some(rate);
        self
    }

    /// The same axis with another first stamp, in the axis unit.
    #[must_use]
    pub fn with_start(mut self, start: f64) -> Axis {
        self.start = start;
        self
    }

    /// The same axis with what the stamps say about the spacing of the rows.
    #[must_use]
    pub fn with_spacing(mut self, spacing: Spacing) -> Axis {
        self.spacing = Some(spacing);
        self
    }

    /// The same axis with the civil time of stamp 0 (RFC 3339), where the file tells it.
    #[must_use]
    pub fn with_epoch(mut self, epoch: impl Into<String>) -> Axis {
        self.epoch = Some(epoch.into());
        self
    }

    /// `len` samples from sample `first` on, keeping their stamps.
    #[must_use]
    pub fn cut(&self, first: usize, len: usize) -> Axis {
        Axis { start: self.stamp(first), len, ..self.clone() }
    }

    /// An axis of `len` samples from `start` on whose step is `ratio` times this one's.
    #[must_use]
    pub fn stretched(&self, ratio: Rational, start: f64, len: usize) -> Axis {
        let factor = ratio.value();
        let rate = self.rate.and_then(|rate| rate.times(ratio.reciprocal()));
        let interval = self.interval.map(|limits| limits.map(|step| step * factor));
        let axis = Axis { start, step: self.step * factor, len, interval, rate: None, ..self.clone() };
        match rate {
            Some(rate) => axis.with_rate(rate),
            None => axis,
        }
    }

    /// Unit of `start` and `step`.
    pub fn unit(&self) -> &Unit {
        &self.unit
    }

    /// True for a time axis, false for a length axis.
    pub fn is_time(&self) -> bool {
        self.unit.is_time()
    }

    /// Number of samples.
    #[expect(clippy::len_without_is_empty, reason = "an axis of no samples never reaches a record")]
    pub fn len(&self) -> usize {
        self.len
    }

    /// Stamp of the first sample, in the axis unit.
    pub fn start(&self) -> f64 {
        self.start
    }

    /// Sampling step, in the axis unit.
    pub fn step(&self) -> f64 {
        self.step
    }

    /// Sampling step in seconds or metres.
    pub fn step_base(&self) -> f64 {
        self.step * self.unit.meaning().map_or(1.0, |m| m.scale)
    }

    /// Sampling rate in Hz, or samples per metre.
    pub fn rate_base(&self) -> f64 {
        1.0 / self.step_base()
    }

    /// Stamp of sample `n`, in the axis unit.
    pub fn stamp(&self, n: usize) -> f64 {
        match self.rate {
            // One rounding instead of two: sample 3 at 10 Hz stands at 0.3, not at 0.30000000000000004.
            Some(rate) if self.unit.label() == "s" || self.unit.label() == "m" => {
                self.start + n as f64 * rate.denominator as f64 / rate.numerator as f64
            }
            _ => self.start + n as f64 * self.step,
        }
    }

    /// The hard interval for the step, in the axis unit, where stamps gave one.
    pub fn interval(&self) -> Option<[f64; 2]> {
        self.interval
    }

    /// The rate as a fraction, samples per second or metre, where it is a plain one.
    pub fn rate(&self) -> Option<Rational> {
        self.rate
    }

    /// What the stamps say about the spacing of the rows, where there are stamps.
    pub fn spacing(&self) -> Option<Spacing> {
        self.spacing
    }

    /// Where the step came from.
    pub fn source(&self) -> RateSource {
        self.source
    }

    /// Civil time of stamp 0, where known.
    pub fn epoch(&self) -> Option<&str> {
        self.epoch.as_deref()
    }

    /// The label of frequencies on this axis: `Hz` or `1/m`.
    pub fn frequency_label(&self) -> &'static str {
        if self.is_time() { "Hz" } else { "1/m" }
    }
}
