//! What a channel needs before its ends are judged: spikes out, and the strength of its smoothing found.

use std::borrow::Cow;

use crate::basis::Planner;
use crate::condition::{self, Smoother};
use crate::ends::Ends;
use crate::error::{Finding, Result};
use crate::numeric::sum;
use crate::operator::{Chain, Strength, cut_off};
use crate::place::Place;
use crate::record::Channel;
use crate::report::{DespikeReport, SmoothReport, StrengthSource};

/// A channel's samples and chain, ready to be judged.
pub struct Prepared<'a> {
    pub samples: Cow<'a, [f64]>,
    pub chain: Cow<'a, Chain>,
    pub despiked: Option<DespikeReport>,
    pub smoothing: Option<SmoothReport>,
    pub notes: Vec<Finding>,
}

/// Residuals of neighbours correlated more than this are no white noise.
const CORRELATED: f64 = 0.3;

/// Prepares a channel.
///
/// # Errors
/// As the steps of the chain before smoothing.
pub fn prepare<'a>(channel: Channel<'a>, chain: &'a Chain, planner: &Planner) -> Result<Prepared<'a>> {
    let mut prepared = Prepared {
        samples: Cow::Borrowed(channel.samples),
        chain: Cow::Borrowed(chain),
        despiked: None,
        smoothing: None,
        notes: Vec::new(),
    };
    if chain.treatments().despike {
        despike(channel, &mut prepared)?;
    }
    let Some(smoothing) = chain.treatments().smoothing else { return Ok(prepared) };
    let (strength, how) = match smoothing.strength {
        Strength::Given(strength) => (strength, StrengthSource::Given),
        Strength::Auto => {
            let strength = validated(channel, smoothing.robust, &mut prepared, planner)?;
            prepared.chain = Cow::Owned(chain.with_strength(strength));
            (strength, StrengthSource::CrossValidation)
        }
    };
    prepared.smoothing = Some(SmoothReport {
        strength,
        how,
        cut_off: cut_off(strength).map(|cycles| cycles * channel.axis.rate_base()),
        cut_off_samples: cut_off(strength).map(f64::recip),
        degrees_of_freedom: condition::freedom(Ends::EVEN, channel.samples.len(), strength),
        robust: smoothing.robust,
        outliers: None,
    });
    Ok(prepared)
}

fn despike(channel: Channel<'_>, prepared: &mut Prepared<'_>) -> Result<()> {
    let place = || Place::channel(channel.name);
    let report = match condition::despike(channel.samples).map_err(|error| error.at(place()))? {
        None => DespikeReport { count: 0, samples: Vec::new(), largest: None, how: None },
        Some(found) => {
            let text = format!("{} spikes replaced by the {}", found.spikes.len(), found.how);
            let first = Place { sample: found.spikes.first().map(|n| *n as u64), ..place() };
            prepared.notes.push(Finding::new("despiked", text).at(first));
            prepared.samples = Cow::Owned(found.samples);
            DespikeReport {
                count: found.spikes.len(),
                samples: found.spikes,
                largest: Some(found.largest),
                how: Some(found.how),
            }
        }
    };
    prepared.despiked = Some(report);
    Ok(())
}

/// The strength by cross-validation of what the chain makes of the channel before smoothing, between even ends.
fn validated(channel: Channel<'_>, robust: bool, prepared: &mut Prepared<'_>, planner: &Planner) -> Result<f64> {
    let before = prepared.chain.before_smoothing();
    let channel = Channel { samples: &prepared.samples, ..channel };
    let kind = condition::default_baseline(Ends::EVEN, &before);
    let output = if before.is_identity() {
        prepared.samples.to_vec()
    } else {
        condition::condition(channel, &before, Ends::EVEN, kind, planner)?.output
    };
    // The kink that even ends would give a slope is no part of the noise.
    let scale = crate::baseline::Scale::assumed(output.len());
    let slopes = crate::baseline::Baseline::fit(crate::baseline::BaselineKind::Slopes, &output, Ends::EVEN, scale)?;
    let at = |n: usize| slopes.polynomial().at(n as f64 + Ends::EVEN.first_position());
    let rest: Vec<f64> = output.iter().enumerate().map(|(n, v)| v - at(n)).collect();
    let smoother = Smoother::new(planner, Ends::EVEN, rest.len(), 2)?;
    let place = || Place::channel(channel.name);
    if robust {
        return Ok(smoother.robust(&rest, None).strength);
    }
    let found = smoother.validated(&rest);
    if found.at_weakest {
        let text = "cross-validation finds no white noise to smooth: the weakest strength is taken";
        prepared.notes.push(Finding::new("smooth_no_noise", text).at(place()));
        return Ok(found.strength);
    }
    let residual: Vec<f64> = smoother.smooth(&rest, found.strength).iter().zip(&rest).map(|(z, y)| y - z).collect();
    let correlation = neighbours(&residual);
    if correlation > CORRELATED {
        let text = format!(
            "residuals of neighbouring samples are correlated by {correlation:.2}: cross-validation takes noise for white, and \
             here smooths too little or too much; give --smooth a strength or a corner"
        );
        prepared.notes.push(Finding::new("smooth_coloured", text).at(place()));
    }
    Ok(found.strength)
}

/// Correlation of neighbours.
fn neighbours(values: &[f64]) -> f64 {
    let power = sum::sum_of_squares(values);
    let product: f64 = values.windows(2).map(|pair| pair[0] * pair[1]).sum();
    if power > 0.0 { product / power } else { 0.0 }
}
