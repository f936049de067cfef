//! What a channel needs before its ends are judged: spikes out, and the strength of its smoothing found.

use std::borrow::Cow;

use crate::baseline::{Baseline, BaselineKind, Scale};
use crate::basis::Planner;
use crate::condition::{self, Smoother};
use crate::ends::Ends;
use crate::error::{Error, Finding, Result};
use crate::numeric::sum;
use crate::operator::{Chain, Smoothing, Strength, cut_off};
use crate::place::Place;
use crate::record::Channel;
use crate::regularise::Gaps;
use crate::report::{DespikeReport, SmoothReport, StrengthSource};
use crate::settings::Settings;

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
/// Spikes listed by place.
const LISTED: usize = 1000;

/// Gaps that are left to smoothing need some.
///
/// # Errors
/// `Usage` for `--gaps smooth` without `--smooth`.
pub fn check(chain: &Chain, settings: &Settings) -> Result<()> {
    if settings.regularise.gaps == Gaps::Smooth && chain.treatments().smoothing.is_none() {
        return Err(Error::usage("--gaps smooth leaves missing samples to --smooth, which is not given")
            .remedy("add --smooth auto, or use --gaps fill"));
    }
    Ok(())
}

/// Prepares a channel, of which the samples `missing` are held by straight lines.
///
/// # Errors
/// As the steps of the chain before smoothing.
pub fn prepare<'a>(
    channel: Channel<'a>,
    missing: &[usize],
    chain: &'a Chain,
    settings: &Settings,
    planner: &Planner,
) -> Result<Prepared<'a>> {
    let kind = match settings.stage.baseline {
        // Level at the odd end: these are even ends.
        None | Some(BaselineKind::Level(_)) => BaselineKind::Slopes,
        Some(kind) => kind,
    };
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
    let given = match smoothing.strength {
        Strength::Given(strength) => Some(strength),
        Strength::Auto => None,
    };
    let strength = if !missing.is_empty() {
        bridge(channel, missing, (smoothing, given), kind, &mut prepared, planner)?
    } else if let Some(strength) = given {
        strength
    } else {
        validated(channel, smoothing.robust, kind, &mut prepared, planner)?
    };
    let how = if given.is_some() { StrengthSource::Given } else { StrengthSource::CrossValidation };
    if given.is_none() {
        prepared.chain = Cow::Owned(chain.with_strength(strength));
    }
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
                samples: found.spikes.into_iter().take(LISTED).collect(),
                largest: Some(found.largest),
                how: Some(found.how),
            }
        }
    };
    prepared.despiked = Some(report);
    Ok(())
}

/// Puts the fit without the missing samples in their places, and gives the strength it was made with. A record so completed
/// is smoothed to that same fit, since at the least sum what has no weight has no residual.
fn bridge(
    channel: Channel<'_>,
    missing: &[usize],
    (smoothing, given): (Smoothing, Option<f64>),
    kind: BaselineKind,
    prepared: &mut Prepared<'_>,
    planner: &Planner,
) -> Result<f64> {
    let len = prepared.samples.len();
    let (smoother, split, rest) = levelled(&prepared.samples, kind, planner)?;
    let mut weights = vec![1.0; len];
    missing.iter().for_each(|&n| weights[n] = 0.0);
    let (strength, fit) = match given {
        _ if smoothing.robust => {
            let found = smoother.robust(&rest, Some(&weights), given);
            (found.strength, found.values)
        }
        Some(strength) => {
            (strength, smoother.weighted(&rest, &weights, strength, &condition::bridged(&rest, &weights)))
        }
        None => {
            let (found, fit) = smoother.weighted_validated(&rest, &weights, None);
            (found.strength, fit)
        }
    };
    let samples = prepared.samples.to_mut();
    for &n in missing {
        samples[n] = fit[n] + split(n);
    }
    let share = missing.len() as f64 / len as f64;
    let mut text = format!("{} missing samples bridged by smoothing", missing.len());
    if share > 0.05 {
        text += &format!(": {:.1} % of the record", 100.0 * share);
    }
    prepared.notes.push(Finding::new("bridged", text).at(Place::channel(channel.name)));
    Ok(strength)
}

/// A smoother between even ends, the baseline and what it leaves: by default that of the end slopes, since the kink that even
/// ends would give a slope is no part of the noise.
fn levelled(
    samples: &[f64],
    kind: BaselineKind,
    planner: &Planner,
) -> Result<(Smoother, impl Fn(usize) -> f64 + use<>, Vec<f64>)> {
    let ends = Ends::EVEN;
    let baseline = Baseline::fit(kind, samples, ends, Scale::assumed(samples.len()))?;
    let split = baseline.polynomial().clone();
    let at = move |n: usize| split.at(n as f64 + ends.first_position());
    let rest = samples.iter().enumerate().map(|(n, v)| v - at(n)).collect();
    Ok((Smoother::new(planner, ends, samples.len(), 2)?, at, rest))
}

/// The strength by cross-validation of what the chain makes of the channel before smoothing, between even ends.
fn validated(
    channel: Channel<'_>,
    robust: bool,
    kind: BaselineKind,
    prepared: &mut Prepared<'_>,
    planner: &Planner,
) -> Result<f64> {
    let before = prepared.chain.before_smoothing();
    let channel = Channel { samples: &prepared.samples, ..channel };
    let before_kind = condition::default_baseline(Ends::EVEN, &before);
    let output = if before.is_identity() {
        prepared.samples.to_vec()
    } else {
        condition::condition(channel, &before, Ends::EVEN, before_kind, planner)?.output
    };
    let (smoother, _, rest) = levelled(&output, kind, planner)?;
    let place = || Place::channel(channel.name);
    if robust {
        return Ok(smoother.robust(&rest, None, None).strength);
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
