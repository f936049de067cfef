//! The operators of a run in their fixed order, resolved for one record: one pass, or several.

use realfft::num_complex::Complex;
use serde::Serialize;

use crate::error::{Error, Finding, Result};
use crate::numeric::polynomial::Polynomial;
use crate::record::Axis;

use super::conditions::{Conditions, Offset};
use super::corner::figure;
use super::gain::Series;
use super::reach::{Reach, Reaches, Scale};
use super::request::Request;
use super::resampling::Resampling;
use super::shape::Shape;
use super::smoothing;
use super::step::{Frame, Part, Stage};
use super::table::STEPS;
use super::treatment::{Smoothing, Strength, Treatments};

/// What a run does in the frequency domain. Gains are in a fixed order whatever the order of the requests, so results
/// agree to the last bit: response and weighting; low-pass, band-stop and notch; integral or derivative; high-pass;
/// smoothing; resampling.
#[derive(Debug, Clone)]
pub struct Chain {
    pub(super) shape: Shape,
    pub(super) passes: Vec<Pass>,
    pub(super) turns: i32,
    pub(super) reaches: Reaches,
    pub(super) conditions: Conditions,
    pub(super) offset: Option<Offset>,
    pub(super) treatments: Treatments,
}

/// One transform, multiplication and inverse transform.
#[derive(Debug, Clone)]
pub struct Pass {
    pub(super) parts: Vec<Part>,
    pub(super) turns: i32,
    pub(super) ends: PassEnds,
    pub(super) reaches: Reaches,
    pub(super) robust: Option<f64>,
    pub(super) resampling: Option<Resampling>,
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
    /// Relates requests to a record of `len` samples on `axis`. There is one pass, but for these: a response before an
    /// integral or derivative has its own before them, the high-passes after an integral (or of a band-pass with one) have
    /// their own after it, and so has robust smoothing, and resampling after that.
    ///
    /// # Errors
    /// `Usage` for corners in the other kind of unit, more than one integral or derivative, a weighted integral, and two
    /// operators of which a run takes one; `Unsupported` for corners, notches and transitions that do not fit below the
    /// Nyquist frequency.
    pub fn resolve(requests: &[Request], shape: &Shape, axis: &Axis, len: usize) -> Result<(Chain, Vec<Finding>)> {
        let mut turning = None;
        let mut parts = Vec::new();
        let mut treatments = Treatments::default();
        let mut findings = Vec::new();
        for request in requests {
            let frame = Frame { option: request.step().option(), shape, axis, len };
            let effect = request.resolve(&frame)?;
            turning = turned(turning, request, effect.turns)?;
            treatments = treatments.joined(effect.treatments)?;
            parts.extend(effect.parts);
            findings.extend(effect.findings);
        }
        let turns = turning.map_or(0, |(_, turns)| turns);
        if let (Some(weighting), Some((request, _))) = (treatments.weighting, turning) {
            return Err(Error::usage(format!("--weighting {} and {request} exclude each other", weighting.name))
                .remedy("weight the acceleration itself"));
        }
        findings.extend(empty_band(&parts, axis));
        if let Some(Smoothing { strength: Strength::Given(strength), .. }) = treatments.smoothing {
            parts.push(smoothing::part(strength));
        }
        let chain = Chain::of(parts, turns, shape.clone(), treatments);
        findings.extend(long_reach(chain.reaches.reach, turns, len));
        Ok((chain, findings))
    }

