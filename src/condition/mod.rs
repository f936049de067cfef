//! The main job: a channel, its assumed continuation and a chain of operators make a conditioned channel.

mod blocks;
mod choice;
mod despike;
mod pass;
mod run;
mod smoother;

use crate::baseline::{Baseline, BaselineKind, Scale};
use crate::basis::Planner;
use crate::ends::{Ends, Parity, Seat};
use crate::error::Result;
use crate::operator::Chain;
use crate::record::Channel;
use crate::unit::Unit;

pub use blocks::Layout;
pub use choice::{ExtensionChoice, Stage};
pub use despike::{Despiked, despike};
pub use pass::{Passed, Span, apply, apply_whole};
pub use run::Integral;
pub use smoother::{Robust, Smoother, Validated, bridged, freedom};

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
    /// Samples that robust smoothing gave no weight, continuation included; `None` without it.
    pub outliers: Option<usize>,
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
/// integrals and derivatives with even ends and `slopes` for resampling (their kink is what an even extension adds),
/// otherwise none.
pub fn default_baseline(ends: Ends, chain: &Chain) -> BaselineKind {
    match ends {
        Ends::Mirror { left, right, .. } if left != right => BaselineKind::Level(None),
        Ends::Mirror { left: Parity::Even, .. } if chain.turns() != 0 => BaselineKind::Tangents,
        Ends::Mirror { left: Parity::Even, .. } if chain.treatments().resampling.is_some() => BaselineKind::Slopes,
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
    let baseline = fitted(baseline, channel.samples, chain, ends, scale, planner)?;
    condition_with(channel, chain, ends, baseline, scale, planner)
}

/// The baseline of a run. The end slopes that resampling needs are those of the band that is kept: a strong tone above it
/// would tilt them, so they are measured after its low-pass.
fn fitted(
    kind: BaselineKind,
    samples: &[f64],
    chain: &Chain,
    ends: Ends,
    scale: Scale,
    planner: &Planner,
) -> Result<Baseline> {
    let resamples = chain.treatments().resampling.is_some();
    if !(resamples && kind == BaselineKind::Slopes && chain.turns() == 0 && chain.is_real()) {
        return Baseline::fit(kind, samples, ends, scale);
    }
    let nothing = Baseline::fit(BaselineKind::None, samples, ends, scale)?;
    let own = chain.on_own_grid();
    let scene = Scene { chain: &own, unit: Unit::unknown(), factor: 1.0, resolved: None, scale, planner };
    let kept = run::passes(&scene, samples, ends, &nothing, Span::whole(samples))?;
    let found = Baseline::fit(kind, &kept.output, ends, scale)?;
    Ok(Baseline::exact(kind, found.polynomial().clone()))
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
    let scene = Scene::of(channel, chain, ends, scale, planner)?;
    let ran = run::passes(&scene, channel.samples, ends, &baseline, Span::whole(channel.samples))?;
    Ok(ran.outcome(scene.unit, ends, baseline, scale))
}

/// What a continued record itself is conditioned under: even reflection, with the baseline that goes with it.
pub fn beyond(seat: Seat, chain: &Chain) -> (Ends, BaselineKind) {
    let ends = Ends::EVEN.seated(seat);
    (ends, default_baseline(ends, chain))
}

/// Conditions a channel that is continued past both ends by given samples, counted outwards, and evenly beyond them.
///
/// The continued record runs through the whole chain as `beyond` says, and the channel's own samples are cut out again. End
/// conditions of an integral hold at the channel's own ends.
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
    let (ends, kind) = beyond(seat, chain);
    let continued: Vec<f64> = left.iter().rev().chain(channel.samples).chain(right).copied().collect();
    let scale = scale_of(chain, continued.len());
    let baseline = fitted(kind, &continued, chain, ends, scale, planner)?;
    let scene = Scene::of(channel, chain, ends, scale, planner)?;
    let span = Span { lead: left.len(), len: channel.samples.len() };
    let mut ran = run::passes(&scene, &continued, ends, &baseline, span)?;
    if chain.treatments().resampling.is_none() {
        ran.output = own(ran.output, span);
    }
    Ok(ran.outcome(scene.unit, ends, baseline, scale))
}

/// The record that the integral of `outcome` is the integral of, in the record's unit: filtered, less the offset and drift
/// that the end conditions found, high-passed under even reflection. `past` is the continuation that was used, if any.
/// For chains that keep the record's own rate.
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
    let span = Span { lead: left.len(), len: channel.samples.len() };
    let scene = Scene::of(channel, chain, outcome.ends, outcome.scale, planner)?;
    let all = run::corrected(&scene, &continued, outcome.ends, &outcome.baseline, span, constants)?;
    Ok(own(all, span))
}

/// The channel's own samples.
fn own(mut all: Vec<f64>, span: Span) -> Vec<f64> {
    all.truncate(span.lead + span.len);
    all.drain(..span.lead);
    all
}

/// Unit of the output, and the factor that brings numbers formed in steps into it.
pub fn scaling(channel: Channel<'_>, chain: &Chain) -> (Unit, f64) {
    let turns = chain.turns();
    let (unit, factor) = channel.unit.turned(turns, channel.axis.unit());
    (unit, channel.axis.step_base().powi(-turns) * factor)
}
