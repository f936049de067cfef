//! A row of the table of operators, and what an operator resolves to for one record.

use std::sync::Arc;

use crate::error::{Finding, Result};
use crate::record::Axis;

use super::gain::Gain;
use super::shape::Shape;
use super::treatment::Treatments;

/// One operator: its key as an option and in recipes, its help, and how its argument is read.
#[derive(Debug)]
pub struct Step {
    /// Name of the option (without dashes) and of the recipe key: `lowpass`.
    pub key: &'static str,
    /// What stands for the argument in help texts: `CORNER`.
    pub value: &'static str,
    /// An argument that can be used.
    pub example: &'static str,
    /// One line for help texts.
    pub help: &'static str,
    pub(super) read: fn(&str) -> Result<Box<dyn Setting>>,
}

impl Step {
    /// The option as typed: `--lowpass`.
    pub fn option(&self) -> String {
        format!("--{}", self.key)
    }
}

/// The argument of an operator, read but not yet related to a record.
pub(super) trait Setting: std::fmt::Debug + Send + Sync {
    /// Relates the argument to a record.
    fn resolve(&self, frame: &Frame<'_>) -> Result<Effect>;
}

/// What an operator needs to know of the run and the record.
#[derive(Debug)]
pub(super) struct Frame<'a> {
    /// The option, as errors name it.
    pub option: String,
    /// Roll-off of the run.
    pub shape: &'a Shape,
    /// Axis of the record.
    pub axis: &'a Axis,
    /// Samples of the record.
    pub len: usize,
    /// Order of the differences that smoothing penalises.
    pub order: i32,
}

/// What an operator does to one record.
#[derive(Debug, Default)]
pub(super) struct Effect {
    /// Gains, multiplied.
    pub parts: Vec<Part>,
    /// Derivatives (positive) or integrals (negative).
    pub turns: i32,
    /// What is done to the samples themselves, before and after the passes.
    pub treatments: Treatments,
    /// Remarks.
    pub findings: Vec<Finding>,
}

/// Where in the fixed order of a run a gain stands.
#[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord, Hash)]
pub(super) enum Stage {
    /// Sensor correction and frequency weighting: first.
    Response,
    /// Low-pass, band-stop, notch: before integrals and derivatives.
    Band,
    /// High-pass: last, after the end conditions of an integral.
    High,
    /// Smoothing.
    Smooth,
    /// The low-pass that goes with a lower sampling rate.
    Resample,
}

/// A gain with its corners, as reports name them.
#[derive(Debug, Clone)]
pub(super) struct Part {
    /// `low_pass`, `high_pass`, `band_stop`, `notch`, `weighting`, `response`, `smoothing`, `anti_alias`.
    pub kind: &'static str,
    /// Key of the step.
    pub key: &'static str,
    /// Argument as written.
    pub value: String,
    /// Its place in the fixed order.
    pub stage: Stage,
    /// Its corners, lowest frequency first.
    pub corners: Vec<CornerPoint>,
    /// The gain.
    pub gain: Arc<dyn Gain>,
}

/// A corner on the axis of a record.
#[derive(Debug, Clone, PartialEq)]
pub(super) struct CornerPoint {
    /// As written.
    pub text: String,
    /// In cycles per sample.
    pub cycles: f64,
}