    fn of(mut parts: Vec<Part>, turns: i32, shape: Shape, treatments: Treatments) -> Chain {
        parts.sort_by(|a: &Part, b: &Part| {
            let row = |part: &Part| STEPS.iter().position(|step| step.key == part.key);
            let corners = |part: &Part| part.corners.iter().map(|c| c.cycles.to_bits()).collect::<Vec<_>>();
            (a.stage, row(a), corners(a), &a.value).cmp(&(b.stage, row(b), corners(b), &b.value))
        });
        let all = parts.clone();
        let robust = match treatments.smoothing {
            Some(Smoothing { strength: Strength::Given(strength), robust: true }) => Some(strength),
            _ => None,
        };
        let mut passes: Vec<Pass> = Vec::new();
        let mut pass = |parts: Vec<Part>, turns: i32, ends, robust| {
            let reaches = self::reaches(&parts, turns);
            passes.push(Pass { parts, turns, ends, reaches, robust, resampling: None });
        };
        let mut take =
            |wanted: &dyn Fn(&Part) -> bool| parts.extract_if(.., |part| wanted(part)).collect::<Vec<Part>>();
        let shifts = take(&|part| turns != 0 && !part.gain.is_real());
        let high = take(&|part| turns < 0 && part.stage == Stage::High);
        let smooth = take(&|part| robust.is_some() && part.stage == Stage::Smooth);
        let coarser = take(&|part| robust.is_some() && part.stage == Stage::Resample);
        let last = take(&|part| !high.is_empty() && part.stage > Stage::High);
        if !shifts.is_empty() {
            pass(shifts, 0, PassEnds::Chosen, None);
        }
        pass(parts, turns, PassEnds::Chosen, None);
        if !high.is_empty() {
            pass(high.into_iter().chain(last).collect(), 0, PassEnds::EvenWithoutBaseline, None);
        }
        if robust.is_some() {
            pass(smooth, 0, PassEnds::Chosen, robust);
            if treatments.resampling.is_some() {
                pass(coarser, 0, PassEnds::Chosen, None);
            }
        }
        if let Some(last) = passes.last_mut() {
            last.resampling = treatments.resampling;
        }
        let reaches = match passes.as_slice() {
            [only] => only.reaches,
            _ => reaches(&all, turns),
        };
        Chain { shape, passes, turns, reaches, treatments, conditions: Conditions::StartRest, offset: None }
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

    /// The same chain with the strength of its smoothing found: unchanged without smoothing.
    #[must_use]
    pub fn with_strength(&self, strength: f64) -> Chain {
        let Some(smoothing) = self.treatments.smoothing else { return self.clone() };
        let strength = Strength::Given(strength);
        self.rebuilt(
            self.parts().cloned().collect(),
            Treatments { smoothing: Some(Smoothing { strength, ..smoothing }), ..self.treatments },
        )
    }

    /// The chain as its edges are judged: outliers keep their weight, and the rate stays.
    #[must_use]
    pub fn on_own_grid(&self) -> Chain {
        let smoothing = self.treatments.smoothing.map(|smoothing| Smoothing { robust: false, ..smoothing });
        let treatments = Treatments { smoothing, resampling: None, ..self.treatments };
        // Reaches are costly: nothing is measured twice.
        if treatments == self.treatments {
            self.clone()
        } else {
            self.rebuilt(self.parts().cloned().collect(), treatments)
        }
    }

    /// The chain up to its smoothing.
    #[must_use]
    pub fn before_smoothing(&self) -> Chain {
        // Without it neither the low-pass that goes with a lower rate is wanted.
        let parts = self.parts().filter(|part| part.stage != Stage::Resample).cloned().collect();
        self.rebuilt(parts, Treatments { smoothing: None, resampling: None, ..self.treatments })
    }

    fn parts(&self) -> impl Iterator<Item = &Part> {
        self.passes.iter().flat_map(|pass| &pass.parts)
    }

    fn rebuilt(&self, mut parts: Vec<Part>, treatments: Treatments) -> Chain {
        parts.retain(|part| part.stage != Stage::Smooth);
        if let Some(Smoothing { strength: Strength::Given(strength), .. }) = treatments.smoothing {
            parts.push(smoothing::part(strength));
        }
        Chain::of(parts, self.turns, self.shape.clone(), treatments)
            .with_conditions(self.conditions.clone(), self.offset.clone())
    }

    /// What is done to the samples themselves.
    pub fn treatments(&self) -> &Treatments {
        &self.treatments
    }

    /// True where no part shifts phases.
    pub fn is_real(&self) -> bool {
        self.passes.iter().all(Pass::is_real)
    }

    /// True where the samples come out as they go in.
    pub fn is_identity(&self) -> bool {
        self.turns == 0
            && self.passes.iter().all(Pass::is_identity)
            && !self.treatments.despike
            && self.treatments.smoothing.is_none()
    }

    /// The complex response of all passes together at `f` cycles per sample, without the powers of frequency of integrals
    /// and derivatives.
    pub fn response(&self, f: f64) -> Complex<f64> {
        self.passes.iter().map(|pass| pass.response(f)).product()
    }

    /// The passes in the order of the run, at least one.
    pub fn passes(&self) -> &[Pass] {
        &self.passes
    }

    /// The pass that forms the integral, if there is one.
    pub fn integral(&self) -> Option<&Pass> {
        self.passes.iter().find(|pass| pass.turns < 0)
    }

    /// The high-pass after an integral, if there is one.
    pub fn high_pass(&self) -> Option<&Pass> {
        self.passes.iter().find(|pass| pass.ends == PassEnds::EvenWithoutBaseline)
    }

    /// Derivatives (positive) or integrals (negative) of the whole chain.
    pub fn turns(&self) -> i32 {
        self.turns
    }

    /// The roll-off of its filters.
    pub fn shape(&self) -> &Shape {
        &self.shape
    }

    /// Gain of all passes together at `f` cycles per sample (0..=0.5), its magnitude where phases shift, without the powers
    /// of frequency of integrals and derivatives.
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
    /// Gain at `f` cycles per sample (0..=0.5), without the power of frequency of integrals and derivatives; the magnitude
    /// where the pass shifts phases.
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

    /// Complex response at `f` cycles per sample, without the power of frequency of integrals and derivatives.
    pub fn response(&self, f: f64) -> Complex<f64> {
        response(&self.parts, f)
    }

    /// True where the pass shifts no phases.
    pub fn is_real(&self) -> bool {
        self.parts.iter().all(|part| part.gain.is_real())
    }

    /// The strength of a pass that smooths and takes outliers' weight away.
    pub fn robust(&self) -> Option<f64> {
        self.robust
    }

    /// The grid that the pass goes over to.
    pub fn resampling(&self) -> Option<Resampling> {
        self.resampling
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
        self.parts.is_empty() && self.turns == 0 && self.resampling.is_none()
    }
}

pub(super) fn product(parts: &[Part], f: f64) -> f64 {
    parts.iter().map(|part| part.gain.at(f)).product()
}

pub(super) fn response(parts: &[Part], f: f64) -> Complex<f64> {
    parts.iter().map(|part| part.gain.response(f)).product()
}

/// The reaches of parts that work together.
pub(super) fn reaches(parts: &[Part], turns: i32) -> Reaches {
    if parts.iter().all(|part| part.gain.is_real()) {
        Reaches::of(|f| product(parts, f), turns, scale(parts))
    } else {
        Reaches::of_response(|f| response(parts, f), turns, scale(parts))
    }
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
