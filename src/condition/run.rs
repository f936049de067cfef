//! All passes of a chain over one record, with the constants of an integral between them.

use crate::baseline::{Baseline, BaselineKind, Scale};
use crate::basis::Planner;
use crate::ends::Ends;
use crate::error::{Error, Result};
use crate::integral::{self, Arrival, AtRest, Constants, Resolved, Solver};
use crate::operator::{Chain, Pass};
use crate::record::Channel;
use crate::unit::Unit;

use super::pass::{Passed, apply};
use super::scaling;

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
    pub planner: &'a Planner,
}

/// What came of them.
pub(super) struct Ran {
    pub output: Vec<f64>,
    /// Of the first pass.
    pub parseval: f64,
    pub integral: Option<Integral>,
}

impl<'a> Scene<'a> {
    pub fn of(channel: Channel<'_>, chain: &'a Chain, ends: Ends, planner: &'a Planner) -> Result<Scene<'a>> {
        let (unit, factor) = scaling(channel, chain);
        let resolved = if chain.turns() < 0 { Some(integral::resolve(channel, chain, &unit, factor)?) } else { None };
        if resolved.as_ref().is_some_and(|r| r.solver == Solver::ZeroMean) && ends != Ends::Periodic {
            return Err(Error::usage(format!("--conditions zero-mean counts whole cycles, but the ends are {}", ends.name()))
                .remedy("use --extension periodic, or --conditions steady"));
        }
        Ok(Scene { chain, unit, factor, resolved, planner })
    }
}

/// Runs them over `samples`, which may be a continued record: `span` is the channel's own stretch between its mirrors, in
/// steps from the left mirror of `ends`.
pub(super) fn passes(
    scene: &Scene<'_>,
    samples: &[f64],
    ends: Ends,
    baseline: &Baseline,
    span: [f64; 2],
) -> Result<Ran> {
    let mut ran = Ran { output: Vec::new(), parseval: 0.0, integral: None };
    let mut begun = false;
    for pass in scene.chain.passes().iter().filter(|pass| !pass.is_identity()) {
        if begun {
            ran.output = second_pass(&ran.output, ends, pass, scene.planner)?;
            continue;
        }
        let mut passed = apply(samples, ends, baseline, pass, span, scene.planner)?;
        if let Some(resolved) = &scene.resolved {
            let integral = settled(scene, resolved, samples, ends, baseline, span, pass, &mut passed)?;
            ran.integral = Some(integral);
        }
        if scene.factor != 1.0 {
            passed.output.iter_mut().for_each(|v| *v *= scene.factor);
        }
        (ran.output, ran.parseval, begun) = (passed.output, passed.parseval, true);
    }
    if !begun {
        ran.output = samples.to_vec();
    }
    Ok(ran)
}

/// The high-pass after an integral: even reflection, no baseline.
fn second_pass(samples: &[f64], ends: Ends, pass: &Pass, planner: &Planner) -> Result<Vec<f64>> {
    let even = Ends::EVEN.seated(ends.seat());
    let nothing = Baseline::fit(BaselineKind::None, samples, even, Scale::assumed(samples.len()))?;
    let span = [0.0, even.length(samples.len())];
    Ok(apply(samples, even, &nothing, pass, span, planner)?.output)
}

/// Solves the constants of an integral that starts at rest and adds what they make.
#[expect(clippy::too_many_arguments, reason = "one pass and what it was made from")]
fn settled(
    scene: &Scene<'_>,
    resolved: &Resolved,
    samples: &[f64],
    ends: Ends,
    baseline: &Baseline,
    span: [f64; 2],
    pass: &Pass,
    passed: &mut Passed,
) -> Result<Integral> {
    let (turns, length) = (pass.turns(), span[1] - span[0]);
    let position = ends.first_position() - span[0];
    let rest = AtRest { turns, samples: &passed.output, position, spacing: 1.0, length, arrival: passed.arrival };
    let velocity = || Ok(apply(samples, ends, baseline, &pass.with_turns(-1), span, scene.planner)?.output);
    let constants = resolved.solver.solve(&rest, resolved.offset, velocity)?;
    if constants != Constants::default() {
        for (n, value) in passed.output.iter_mut().enumerate() {
            *value += constants.at(turns, position + n as f64, length);
        }
    }
    let arrival = constants.arrival(passed.arrival, length);
    Ok(Integral { resolved: resolved.clone(), constants, arrival, length })
}

/// What an integral is the integral of: every pass without its turns, less offset and drift, in the record's unit.
pub(super) fn corrected(
    chain: &Chain,
    samples: &[f64],
    ends: Ends,
    baseline: &Baseline,
    span: [f64; 2],
    constants: Constants,
    planner: &Planner,
) -> Result<Vec<f64>> {
    let mut output = samples.to_vec();
    for pass in chain.passes() {
        if pass.turns() == 0 {
            output = second_pass(&output, ends, pass, planner)?;
            continue;
        }
        let plain = pass.with_turns(0);
        if !plain.is_identity() {
            output = apply(samples, ends, baseline, &plain, span, planner)?.output;
        }
        for (n, value) in output.iter_mut().enumerate() {
            *value += constants.of_record(ends.first_position() - span[0] + n as f64, span[1] - span[0]);
        }
    }
    Ok(output)
}
