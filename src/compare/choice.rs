//! From what was asked, asserted and judged to the continuation that a run takes.

use serde::Serialize;

use crate::baseline::{BaselineKind, Side, Tangent};
use crate::compare::{Assertion, Judgement, Property};
use crate::condition::{ExtensionChoice, Stage, default_baseline};
use crate::ends::{Ends, Parity};
use crate::error::{Error, Result};
use crate::numeric::{noise, sum};
use crate::operator::Chain;
use crate::verdict::{Auto, CANDIDATES};

/// The continuation of a run.
#[derive(Debug, Clone, PartialEq)]
pub enum Continuation {
    /// A symmetric one, with the baseline that is split off first.
    Symmetric(Ends, BaselineKind),
    /// Samples past each end, counted outwards; even beyond them.
    Given([Vec<f64>; 2]),
}

/// What a run takes, and who chose it.
#[derive(Debug, Clone, PartialEq)]
pub struct Chosen {
    /// `even`, `periodic`, `forecast` and so on.
    pub name: String,
    /// The continuation.
    pub continuation: Continuation,
    /// Who chose it.
    pub how: How,
}

/// Who made a choice.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Serialize)]
#[serde(rename_all = "snake_case")]
pub enum How {
    /// The user, by name.
    Asked,
    /// The user, by asserting what the ends are.
    Asserted,
    /// The verdict on this record and chain.
    Verdict,
    /// A default: not a finding about the record.
    Default,
}

/// Chooses the continuation of one channel.
///
/// # Errors
/// `Usage` for a baseline together with a choice that brings its own, and for assertions beside a named extension.
pub fn choose(
    samples: &[f64],
    chain: &Chain,
    stage: &Stage,
    assertion: &Assertion,
    judgement: Option<&Judgement>,
) -> Result<Chosen> {
    let named = |ends: Ends, how: How| {
        let ends = ends.seated(stage.seat);
        // Odd ends of a derivative continue the record about its end values, never about zero.
        let odd_derivative = chain.turns() > 0 && how == How::Default && ends.name() == "odd";
        let own = || if odd_derivative { BaselineKind::Line } else { default_baseline(ends, chain) };
        let baseline = stage.baseline.unwrap_or_else(own);
        Chosen { name: ends.name().to_owned(), continuation: Continuation::Symmetric(ends, baseline), how }
    };
    if let ExtensionChoice::Fixed(ends) = stage.extension {
        if !assertion.is_empty() {
            return Err(Error::usage("--assert and a named --extension both choose the ends").remedy("leave one out"));
        }
        return Ok(named(ends, How::Asked));
    }
    if !assertion.is_empty() {
        return asserted(samples, assertion, judgement, named);
    }
    if stage.baseline.is_some() {
        return Err(Error::usage(format!("--extension {} brings its own baseline", stage.extension))
            .remedy("leave --baseline out, or name the extension"));
    }
    let fallback = || named(derivative_ends(samples, chain), How::Default);
    let Some(judgement) = judgement else { return Ok(fallback()) };
    let forecast = |how: How| match &judgement.forecast {
        Some(ends) => Chosen { name: "forecast".to_owned(), continuation: Continuation::Given(ends.clone()), how },
        None => fallback(),
    };
    let Some(verdict) = judgement.verdict.as_ref().filter(|verdict| !verdict.edges.is_empty()) else {
        return Ok(fallback());
    };
    Ok(match stage.extension {
        ExtensionChoice::Forecast => forecast(How::Asked),
        ExtensionChoice::Symmetric => match CANDIDATES.iter().find(|candidate| candidate.name == verdict.pick.name) {
            Some(candidate) => Chosen {
                name: candidate.name.to_owned(),
                continuation: Continuation::Symmetric(candidate.ends.seated(stage.seat), candidate.baseline),
                how: How::Verdict,
            },
            None => fallback(),
        },
        _ => match verdict.auto {
            Auto::Forecast => forecast(How::Verdict),
            Auto::Periodic => named(Ends::Periodic, How::Verdict),
            Auto::Even => named(Ends::EVEN, How::Verdict),
        },
    })
}

/// The default ends of a chain without a verdict: even, which for a derivative needs the slopes at the ends; where noise
/// hides those, odd about the end values.
///
/// Even reflection about the parabola with the end slopes is the better one while the slopes are known to a fifth of the
/// record's own RMS slope, measured on tones with noise of 0, 0.2 and 2 % of their RMS.
fn derivative_ends(samples: &[f64], chain: &Chain) -> Ends {
    if chain.turns() <= 0 {
        return Ends::EVEN;
    }
    let noise = noise::sigma(samples);
    let [left, right] = Tangent::both(samples, Ends::EVEN, noise);
    let steps: Vec<f64> = samples.windows(2).map(|pair| pair[1] - pair[0]).collect();
    // White noise adds 2 sigma^2 to the mean square of first differences.
    let slope = (sum::rms(&steps).powi(2) - 2.0 * noise * noise).max(0.0).sqrt();
    if left.error.max(right.error) <= 0.2 * slope { Ends::EVEN } else { Ends::ODD }
}

/// Both ends asserted give a basis; one asserted end is reflected, and the forecast continues the other.
fn asserted(
    samples: &[f64],
    assertion: &Assertion,
    judgement: Option<&Judgement>,
    named: impl Fn(Ends, How) -> Chosen,
) -> Result<Chosen> {
    if assertion.left == Some(Property::Closed) {
        return Ok(named(Ends::Periodic, How::Asserted));
    }
    let parities = [assertion.left, assertion.right].map(|property| property.and_then(Property::parity));
    if let [Some(left), Some(right)] = parities {
        let mut chosen = named(Ends::mirror(left, right, crate::ends::Seat::Half), How::Asserted);
        // The assertion is about the record itself: nothing is split off before the reflection.
        if let Continuation::Symmetric(ends, BaselineKind::Level(None)) = chosen.continuation {
            chosen.continuation = Continuation::Symmetric(ends, BaselineKind::None);
        }
        return Ok(chosen);
    }
    let Some(forecast) = judgement.and_then(|j| j.forecast.as_ref()) else {
        return Err(Error::unsupported("one end is asserted, and nothing could be judged about the other")
            .remedy("assert both ends, or name an extension"));
    };
    let reach = forecast[0].len().max(forecast[1].len());
    let reflected = |parity: Parity, side: Side| -> Vec<f64> {
        let sign = if parity == Parity::Odd { -1.0 } else { 1.0 };
        let inwards: Box<dyn Iterator<Item = &f64>> = match side {
            Side::Left => Box::new(samples.iter()),
            Side::Right => Box::new(samples.iter().rev()),
        };
        inwards.take(reach).map(|v| sign * v).collect()
    };
    let left = parities[0].map_or_else(|| forecast[0].clone(), |parity| reflected(parity, Side::Left));
    let right = parities[1].map_or_else(|| forecast[1].clone(), |parity| reflected(parity, Side::Right));
    Ok(Chosen {
        name: match assertion.left {
            Some(_) => format!("{assertion}/forecast"),
            None => format!("forecast/{assertion}"),
        },
        continuation: Continuation::Given([left, right]),
        how: How::Asserted,
    })
}
