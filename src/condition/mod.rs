//! The main job: a channel, its assumed continuation and a chain of operators make a conditioned channel.

mod choice;
mod pass;

use crate::baseline::{Baseline, BaselineKind, Scale};
use crate::basis::Planner;
use crate::ends::{Ends, Parity};
use crate::error::Result;
use crate::operator::Chain;
use crate::record::Channel;
use crate::unit::Unit;

pub use choice::{ExtensionChoice, Stage};
pub use pass::{Passed, apply};

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
    let turns = chain.turns();
    let (unit, unit_factor) = channel.unit.turned(turns, channel.axis.unit());
    let mut parseval = 0.0;
    let mut output: Option<Vec<f64>> = None;
    for (index, pass) in chain.passes().iter().enumerate() {
        let passed = match &output {
            None => {
                let passed = apply(channel.samples, ends, &baseline, pass, planner)?;
                parseval = passed.parseval;
                passed
            }
            Some(so_far) => {
                let even = Ends::EVEN.seated(ends.seat());
                let nothing = Baseline::fit(BaselineKind::None, so_far, even, scale)?;
                apply(so_far, even, &nothing, pass, planner)?
            }
        };
        let factor = if index == 0 { channel.axis.step_base().powi(-turns) * unit_factor } else { 1.0 };
        let mut samples = passed.output;
        if factor != 1.0 {
            samples.iter_mut().for_each(|v| *v *= factor);
        }
        output = Some(samples);
    }
    let output = output.unwrap_or_else(|| channel.samples.to_vec());
    Ok(Outcome { output, unit, ends, baseline, scale, parseval })
}
