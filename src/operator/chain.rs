//! The operators of a run in their fixed order, resolved for one record: one pass, or two around an integral.

use serde::Serialize;

use crate::error::{Error, Finding, Result};
use crate::numeric::polynomial::Polynomial;
use crate::record::Axis;

use super::conditions::{Conditions, Offset};
use super::corner::figure;
use super::gain::Series;
use super::reach::{Reach, Reaches, Scale};
use super::request::Request;
use super::shape::Shape;
use super::step::{Frame, Part, Stage};
use super::table::STEPS;

/// What a run does in the frequency domain. Gains are in a fixed order whatever the order of the requests, so results
/// agree to the last bit: low-pass, band-stop and notch; integral or derivative; high-pass.
#[derive(Debug, Clone)]
pub struct Chain {
    pub(super) shape: Shape,
    pub(super) passes: Vec<Pass>,
    pub(super) turns: i32,
    pub(super) reaches: Reaches,
    pub(super) conditions: Conditions,
    pub(super) offset: Option<Offset>,
}

/// One transform, multiplication and inverse transform.
#[derive(Debug, Clone)]
pub struct Pass {
    pub(super) parts: Vec<Part>,
    pub(super) turns: i32,
    pub(super) ends: PassEnds,
    pub(super) reaches: Reaches,
}

/// What a pass assumes past the ends of the record.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Hash, Serialize)]
#[serde(rename_all = "snake_case")]
pub enum PassEnds {
    /// The extension and baseline of the run.
    Chosen,
    /// Even reflection without a baseline: the high-pass after an integral, whose large polynomial and low frequencies
    /// cancel and must be filtered together.
    EvenWithoutBaseline,
}

impl Chain {
    /// Relates requests to a record of `len` samples on `axis`. Without an integral there is one pass; an integral with
    /// a high-pass (or band-pass) has its high-passes in a second one.
    ///
    /// # Errors
    /// `Usage` for corners in the other kind of unit, and more than one integral or derivative; `Unsupported` for
    /// corners, notches and transitions that do not fit below the Nyquist frequency.
    pub fn resolve(requests: &[Request], shape: &Shape, axis: &Axis, len: usize) -> Result<(Chain, Vec<Finding>)> {
        let mut turning = None;
        let mut parts = Vec::new();
        let mut findings = Vec::new();
        for request in requests {
            let frame = Frame { option: request.step().option(), shape, axis, len };
            let effect = request.resolve(&frame)?;
            turning = turned(turning, request, effect.turns)?;
            parts.extend(effect.parts);
            findings.extend(effect.findings);
        }
        parts.sort_by(|a: &Part, b: &Part| {
            let row = |part: &Part| STEPS.iter().position(|step| step.key == part.key);
            let corners = |part: &Part| part.corners.iter().map(|c| c.cycles.to_bits()).collect::<Vec<_>>();
            (a.stage, row(a), corners(a), &a.value).cmp(&(b.stage, row(b), corners(b), &b.value))
        });
        let turns = turning.map_or(0, |(_, turns)| turns);
        findings.extend(empty_band(&parts, axis));
        let chain = Chain::of(parts, turns, shape.clone());
        findings.extend(long_reach(chain.reaches.reach, turns, len));
        Ok((chain, findings))
    }

    fn of(parts: Vec<Part>, turns: i32, shape: Shape) -> Chain {
        let pass = |parts: Vec<Part>, turns, ends| {
            let reaches = Reaches::of(|f| product(&parts, f), turns, scale(&parts));
            Pass { parts, turns, ends, reaches }
        };
        if turns < 0 && parts.iter().any(|part| part.stage == Stage::High) {
            let reaches = Reaches::of(|f| product(&parts, f), turns, scale(&parts));
            let (high, band): (Vec<Part>, Vec<Part>) = parts.into_iter().partition(|part| part.stage == Stage::High);
            let passes = vec![pass(band, turns, PassEnds::Chosen), pass(high, 0, PassEnds::EvenWithoutBaseline)];
            return Chain { shape, passes, turns, reaches, conditions: Conditions::StartRest, offset: None };
        }
        let pass = pass(parts, turns, PassEnds::Chosen);
        let reaches = pass.reaches;
        Chain { shape, passes: vec![pass], turns, reaches, conditions: Conditions::StartRest, offset: None }
    }

    /// The same chain with other end conditions of its integral, and the sensor's offset where they take one. As resolved,
    /// integrals start at rest.
    #[must_use]
    pub fn with_conditions(mut self, conditions: Conditions, offset: Option<Offset>) -> Chain {
        self.conditions = conditions;
        self.offset = offset;
        self
    }

    /// The end conditions of its integral; of no account without one.
    pub fn conditions(&self) -> &Conditions {
        &self.conditions
    }

    /// The sensor's offset, where one is given.
    pub fn offset(&self) -> Option<&Offset> {
        self.offset.as_ref()
    }

    /// The passes in the order of the run: one or two.
    pub fn passes(&self) -> &[Pass] {
        &self.passes
    }

    /// Derivatives (positive) or integrals (negative) of the whole chain.
    pub fn turns(&self) -> i32 {
        self.turns
    }

    /// The roll-off of its filters.
    pub fn shape(&self) -> &Shape {
        &self.shape
    }

    /// Gain of all passes together at `f` cycles per sample (0..=0.5), without the powers of frequency of integrals and
    /// derivatives.
    pub fn gain(&self, f: f64) -> f64 {
        self.passes.iter().map(|pass| pass.gain(f)).product()
    }

    /// The reaches of all passes together, integrals and derivatives included.
    pub fn reaches(&self) -> &Reaches {
        &self.reaches
    }

