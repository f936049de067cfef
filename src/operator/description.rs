//! The resolved operators as plain data, for reports and dry runs.

use serde::Serialize;

use crate::record::Axis;

use super::chain::{Chain, Pass, PassEnds, reaches};
use super::reach::Reaches;
use super::resampling::ResamplingDescription;
use super::step::Part;

/// A chain as plain data.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct ChainDescription {
    /// Roll-off of the filters, as written.
    pub shape: String,
    /// Derivatives (positive) or integrals (negative).
    pub turns: i32,
    /// End conditions of the integral, as written; null without one.
    pub conditions: Option<String>,
    /// The sensor's offset taken off before the integral, as written; null where none is given.
    pub offset: Option<String>,
    /// Spikes are replaced first.
    pub despike: bool,
    /// Smoothing: `auto` where every channel finds its own strength, else the strength; null without smoothing.
    pub smooth: Option<String>,
    /// The new grid; null where the rate stays.
    pub resampling: Option<ResamplingDescription>,
    /// The passes in their order.
    pub passes: Vec<PassDescription>,
    /// Reaches of all passes together, in samples.
    #[serde(flatten)]
    pub reaches: Reaches,
    /// The 99.9 % reach in the unit of the axis; absent when unbounded.
    pub reach: Option<f64>,
    /// Wavelength of the highest corner, in samples; absent without a corner.
    pub shortest_wavelength_samples: Option<f64>,
}

/// A pass as plain data.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct PassDescription {
    /// What is assumed past the ends.
    pub ends: PassEnds,
    /// Derivatives (positive) or integrals (negative), after the operators of this pass.
    pub turns: i32,
    /// True where the pass smooths and takes outliers' weight away.
    pub robust: bool,
    /// True where the pass goes over to another sampling rate.
    pub resamples: bool,
    /// Its gains.
    pub operators: Vec<OperatorDescription>,
    /// Reaches of this pass, in samples.
    #[serde(flatten)]
    pub reaches: Reaches,
}

/// A gain as plain data.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct OperatorDescription {
    /// `low_pass`, `high_pass`, `band_stop`, `notch`, `weighting`, `response`, `smoothing` or `anti_alias`.
    pub kind: &'static str,
    /// The option it came from, without dashes.
    pub option: &'static str,
    /// The option's argument as written.
    pub value: String,
    /// SHA-256 of the table that it came from; null without one.
    pub sha256: Option<String>,
    /// Its corners, lowest frequency first; of a notch the centre.
    pub corners: Vec<CornerDescription>,
    /// Reaches of this gain alone, in samples.
    #[serde(flatten)]
    pub reaches: Reaches,
}

/// A resolved corner as plain data.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct CornerDescription {
    /// As written.
    pub text: String,
    /// Its frequency in `unit`.
    pub frequency: f64,
    /// `Hz` or `1/m`.
    pub unit: &'static str,
    /// One cycle in samples.
    pub wavelength_samples: f64,
    /// The gain of this operator there: 0.5 for the shapes, 0 in the middle of a notch.
    pub gain: f64,
}

/// A row of the check table of a dry run.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct CheckPoint {
    /// The corner as written.
    pub corner: String,
    /// Octaves from the corner: -1, 0 or 1.
    pub octave: i32,
    /// Frequency in `unit`.
    pub frequency: f64,
    /// `Hz` or `1/m`.
    pub unit: &'static str,
    /// Gain of all operators together, without the power of frequency of integrals and derivatives; absent above the
    /// Nyquist frequency.
    pub gain: Option<f64>,
}

impl Chain {
    /// The chain as plain data. Measures the reach of every operator alone.
    pub fn describe(&self, axis: &Axis) -> ChainDescription {
        ChainDescription {
            shape: self.shape.to_string(),
            turns: self.turns,
            conditions: (self.turns < 0).then(|| self.conditions.to_string()),
            offset: self.offset.as_ref().filter(|_| self.turns < 0).map(ToString::to_string),
            despike: self.treatments.despike,
            smooth: self.treatments.smoothing.map(|smoothing| smoothing.to_string()),
            resampling: self.treatments.resampling.map(|resampling| resampling.describe(axis)),
            passes: self.passes.iter().map(|pass| describe_pass(pass, axis)).collect(),
            reaches: self.reaches,
            reach: self.reaches.reach.samples().map(|samples| samples * axis.step()),
            shortest_wavelength_samples: self.shortest_wavelength_samples(),
        }
    }

    /// The composite gain one octave below, at, and one octave above each corner, in the order of the passes.
    pub fn check_points(&self, axis: &Axis) -> Vec<CheckPoint> {
        let mut points = Vec::new();
        for corner in self.passes.iter().flat_map(|pass| &pass.parts).flat_map(|part| &part.corners) {
            for octave in -1..=1 {
                let cycles = corner.cycles * 2.0_f64.powi(octave);
                points.push(CheckPoint {
                    corner: corner.text.clone(),
                    octave,
                    frequency: cycles * axis.rate_base(),
                    unit: axis.frequency_label(),
                    gain: (cycles <= 0.5).then(|| self.gain(cycles)),
                });
            }
        }
        points
    }
}

fn describe_pass(pass: &Pass, axis: &Axis) -> PassDescription {
    PassDescription {
        ends: pass.ends,
        turns: pass.turns,
        robust: pass.robust.is_some(),
        resamples: pass.resampling.is_some(),
        operators: pass.parts.iter().map(|part| describe_part(part, alone(pass, part), axis)).collect(),
        reaches: pass.reaches,
    }
}

/// The reaches of one part without the others; those of the pass where it is all there is.
fn alone(pass: &Pass, part: &Part) -> Reaches {
    if pass.parts.len() == 1 && pass.turns == 0 {
        return pass.reaches;
    }
    reaches(std::slice::from_ref(part), 0)
}

fn describe_part(part: &Part, reaches: Reaches, axis: &Axis) -> OperatorDescription {
    OperatorDescription {
        kind: part.kind,
        option: part.key,
        value: part.value.clone(),
        sha256: part.gain.fingerprint().map(str::to_owned),
        corners: part
            .corners
            .iter()
            .map(|corner| CornerDescription {
                text: corner.text.clone(),
                frequency: corner.cycles * axis.rate_base(),
                unit: axis.frequency_label(),
                wavelength_samples: corner.cycles.recip(),
                gain: part.gain.at(corner.cycles),
            })
            .collect(),
        reaches,
    }
}
