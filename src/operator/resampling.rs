//! Another sampling rate in the basis of the record: the same series on a finer or coarser grid.

use std::sync::Arc;

use serde::Serialize;

use crate::error::{Error, Result};
use crate::numeric::rational::Rational;
use crate::record::{Axis, StatedRate};

use super::corner::{figure, quoted};
use super::edge::{Edge, LowPass, Rolloff};
use super::step::{CornerPoint, Effect, Frame, Part, Setting, Stage};
use super::treatment::Treatments;

/// A grid of another step over the same span.
#[derive(Debug, Clone, Copy, PartialEq, Serialize)]
pub struct Resampling {
    /// New step over old step.
    pub ratio: Rational,
    /// Samples of the new grid.
    pub count: usize,
    /// Where its first sample stands.
    pub start: Start,
}

/// Where the first sample of a new grid stands.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Default, Serialize)]
#[serde(rename_all = "snake_case")]
pub enum Start {
    /// Every sample stands in the middle of its step: the first moves by half the difference of the steps.
    #[default]
    Centre,
    /// The first sample keeps its stamp.
    Kept,
}

#[derive(Debug)]
struct Resample {
    rate: StatedRate,
    start: Start,
}

#[derive(Debug)]
struct Decimate {
    every: u64,
    start: Start,
}

/// Reads the argument of `--resample`: a rate, with `:start` where the first stamp is to be kept.
pub(super) fn resample(text: &str) -> Result<Box<dyn Setting>> {
    let (rate, start) = parted(text);
    let rate = StatedRate::parse(rate).map_err(|_| {
        Error::usage(format!("{}: no sampling rate", quoted(rate)))
            .remedy("write a rate as 100Hz or 2/mm; add :start to keep the first stamp")
    })?;
    Ok(Box::new(Resample { rate, start }))
}

/// Reads the argument of `--decimate`: a whole number from 2 on, with `:start` where the first stamp is to be kept.
pub(super) fn decimate(text: &str) -> Result<Box<dyn Setting>> {
    let (every, start) = parted(text);
    match every.parse::<u64>() {
        Ok(every @ 2..=LARGEST) => Ok(Box::new(Decimate { every, start })),
        _ => Err(Error::usage(format!("{}: no whole number from 2 to 1e9", quoted(every)))
            .remedy("write how many steps become one, such as 4; add :start to keep the first stamp")),
    }
}

const LARGEST: u64 = 1_000_000_000;

fn parted(text: &str) -> (&str, Start) {
    let text = text.trim();
    match text.strip_suffix(":start") {
        Some(before) => (before.trim(), Start::Kept),
        None => (text, Start::Centre),
    }
}

impl Setting for Resample {
    fn resolve(&self, frame: &Frame<'_>) -> Result<Effect> {
        let axis = frame.axis;
        if self.rate.unit.is_time() != axis.is_time() {
            let example = if axis.is_time() { "100Hz" } else { "2/mm" };
            return Err(Error::usage(format!("{}: the record's axis is in {}", frame.option, axis.unit()))
                .remedy(format!("give {} as in {example}", frame.option)));
        }
        let exact = Rational::exactly(self.rate.rate_base)
            .and_then(|new| axis.rate().or_else(|| Rational::exactly(axis.rate_base()))?.times(new.reciprocal()));
        let value = axis.rate_base() / self.rate.rate_base;
        // Rates that are no plain fractions of each other: the nearest fraction, far closer than any clock.
        let near = || Rational::plainest(value * (1.0 - 1e-13), value * (1.0 + 1e-13));
        let Some(ratio) = exact.filter(|r| r.numerator <= MOST && r.denominator <= MOST).or_else(near) else {
            return Err(Error::unsupported(format!(
                "{}: {} samples cannot be brought to that rate",
                frame.option, frame.len
            ))
            .remedy(format!("choose a rate nearer that of the record for {}", frame.option)));
        };
        effect(frame, ratio, self.start)
    }
}

impl Setting for Decimate {
    fn resolve(&self, frame: &Frame<'_>) -> Result<Effect> {
        let Some(ratio) = Rational::new(self.every, 1) else { return Ok(Effect::default()) };
        effect(frame, ratio, self.start)
    }
}

