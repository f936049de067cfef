//! The main job: a channel, its assumed continuation and a chain of operators make a conditioned channel.

mod choice;
mod despike;
mod pass;
mod smoother;

use crate::baseline::{Baseline, BaselineKind, Scale};
use crate::basis::Planner;
use crate::ends::{Ends, Parity, Seat};
use crate::error::Result;
use crate::operator::{Chain, PassEnds};
use crate::record::Channel;
use crate::unit::Unit;

pub use choice::{ExtensionChoice, Stage};
pub use despike::{Despiked, despike};
pub use pass::{Passed, apply};
pub use smoother::{Robust, Smoother, Validated, bridged, freedom};

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

/// The baseline that goes with ends and chain when none is asked for: `level` at the odd end of mixed ends, `slopes` for
/// integrals, derivatives and resampling with even ends (their kink is what an even extension adds), otherwise none.
pub fn default_baseline(ends: Ends, chain: &Chain) -> BaselineKind {
    match ends {
        Ends::Mirror { left, right, .. } if left != right => BaselineKind::Level(None),
        Ends::Mirror { left: Parity::Even, .. } if chain.turns() != 0 || chain.treatments().resampling.is_some() => {
            BaselineKind::Slopes
        }
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
    let (kept, _) = run(samples, &chain.on_own_grid(), ends, &nothing, scale, 0, 1.0, planner)?;
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
    let (unit, factor) = scaling(channel, chain);
    let (Passed { output, parseval }, outliers) =
        run(channel.samples, chain, ends, &baseline, scale, 0, factor, planner)?;
    Ok(Outcome { output, unit, ends, baseline, scale, parseval, outliers })
}

/// Conditions a channel that is continued past both ends by given samples, counted outwards, and evenly beyond them.
///
/// The continued record runs through the whole chain under even reflection, with the baseline that goes with it, and the
/// channel's own samples are cut out again. Integrals start at rest at the channel's own left end.
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
    let baseline = fitted(default_baseline(ends, chain), &continued, chain, ends, scale, planner)?;
    let (unit, factor) = scaling(channel, chain);
    let lead = left.len();
    let (Passed { mut output, parseval }, outliers) =
        run(&continued, chain, ends, &baseline, scale, lead, factor, planner)?;
    if chain.treatments().resampling.is_none() {
        output.truncate(lead + channel.samples.len());
        output.drain(..lead);
    }
    Ok(Outcome { output, unit, ends, baseline, scale, parseval, outliers })
}

/// Unit of the output, and the factor that brings numbers formed in steps into it.
pub fn scaling(channel: Channel<'_>, chain: &Chain) -> (Unit, f64) {
    let turns = chain.turns();
    let (unit, factor) = channel.unit.turned(turns, channel.axis.unit());
    (unit, channel.axis.step_base().powi(-turns) * factor)
}

/// All passes of a chain: the output with the Parseval check of the first, and the samples that robust smoothing gave no
/// weight.
#[expect(clippy::too_many_arguments, reason = "what a run is made of, in one place")]
fn run(
    samples: &[f64],
    chain: &Chain,
    ends: Ends,
    baseline: &Baseline,
    scale: Scale,
    lead: usize,
    factor: f64,
    planner: &Planner,
) -> Result<(Passed, Option<usize>)> {
    let mut so_far: Option<Passed> = None;
    let mut outliers = None;
    for pass in chain.passes().iter().filter(|pass| !pass.is_identity()) {
        let input = so_far.as_ref().map_or(samples, |passed| passed.output.as_slice());
        let (ends, baseline) = match pass.ends() {
            PassEnds::Chosen if so_far.is_none() => (ends, baseline.clone()),
            PassEnds::Chosen => (ends, Baseline::fit(baseline.kind(), input, ends, scale)?),
            PassEnds::EvenWithoutBaseline => {
                let even = Ends::EVEN.seated(ends.seat());
                (even, Baseline::fit(BaselineKind::None, input, even, Scale::assumed(input.len()))?)
            }
        };
        let mut passed = match pass.robust() {
            Some(strength) => {
                let (passed, count) = robust(input, ends, &baseline, strength, planner)?;
                outliers = Some(count);
                passed
            }
            None => apply(input, ends, &baseline, pass, lead, planner)?,
        };
        if pass.turns() != 0 && factor != 1.0 {
            passed.output.iter_mut().for_each(|v| *v *= factor);
        }
        passed.parseval = so_far.map_or(passed.parseval, |first| first.parseval);
        so_far = Some(passed);
    }
    let unchanged = || Passed { output: samples.to_vec(), parseval: 0.0 };
    Ok((so_far.unwrap_or_else(unchanged), outliers))
}

/// Robust smoothing of what a baseline leaves.
fn robust(
    samples: &[f64],
    ends: Ends,
    baseline: &Baseline,
    strength: f64,
    planner: &Planner,
) -> Result<(Passed, usize)> {
    let at = |n: usize| baseline.polynomial().at(n as f64 + ends.first_position());
    let rest: Vec<f64> = samples.iter().enumerate().map(|(n, v)| v - at(n)).collect();
    let Robust { values, weights, .. } = Smoother::new(planner, ends, samples.len(), 2)?.robust(&rest, Some(strength));
    let output = values.iter().enumerate().map(|(n, v)| v + at(n)).collect();
    Ok((Passed { output, parseval: 0.0 }, weights.iter().filter(|w| **w == 0.0).count()))
}
