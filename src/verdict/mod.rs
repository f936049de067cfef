//! The verdict: which extension the record's end behaviour supports for one operator, and what each costs at the edges.

mod auto;
mod candidate;
mod difference;
mod edge;
mod level;
mod near;
mod sentence;
mod unjudged;

use serde::Serialize;

use crate::baseline::{EndEstimates, Scale, Side};
use crate::ends::Ends;
use crate::forecast::{Evidence, Forecast, Response};
use crate::metric::join;
use crate::numeric::sum;

pub use auto::{Auto, Structure};
pub use candidate::{CANDIDATES, Candidate, EVEN, Extension, ODD_ZERO, PERIODIC};
pub use edge::{Adequacy, Edge, Scene, Trusted};
pub use level::{Level, Pick};
pub use unjudged::Unjudged;

use difference::Difference;
use near::Near;

/// Shorter records are not judged.
pub const SHORTEST_RECORD: usize = 16;
/// Corners of fewer samples are not judged.
pub const SHORTEST_WAVELENGTH: f64 = 4.0;

/// What is to be judged.
pub struct Case<'a> {
    /// The record.
    pub samples: &'a [f64],
    /// Its past and what that foretells; the reason where nothing can be judged.
    pub past: Result<Past<'a>, Unjudged>,
    /// Its structure, from `structure`.
    pub structure: Structure,
    /// The end estimates, for the half-sample seat.
    pub estimates: EndEstimates,
    /// The operator, in the unit of the output.
    pub response: &'a Response<'a>,
    /// The operator's whole output of the record under an extension.
    pub output: &'a dyn Fn(Extension) -> Vec<f64>,
    /// How the output is formed.
    pub formed: Formed,
    /// What edge error is tolerable.
    pub tolerance: Tolerance,
}

/// The past of a record, and what it foretells under an operator.
#[derive(Clone, Copy)]
pub struct Past<'a> {
    /// Its fits, for the block length that suits the operator.
    pub evidence: &'a Evidence,
    /// The forecast from them under the operator.
    pub forecast: &'a Forecast,
    /// The whole output under the forecast.
    pub foretold: &'a [f64],
}

/// How an output is formed.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Formed {
    /// By the operator's impulse response over the record, extended about half-sample mirrors: the blocks next to the ends
    /// tell the edges.
    InOnePass,
    /// In several passes with extensions of their own, or about whole-sample mirrors: only whole outputs tell the edges.
    Otherwise,
}

/// A tolerable edge error.
#[derive(Debug, Clone, Copy, PartialEq)]
pub enum Tolerance {
    /// A share of the output's standard deviation.
    Share(f64),
    /// In the output's unit.
    Absolute(f64),
}

/// Whether flat ends may be claimed from data alone. They are not: no real record has ever supported it.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Default)]
pub enum FlatEnds {
    /// Never claimed.
    #[default]
    Ignored,
    /// Claimed when both ends join their reflections as the interior runs.
    Claimed,
}

/// The verdict on one record under one operator.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct Verdict {
    /// The pick among the symmetric extensions.
    pub pick: Pick,
    /// What `auto` takes.
    pub auto: Auto,
    /// One row for each of `CANDIDATES`, then `forecast`, then the references `odd-zero`, `zero` and `hold`. Empty when
    /// nothing was judged.
    pub edges: Vec<Edge>,
    /// Joins of the ends.
    pub structure: Structure,
    /// Standard deviation of the output.
    pub output_deviation: f64,
    /// The tolerance in the output's unit.
    pub tolerance: f64,
    /// The edge zone at each end, in samples.
    pub zone: usize,
    /// Root mean square distance of each row of `edges` from the forecast over both zones.
    #[serde(skip)]
    pub distances: Vec<f64>,
    /// Why nothing was judged.
    pub unjudged: Option<Unjudged>,
    /// What further continuations are judged by; `None` when nothing was judged.
    #[serde(skip)]
    pub scene: Option<Scene>,
}

impl Verdict {
    /// Judges a case.
    pub fn of(case: &Case, flat_ends: FlatEnds) -> Verdict {
        let len = case.samples.len();
        let response = case.response;
        let zone = response.zone(len);
        let past = match (Unjudged::of(case.samples, response), case.past) {
            (None, Ok(past)) => past,
            (Some(reason), _) | (None, Err(reason)) => return Verdict::not_judged(case, zone, reason),
        };
        let output_deviation = sum::standard_deviation(past.foretold);
        if !output_deviation.is_finite() || output_deviation <= 0.0 {
            return Verdict::not_judged(case, zone, Unjudged::Unformed);
        }
        let differences = differences(case, past);
        let tolerance = case.tolerance.absolute(output_deviation);
        let scene = Scene {
            // At least 1e-4 of the output's standard deviation: no model is better than that.
            forecast_error: past.forecast.predicted_error().max(1e-4 * output_deviation),
            deviations: [Side::Left, Side::Right]
                .map(|side| past.forecast.profile(side).iter().map(|variance| variance.sqrt()).collect()),
            len,
            zone,
            trimmable: response.trimmable(len),
            reach_exceeds_record: response.reach() >= len,
            even_distance: differences[EVEN].1.rms(zone),
            output_deviation,
            tolerance,
        };
        let edges: Vec<Edge> = differences
            .iter()
            .map(|(name, difference)| scene.edge(*name, (*name != Auto::Forecast.name()).then_some(difference)))
            .collect();
        let distances: Vec<f64> = differences.iter().map(|(_, difference)| difference.rms(zone)).collect();
        let pick = Pick::among(&edges[..CANDIDATES.len()], case.structure.periodic.as_ref());
        let error = scene.forecast_error;
        let auto = if case.structure.is_closed(distances[PERIODIC], error) {
            Auto::Periodic
        } else if flat_ends == FlatEnds::Claimed && case.structure.is_flat(distances[EVEN], error) {
            Auto::Even
        } else {
            Auto::Forecast
        };
        Verdict {
            pick,
            auto,
            edges,
            structure: case.structure,
            output_deviation,
            tolerance,
            zone,
            distances,
            unjudged: None,
            scene: Some(scene),
        }
    }

