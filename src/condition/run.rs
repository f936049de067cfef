//! All passes of a chain over one record, with the constants of an integral between them.

use crate::baseline::{Baseline, BaselineKind, Scale};
use crate::basis::Planner;
use crate::ends::Ends;
use crate::error::{Error, Result};
use crate::integral::{self, Arrival, AtRest, Constants, Resolved, Solver};
use crate::operator::{Chain, Pass, PassEnds};
use crate::record::Channel;
use crate::unit::Unit;

use super::pass::{Passed, Span, apply};
use super::smoother::{Robust, Smoother};
use super::{Outcome, scaling};

/// What the end conditions made of an integral.
#[derive(Debug, Clone)]
pub struct Integral {
    /// End conditions related to the channel.
    pub resolved: Resolved,
    /// Initial values, offset and drift, in the record's unit and steps.
    pub constants: Constants,
    /// Where the integrals arrive at the record's end, before a high-pass; in steps.
    pub arrival: Arrival,
    /// Length of the record between its mirrors, in steps.
    pub length: f64,
}

/// What all passes share.
pub(super) struct Scene<'a> {
    pub chain: &'a Chain,
    pub unit: Unit,
    /// From numbers in steps to the unit of the output.
    pub factor: f64,
    pub resolved: Option<Resolved>,
    pub scale: Scale,
    pub planner: &'a Planner,
}

/// What came of them.
pub(super) struct Ran {
    pub output: Vec<f64>,
    /// Of the first pass.
    pub parseval: f64,
    /// Samples that robust smoothing gave no weight.
    pub outliers: Option<usize>,
    pub integral: Option<Integral>,
}

impl Ran {
    pub fn outcome(self, unit: Unit, ends: Ends, baseline: Baseline, scale: Scale) -> Outcome {
        let Ran { output, parseval, outliers, integral } = self;
        Outcome { output, unit, ends, baseline, scale, parseval, outliers, integral }
    }
}

impl<'a> Scene<'a> {
    pub fn of(
        channel: Channel<'_>,
        chain: &'a Chain,
        ends: Ends,
        scale: Scale,
        planner: &'a Planner,
    ) -> Result<Scene<'a>> {
        let (unit, factor) = scaling(channel, chain);
        let resolved = if chain.turns() < 0 { Some(integral::resolve(channel, chain, &unit, factor)?) } else { None };
        if resolved.as_ref().is_some_and(|r| r.solver == Solver::ZeroMean) && ends != Ends::Periodic {
            let what = format!("--conditions zero-mean counts whole cycles, but the ends are {}", ends.name());
            return Err(Error::usage(what).remedy("use --extension periodic, or --conditions steady"));
        }
        Ok(Scene { chain, unit, factor, resolved, scale, planner })
    }
}

/// Runs them over `samples`, of which `span` is the channel proper.
pub(super) fn passes(scene: &Scene<'_>, samples: &[f64], ends: Ends, baseline: &Baseline, span: Span) -> Result<Ran> {
    let mut so_far: Option<Ran> = None;
    for pass in scene.chain.passes().iter().filter(|pass| !pass.is_identity()) {
        let input = so_far.as_ref().map_or(samples, |ran| ran.output.as_slice());
        let (ends, baseline) = stage(scene, pass, input, ends, baseline, so_far.is_none())?;
        let (mut outliers, mut integral) = (None, None);
        let mut passed = match pass.robust() {
            Some(strength) => {
                let (passed, count) = robust(input, ends, &baseline, strength, scene.planner)?;
                outliers = Some(count);
                passed
            }
            None => apply(input, ends, &baseline, pass, span, scene.planner)?,
        };
        if let Some(resolved) = scene.resolved.as_ref().filter(|_| pass.turns() < 0) {
            let velocity = || Ok(apply(input, ends, &baseline, &pass.with_turns(-1), span, scene.planner)?.output);
            integral = Some(settled(resolved, &mut passed, pass.turns(), span.mirrors(ends), velocity)?);
        }
        if pass.turns() != 0 && scene.factor != 1.0 {
            passed.output.iter_mut().for_each(|v| *v *= scene.factor);
        }
        so_far = Some(match so_far {
            None => Ran { output: passed.output, parseval: passed.parseval, outliers, integral },
            Some(first) => Ran {
                output: passed.output,
                parseval: first.parseval,
                outliers: outliers.or(first.outliers),
                integral: integral.or(first.integral),
            },
        });
    }
    let unchanged = || Ran { output: samples.to_vec(), parseval: 0.0, outliers: None, integral: None };
    Ok(so_far.unwrap_or_else(unchanged))
}