/// Largest part of a ratio of steps: angles stay exact integers of 128 bits.
const MOST: u64 = 1_000_000_000_000;
/// Longest record that can be held.
const LONGEST: f64 = 1e9;

fn effect(frame: &Frame<'_>, ratio: Rational, start: Start) -> Result<Effect> {
    let fits = match start {
        Start::Centre => (frame.len as u128 * u128::from(ratio.denominator)) / u128::from(ratio.numerator),
        Start::Kept => (frame.len as u128 - 1) * u128::from(ratio.denominator) / u128::from(ratio.numerator) + 1,
    };
    if fits == 0 || fits as f64 > LONGEST {
        let text = format!("{}: {} samples would become {fits}", frame.option, frame.len);
        return Err(
            Error::unsupported(text).remedy(format!("choose a rate nearer that of the record for {}", frame.option))
        );
    }
    let resampling = Resampling { ratio, count: fits as usize, start };
    let mut parts = Vec::new();
    if ratio.numerator > ratio.denominator {
        // Raised cosine from 0.8 to 1.0 of the new Nyquist frequency.
        let nyquist = 0.5 / ratio.value();
        let edge = Edge { corner: 0.9 * nyquist, rolloff: Rolloff::Cosine { half_width: 0.1 * nyquist } };
        parts.push(Part {
            kind: "anti_alias",
            key: "resample",
            value: format!("to {} {}", figure(frame.axis.rate_base() / ratio.value()), frame.axis.frequency_label()),
            stage: Stage::Resample,
            corners: vec![CornerPoint { text: "anti-alias".to_owned(), cycles: edge.corner }],
            gain: Arc::new(LowPass(edge)),
        });
    }
    let treatments = Treatments { resampling: Some(resampling), ..Treatments::default() };
    Ok(Effect { parts, treatments, ..Effect::default() })
}

/// A new grid as reports tell it.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct ResamplingDescription {
    /// New step over old step, exactly.
    pub ratio: Rational,
    /// Rate of the record, in Hz or samples a metre.
    pub rate_in: f64,
    /// Rate of the output.
    pub rate: f64,
    /// Samples of the output.
    pub samples: usize,
    /// Where its first sample stands.
    pub start: Start,
    /// How far that is after the first sample of the record, in the unit of the axis.
    pub shift: f64,
    /// Its stamp, in the unit of the axis.
    pub first_stamp: f64,
}

impl Resampling {
    /// How far the first sample stands after the first of the record, in old steps; negative before it.
    pub fn shift_steps(&self) -> f64 {
        match self.start {
            Start::Centre => {
                (self.ratio.numerator as f64 - self.ratio.denominator as f64) / (2.0 * self.ratio.denominator as f64)
            }
            Start::Kept => 0.0,
        }
    }

    /// Where sample `m` of the new grid stands, in samples of the old one.
    pub fn place(&self, m: usize) -> f64 {
        self.shift_steps() + m as f64 * self.ratio.value()
    }

    /// As reports tell it.
    pub(super) fn describe(&self, axis: &Axis) -> ResamplingDescription {
        let new = self.axis(axis);
        ResamplingDescription {
            ratio: self.ratio,
            rate_in: axis.rate_base(),
            rate: new.rate_base(),
            samples: self.count,
            start: self.start,
            shift: self.shift_steps() * axis.step(),
            first_stamp: new.start(),
        }
    }

    /// The axis of the new grid.
    pub fn axis(&self, axis: &Axis) -> Axis {
        axis.stretched(self.ratio, axis.start() + self.shift_steps() * axis.step(), self.count)
    }

    /// First and last sample of the new grid within samples `first` to `last` of the old one, of `len`; what stands past an
    /// end sample, by half a step at most, counts with it. `None` where no sample stands there.
    pub fn within(&self, first: usize, last: usize, len: usize) -> Option<(usize, usize)> {
        let index = |place: f64| (place - self.shift_steps()) / self.ratio.value();
        let from = if first == 0 { 0.0 } else { (index(first as f64) - 1e-9).ceil().max(0.0) };
        let to = if last + 1 >= len { self.count as f64 - 1.0 } else { (index(last as f64) + 1e-9).floor() };
        (from <= to && (from as usize) < self.count).then(|| (from as usize, (to as usize).min(self.count - 1)))
    }
}
