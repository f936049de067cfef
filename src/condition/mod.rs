//! The main job: a channel, its assumed continuation and a chain of operators make a conditioned channel.

mod choice;
mod pass;
mod run;

use crate::baseline::{Baseline, BaselineKind, Scale};
use crate::basis::Planner;
use crate::ends::{Ends, Parity, Seat};
use crate::error::Result;
use crate::operator::Chain;
use crate::record::Channel;
use crate::unit::Unit;

pub use choice::{ExtensionChoice, Stage};
pub use pass::{Passed, apply};
pub use run::Integral;

use run::Scene;

/// What conditioning made of one channel: the only input of metrics and reports.
#[derive(Debug, Clone)]
pub struct Outcome {
    /// The conditioned samples, in `unit`.
    pub output: Vec<f64>,
    /// Unit of the output.
    pub unit: Unit,
    /// The ends that were assumed.
    pub ends: Ends,
    /// What was split off before the transform.
    pub baseline: Baseline,
    /// How wide the fits at the ends were allowed to be.
    pub scale: Scale,
    /// Relative energy difference between remainder and coefficients in the first pass: rounding only.
    pub parseval: f64,
    /// What the end conditions made of an integral; `None` without one.
    pub integral: Option<Integral>,
}

/// The fit widths for a record of `len` samples under a chain.
pub fn scale_of(chain: &Chain, len: usize) -> Scale {
    match chain.shortest_wavelength_samples() {
        Some(shortest_wavelength) => {
            let zone = chain.reaches().reach.samples().map_or(len, |reach| reach.ceil() as usize).min(len / 4).max(4);
            Scale { shortest_wavelength, zone }
        }
        None => Scale::assumed(len),
    }
}

/// The baseline that goes with ends and chain when none is asked for: `level` at the odd end of mixed ends, `tangents` for
/// integrals and derivatives with even ends (their kink is what an even extension adds), otherwise none.
pub fn default_baseline(ends: Ends, chain: &Chain) -> BaselineKind {
    match ends {
        Ends::Mirror { left, right, .. } if left != right => BaselineKind::Level(None),
        Ends::Mirror { left: Parity::Even, .. } if chain.turns() != 0 => BaselineKind::Tangents,
        _ => BaselineKind::None,
    }
}

/// Conditions one channel under the given ends and baseline.
///
/// The first pass runs under `ends` after the baseline is split off. Where the chain has a second pass (a high-pass after
/// an integral), that runs on the result under even reflection without a baseline: a high-pass on the acceleration would
/// have to cancel large low-frequency parts that 1/omega has blown up.
///
/// # Errors
/// `Usage` for a baseline that needs a side and has none.
pub fn condition(
    channel: Channel<'_>,
    chain: &Chain,
    ends: Ends,
    baseline: BaselineKind,
    planner: &Planner,
) -> Result<Outcome> {
    let scale = scale_of(chain, channel.samples.len());
    let baseline = Baseline::fit(baseline, channel.samples, ends, scale)?;
    condition_with(channel, chain, ends, baseline, scale, planner)
}

/// As `condition`, with a baseline that is already known.
///
/// # Errors
/// As `condition`.
pub fn condition_with(
    channel: Channel<'_>,
    chain: &Chain,
    ends: Ends,
    baseline: Baseline,
    scale: Scale,
    planner: &Planner,
) -> Result<Outcome> {
    let scene = Scene::of(channel, chain, ends, planner)?;
    let span = [0.0, ends.length(channel.samples.len())];
    let ran = run::passes(&scene, channel.samples, ends, &baseline, span)?;
    Ok(Outcome {
        output: ran.output,
        unit: scene.unit,
        ends,
        baseline,
        scale,
        parseval: ran.parseval,
        integral: ran.integral,
    })
}

/// Conditions a channel that is continued past both ends by given samples, counted outwards, and evenly beyond them.
///
/// The continued record runs through the whole chain under even reflection, with the baseline that goes with it, and the
/// channel's own samples are cut out again. End conditions of an integral hold at the channel's own ends.
///
/// # Errors
/// As `condition`.
pub fn condition_continued(
    channel: Channel<'_>,
    chain: &Chain,
    left: &[f64],
    right: &[f64],
    seat: Seat,
    planner: &Planner,
) -> Result<Outcome> {
    let ends = Ends::EVEN.seated(seat);
    let continued: Vec<f64> = left.iter().rev().chain(channel.samples).chain(right).copied().collect();
    let scale = scale_of(chain, continued.len());
    let baseline = Baseline::fit(default_baseline(ends, chain), &continued, ends, scale)?;
    let scene = Scene::of(channel, chain, ends, planner)?;
    let (start, len) = (left.len(), channel.samples.len());
    let ran = run::passes(&scene, &continued, ends, &baseline, own_span(start, len, ends))?;
    let output = own(ran.output, start, len);
    Ok(Outcome { output, unit: scene.unit, ends, baseline, scale, parseval: ran.parseval, integral: ran.integral })
}

/// The record that the integral of `outcome` is the integral of, in the record's unit: filtered, less the offset and drift
/// that the end conditions found, high-passed under even reflection. `past` is the continuation that was used, if any.
///
/// # Errors
/// As `condition`.
pub fn corrected(
    channel: Channel<'_>,
    chain: &Chain,
    outcome: &Outcome,
    past: Option<[&[f64]; 2]>,
    planner: &Planner,
) -> Result<Vec<f64>> {
    let constants = outcome.integral.as_ref().map(|integral| integral.constants).unwrap_or_default();
    let [left, right] = past.unwrap_or([&[], &[]]);
    let continued: Vec<f64> = left.iter().rev().chain(channel.samples).chain(right).copied().collect();
    let (start, len) = (left.len(), channel.samples.len());
    let span = own_span(start, len, outcome.ends);
    let all = run::corrected(chain, &continued, outcome.ends, &outcome.baseline, span, constants, planner)?;
    Ok(own(all, start, len))
}

/// The stretch of `len` samples from sample `start` on between mirrors of its own, in steps from the left mirror.
fn own_span(start: usize, len: usize, ends: Ends) -> [f64; 2] {
    [start as f64, start as f64 + ends.length(len)]
}

/// `len` samples from sample `start` on.
fn own(mut all: Vec<f64>, start: usize, len: usize) -> Vec<f64> {
    all.truncate(start + len);
    all.drain(..start);
    all
}

/// Unit of the output, and the factor that brings numbers formed in steps into it.
pub fn scaling(channel: Channel<'_>, chain: &Chain) -> (Unit, f64) {
    let turns = chain.turns();
    let (unit, factor) = channel.unit.turned(turns, channel.axis.unit());
    (unit, channel.axis.step_base().powi(-turns) * factor)
}

