//! The main job: a channel, its assumed continuation and a chain of operators make a conditioned channel.

mod blocks;
mod choice;
mod pass;

use crate::baseline::{Baseline, BaselineKind, Scale};
use crate::basis::Planner;
use crate::ends::{Ends, Parity, Seat};
use crate::error::Result;
use crate::operator::Chain;
use crate::record::Channel;
use crate::unit::Unit;

pub use blocks::Layout;
pub use choice::{ExtensionChoice, Stage};
pub use pass::{Passed, apply, apply_whole};

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
/// integrals and derivatives with even ends (their kink is what an even extension adds), otherwise none.
pub fn default_baseline(ends: Ends, chain: &Chain) -> BaselineKind {
    match ends {
        Ends::Mirror { left, right, .. } if left != right => BaselineKind::Level(None),
        Ends::Mirror { left: Parity::Even, .. } if chain.turns() != 0 => BaselineKind::Slopes,
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
    let (unit, factor) = scaling(channel, chain);
    let (output, parseval) = run(channel.samples, chain, ends, &baseline, 0.0, factor, planner)?;
    Ok(Outcome { output, unit, ends, baseline, scale, parseval })
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
    let baseline = Baseline::fit(default_baseline(ends, chain), &continued, ends, scale)?;
    let (unit, factor) = scaling(channel, chain);
    let rest = left.len() as f64;
    let (mut output, parseval) = run(&continued, chain, ends, &baseline, rest, factor, planner)?;
    output.truncate(left.len() + channel.samples.len());
    output.drain(..left.len());
    Ok(Outcome { output, unit, ends, baseline, scale, parseval })
}

/// Unit of the output, and the factor that brings numbers formed in steps into it.
pub fn scaling(channel: Channel<'_>, chain: &Chain) -> (Unit, f64) {
    let turns = chain.turns();
    let (unit, factor) = channel.unit.turned(turns, channel.axis.unit());
    (unit, channel.axis.step_base().powi(-turns) * factor)
}

/// All passes of a chain; the output and the Parseval check of the first.
fn run(
    samples: &[f64],
    chain: &Chain,
    ends: Ends,
    baseline: &Baseline,
    rest: f64,
    factor: f64,
    planner: &Planner,
) -> Result<(Vec<f64>, f64)> {
    let mut parseval = 0.0;
    let mut output: Option<Vec<f64>> = None;
    for pass in chain.passes().iter().filter(|pass| !pass.is_identity()) {
        let passed = match &output {
            None => {
                let mut passed = apply(samples, ends, baseline, pass, rest, planner)?;
                parseval = passed.parseval;
                if factor != 1.0 {
                    passed.output.iter_mut().for_each(|v| *v *= factor);
                }
                passed
            }
            Some(so_far) => {
                let even = Ends::EVEN.seated(ends.seat());
                let nothing = Baseline::fit(BaselineKind::None, so_far, even, Scale::assumed(so_far.len()))?;
                apply(so_far, even, &nothing, pass, rest, planner)?
            }
        };
        output = Some(passed.output);
    }
    Ok((output.unwrap_or_else(|| samples.to_vec()), parseval))
}