    fn not_judged(case: &Case, zone: usize, reason: Unjudged) -> Verdict {
        let output = (case.output)(Extension::Symmetric(&CANDIDATES[EVEN]));
        let output_deviation = sum::standard_deviation(&output);
        Verdict {
            pick: Pick::not_judged(),
            auto: Auto::Even,
            edges: Vec::new(),
            structure: case.structure,
            output_deviation,
            tolerance: case.tolerance.absolute(output_deviation),
            zone,
            distances: Vec::new(),
            unjudged: Some(reason),
            scene: None,
        }
    }

    /// The row of an extension.
    pub fn edge(&self, name: &str) -> Option<&Edge> {
        self.edges.iter().find(|edge| edge.name == name)
    }
}

impl Tolerance {
    fn absolute(self, deviation: f64) -> f64 {
        match self {
            Tolerance::Share(share) => share * deviation,
            Tolerance::Absolute(value) => value,
        }
    }
}

/// The joins of a record with itself: one test serves all operators with the same block length.
pub fn structure(evidence: &Evidence) -> Structure {
    structure_of([Side::Left, Side::Right].map(|side| evidence.blocks(side)))
}

/// As `structure`, from the histories towards the left and the right end, oldest first.
pub fn structure_of([left, right]: [&[f64]; 2]) -> Structure {
    Structure { periodic: join::periodic(left, right), even_left: join::even(left), even_right: join::even(right) }
}

/// The end estimates that the candidates' baselines rest on.
pub fn estimates(samples: &[f64], response: &Response, noise: f64) -> EndEstimates {
    let zone = response.zone(samples.len());
    let scale = Scale { shortest_wavelength: response.shape().shortest_wavelength, zone };
    EndEstimates::with_noise(samples, Ends::EVEN, scale, noise)
}

/// The difference of every extension's output to the forecast's, near the ends, in the order of `Verdict::edges`.
fn differences(case: &Case, past: Past<'_>) -> Vec<(&'static str, Difference)> {
    let len = case.samples.len();
    let farthest = case.response.trimmable(len).max(case.response.zone(len));
    match Near::new(past.evidence, case.response, farthest).filter(|_| case.formed == Formed::InOnePass) {
        Some(near) => near_differences(case, past.forecast, &near),
        None => whole_differences(case, past.foretold, farthest),
    }
}

/// From the blocks next to the ends.
fn near_differences(case: &Case, forecast: &Forecast, near: &Near) -> Vec<(&'static str, Difference)> {
    let samples = case.samples;
    let ahead = [Side::Left, Side::Right].map(|side| near.foretold(forecast, side));
    let mean = sum::mean(samples);
    let symmetric = |candidate: &'static Candidate| {
        let outside = [Side::Left, Side::Right].map(|side| near.symmetric(candidate, &case.estimates, mean, side));
        (candidate.name, near.difference(&outside, &ahead))
    };
    let constant = |name, left, right| (name, near.difference(&[near.constant(left), near.constant(right)], &ahead));
    let mut found: Vec<(&'static str, Difference)> = CANDIDATES.iter().map(symmetric).collect();
    found.push((Auto::Forecast.name(), Difference::none()));
    found.push(symmetric(&ODD_ZERO));
    found.push(constant("zero", 0.0, 0.0));
    found.push(constant("hold", samples[0], samples[samples.len() - 1]));
    found
}

/// From the whole output under every extension.
fn whole_differences(case: &Case, foretold: &[f64], farthest: usize) -> Vec<(&'static str, Difference)> {
    let samples = case.samples;
    let len = samples.len();
    let symmetric = |candidate: &'static Candidate| {
        let output = (case.output)(Extension::Symmetric(candidate));
        (candidate.name, Difference::between(&output, foretold, farthest))
    };
    let constant = |name, left: f64, right: f64, pad: usize| {
        let output = (case.output)(Extension::Continued { left: &vec![left; pad], right: &vec![right; pad] });
        (name, Difference::between(&output, foretold, farthest))
    };
    let pad = case.response.reach().max(8).min(len);
    let mut found: Vec<(&'static str, Difference)> = CANDIDATES.iter().map(symmetric).collect();
    found.push((Auto::Forecast.name(), Difference::none()));
    found.push(symmetric(&ODD_ZERO));
    found.push(constant("zero", 0.0, 0.0, len));
    found.push(constant("hold", samples[0], samples[len - 1], pad));
    found
}

#[cfg(test)]
mod tests;