/// Ends and baseline of one pass: those of the run, fitted anew to what earlier passes left, or even without a baseline.
fn stage(
    scene: &Scene<'_>,
    pass: &Pass,
    input: &[f64],
    ends: Ends,
    baseline: &Baseline,
    first: bool,
) -> Result<(Ends, Baseline)> {
    Ok(match pass.ends() {
        PassEnds::Chosen if first => (ends, baseline.clone()),
        PassEnds::Chosen => (ends, Baseline::fit(baseline.kind(), input, ends, scene.scale)?),
        PassEnds::EvenWithoutBaseline => {
            let even = Ends::EVEN.seated(ends.seat());
            (even, Baseline::fit(BaselineKind::None, input, even, Scale::assumed(input.len()))?)
        }
    })
}

/// Solves the constants of an integral that starts at rest and adds what they make.
fn settled(
    resolved: &Resolved,
    passed: &mut Passed,
    turns: i32,
    [start, end]: [f64; 2],
    velocity: impl FnOnce() -> Result<Vec<f64>>,
) -> Result<Integral> {
    let (position, spacing, length) = (passed.first - start, passed.spacing, end - start);
    let rest = AtRest { turns, samples: &passed.output, position, spacing, length, arrival: passed.arrival };
    let constants = resolved.solver.solve(&rest, resolved.offset, velocity)?;
    if constants != Constants::default() {
        for (n, value) in passed.output.iter_mut().enumerate() {
            *value += constants.at(turns, position + n as f64 * spacing, length);
        }
    }
    let arrival = constants.arrival(passed.arrival, length);
    Ok(Integral { resolved: resolved.clone(), constants, arrival, length })
}

/// What an integral is the integral of: every pass without its turns, less offset and drift, in the record's unit.
pub(super) fn corrected(
    scene: &Scene<'_>,
    samples: &[f64],
    ends: Ends,
    baseline: &Baseline,
    span: Span,
    constants: Constants,
) -> Result<Vec<f64>> {
    let mut output = samples.to_vec();
    for (index, pass) in scene.chain.passes().iter().enumerate() {
        let (ends, baseline) = stage(scene, pass, &output, ends, baseline, index == 0)?;
        let plain = pass.with_turns(0);
        if let Some(strength) = pass.robust() {
            output = robust(&output, ends, &baseline, strength, scene.planner)?.0.output;
        } else if !plain.is_identity() {
            output = apply(&output, ends, &baseline, &plain, span, scene.planner)?.output;
        }
        if pass.turns() < 0 {
            let [start, end] = span.mirrors(ends);
            for (n, value) in output.iter_mut().enumerate() {
                *value += constants.of_record(ends.first_position() - start + n as f64, end - start);
            }
        }
    }
    Ok(output)
}

/// Robust smoothing of what a baseline leaves.
fn robust(
    samples: &[f64],
    ends: Ends,
    baseline: &Baseline,
    strength: f64,
    planner: &Planner,
) -> Result<(Passed, usize)> {
    let first = ends.first_position();
    let at = |n: usize| baseline.polynomial().at(n as f64 + first);
    let rest: Vec<f64> = samples.iter().enumerate().map(|(n, v)| v - at(n)).collect();
    let Robust { values, weights, .. } =
        Smoother::new(planner, ends, samples.len(), 2)?.robust(&rest, None, Some(strength));
    let output = values.iter().enumerate().map(|(n, v)| v + at(n)).collect();
    let passed = Passed { output, parseval: 0.0, first, spacing: 1.0, arrival: Arrival::default() };
    Ok((passed, weights.iter().filter(|w| **w == 0.0).count()))
}