    /// The wavelength in samples of the highest corner; `None` without a corner.
    pub fn shortest_wavelength_samples(&self) -> Option<f64> {
        self.highest_corner().map(f64::recip)
    }

    /// The wavelength in samples of the lowest corner; `None` without a corner.
    pub fn longest_wavelength_samples(&self) -> Option<f64> {
        self.corners().min_by(f64::total_cmp).map(f64::recip)
    }

    fn highest_corner(&self) -> Option<f64> {
        self.corners().max_by(f64::total_cmp)
    }

    fn corners(&self) -> impl Iterator<Item = f64> {
        self.passes.iter().flat_map(|pass| &pass.parts).flat_map(|part| &part.corners).map(|corner| corner.cycles)
    }
}

impl Pass {
    /// Gain at `f` cycles per sample (0..=0.5), without the power of frequency of integrals and derivatives.
    pub fn gain(&self, f: f64) -> f64 {
        product(&self.parts, f)
    }

    /// The same gains with other turns.
    #[must_use]
    pub fn with_turns(&self, turns: i32) -> Pass {
        Pass { turns, ..self.clone() }
    }

    /// The lowest corner in cycles per sample; `None` without a corner.
    pub fn lowest_corner(&self) -> Option<f64> {
        self.parts.iter().flat_map(|part| &part.corners).map(|corner| corner.cycles).min_by(f64::total_cmp)
    }

    /// Taylor series of the gain at zero frequency.
    pub fn series(&self) -> Series {
        self.parts.iter().fold(Series::ONE, |series, part| series.times(part.gain.series()))
    }

    /// What the gain makes of a polynomial in samples: exact up to degree 5. Integrals and derivatives of the pass are
    /// not included: `Polynomial` has them.
    pub fn carry(&self, b: &Polynomial) -> Polynomial {
        self.carry_stepped(b, 1.0)
    }

    /// As `carry`, for a polynomial in a variable of which a sample takes `step`.
    pub fn carry_stepped(&self, b: &Polynomial, step: f64) -> Polynomial {
        self.series().carry(b, step)
    }

    /// Derivatives (positive) or integrals (negative).
    pub fn turns(&self) -> i32 {
        self.turns
    }

    /// What the pass assumes past the ends.
    pub fn ends(&self) -> PassEnds {
        self.ends
    }

    /// The reaches of this pass, its integrals and derivatives included.
    pub fn reaches(&self) -> &Reaches {
        &self.reaches
    }

    /// True when the pass changes nothing: no gain, no integral or derivative.
    pub fn is_identity(&self) -> bool {
        self.parts.is_empty() && self.turns == 0
    }
}

pub(super) fn product(parts: &[Part], f: f64) -> f64 {
    parts.iter().map(|part| part.gain.at(f)).product()
}

/// Convolution adds extents.
pub(super) fn scale(parts: &[Part]) -> Scale {
    Scale {
        extent_samples: parts.iter().map(|part| part.gain.extent_samples()).sum(),
        highest: parts.iter().map(|part| part.gain.highest()).fold(0.0, f64::max),
    }
}

/// The one integral or derivative of the run, if any, so far and with the next request.
fn turned<'a>(
    before: Option<(&'a Request, i32)>,
    request: &'a Request,
    turns: i32,
) -> Result<Option<(&'a Request, i32)>> {
    let option = request.step().option();
    match before {
        _ if turns == 0 => Ok(before),
        None => Ok(Some((request, turns))),
        Some((_, others)) if others.signum() == turns.signum() => {
            Err(Error::usage(format!("{option} is given more than once")).remedy(format!("write {option} 2 for twice")))
        }
        Some((other, _)) => Err(Error::usage(format!("{other} and {request} exclude each other"))
            .remedy(format!("leave out {} or {option}", other.step().option()))),
    }
}

/// A remark when a low-pass lies below a high-pass.
fn empty_band(parts: &[Part], axis: &Axis) -> Option<Finding> {
    let corners = |kind: &'static str| parts.iter().filter(move |part| part.kind == kind).map(|p| p.corners[0].cycles);
    let low = corners("low_pass").min_by(f64::total_cmp)?;
    let high = corners("high_pass").max_by(f64::total_cmp)?;
    (low <= high).then(|| {
        let label = axis.frequency_label();
        let (low, high) = (figure(low * axis.rate_base()), figure(high * axis.rate_base()));
        Finding::new(
            "no_pass_band",
            format!("the low-pass at {low} {label} and the high-pass at {high} {label} leave no pass band"),
        )
    })
}

/// A remark when most of the record lies within reach of its ends.
fn long_reach(reach: Reach, turns: i32, len: usize) -> Option<Finding> {
    let len_samples = len as f64;
    match reach {
        // An integral owes its reach to its end conditions, which are judged with them.
        Reach::Unbounded if turns < 0 => None,
        Reach::Unbounded => Some(Finding::new(
            "reach_unbounded",
            "every sample feels what lies beyond the ends: the response of this gain never dies away",
        )),
        Reach::Samples(reach) if reach > len_samples => Some(Finding::new(
            "reach_exceeds_record",
            format!(
                "the reach of {} samples exceeds the record of {len}: more is assumed than measured",
                figure(reach.ceil())
            ),
        )),
        Reach::Samples(reach) if reach > len_samples / 4.0 => Some(Finding::new(
            "reach_over_quarter",
            format!("the reach of {} samples is over a quarter of the record of {len}", figure(reach.ceil())),
        )),
        Reach::Samples(_) => None,
    }
}

#[cfg(test)]
mod tests;
