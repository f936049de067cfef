//! Low-pass, high-pass, band-pass and band-stop.

use std::sync::Arc;

use crate::error::Result;

use super::corner::Corner;
use super::edge::{BandStop, Edge, HighPass, LowPass};
use super::gain::Gain;
use super::range::Range;
use super::shape::Shape;
use super::step::{CornerPoint, Effect, Frame, Part, Setting, Stage};

#[derive(Debug)]
struct Low(Corner);

#[derive(Debug)]
struct Split(Corner);

#[derive(Debug)]
struct High(Corner);

#[derive(Debug)]
struct Pass(Range);

#[derive(Debug)]
struct Stop(Range);

/// Reads the argument of `--lowpass`.
pub(super) fn lowpass(text: &str) -> Result<Box<dyn Setting>> {
    Ok(Box::new(Low(Corner::parse(text)?)))
}

/// Reads the argument of `--split`.
pub(super) fn split(text: &str) -> Result<Box<dyn Setting>> {
    Ok(Box::new(Split(Corner::parse(text)?)))
}

/// Reads the argument of `--highpass`.
pub(super) fn highpass(text: &str) -> Result<Box<dyn Setting>> {
    Ok(Box::new(High(Corner::parse(text)?)))
}

/// Reads the argument of `--bandpass`.
pub(super) fn bandpass(text: &str) -> Result<Box<dyn Setting>> {
    Ok(Box::new(Pass(Range::parse(text)?)))
}

/// Reads the argument of `--bandstop`.
pub(super) fn bandstop(text: &str) -> Result<Box<dyn Setting>> {
    Ok(Box::new(Stop(Range::parse(text)?)))
}

impl Setting for Low {
    fn resolve(&self, frame: &Frame<'_>) -> Result<Effect> {
        let edge = edge(frame, &self.0)?;
        let part = low_part("lowpass", self.0.text(), &self.0, edge);
        Ok(effect(frame, vec![part], &[&self.0]))
    }
}

impl Setting for Split {
    /// The Gaussian low-pass of ISO 16610-21, whatever the shape of the other filters: what is longer than the corner.
    fn resolve(&self, frame: &Frame<'_>) -> Result<Effect> {
        let edge = Shape::Gaussian.edge(&frame.option, &self.0, frame.axis)?;
        let part = low_part("split", self.0.text(), &self.0, edge);
        Ok(effect(frame, vec![part], &[&self.0]))
    }
}

impl Setting for High {
    fn resolve(&self, frame: &Frame<'_>) -> Result<Effect> {
        let edge = edge(frame, &self.0)?;
        let part = high_part("highpass", self.0.text(), &self.0, edge);
        Ok(effect(frame, vec![part], &[&self.0]))
    }
}

impl Setting for Pass {
    /// A low-pass at the upper corner times a high-pass at the lower one.
    fn resolve(&self, frame: &Frame<'_>) -> Result<Effect> {
        let (low, high) = (self.0.low(), self.0.high());
        let parts = vec![
            low_part("bandpass", self.0.text(), high, edge(frame, high)?),
            high_part("bandpass", self.0.text(), low, edge(frame, low)?),
        ];
        Ok(effect(frame, parts, &[low, high]))
    }
}

impl Setting for Stop {
    /// One minus the band-pass of the same corners.
    fn resolve(&self, frame: &Frame<'_>) -> Result<Effect> {
        let (low, high) = (self.0.low(), self.0.high());
        let (lower, upper) = (edge(frame, low)?, edge(frame, high)?);
        let part = Part {
            kind: "band_stop",
            key: "bandstop",
            value: self.0.text().to_owned(),
            stage: Stage::Band,
            corners: vec![point(low, lower.corner), point(high, upper.corner)],
            gain: Arc::new(BandStop { low: lower, high: upper }),
        };
        Ok(effect(frame, vec![part], &[low, high]))
    }
}

fn edge(frame: &Frame<'_>, corner: &Corner) -> Result<Edge> {
    frame.shape.edge(&frame.option, corner, frame.axis)
}

fn point(corner: &Corner, cycles: f64) -> CornerPoint {
    CornerPoint { text: corner.text().to_owned(), cycles }
}

fn low_part(key: &'static str, value: &str, corner: &Corner, edge: Edge) -> Part {
    one_corner("low_pass", key, value, Stage::Band, point(corner, edge.corner), Arc::new(LowPass(edge)))
}

fn high_part(key: &'static str, value: &str, corner: &Corner, edge: Edge) -> Part {
    one_corner("high_pass", key, value, Stage::High, point(corner, edge.corner), Arc::new(HighPass(edge)))
}

fn one_corner(
    kind: &'static str,
    key: &'static str,
    value: &str,
    stage: Stage,
    corner: CornerPoint,
    gain: Arc<dyn Gain>,
) -> Part {
    Part { kind, key, value: value.to_owned(), stage, corners: vec![corner], gain }
}

fn effect(frame: &Frame<'_>, parts: Vec<Part>, corners: &[&Corner]) -> Effect {
    let findings = corners.iter().filter_map(|c| c.note(&frame.option, frame.axis, frame.len)).collect();
    Effect { parts, findings, ..Effect::default() }
}
