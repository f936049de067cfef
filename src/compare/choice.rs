//! From what was asked, asserted and judged to the continuation that a run takes.

use serde::Serialize;

use crate::baseline::{BaselineKind, Side, Tangent};
use crate::compare::{Assertion, Judgement, Property, unjudged_chain};
use crate::condition::{ExtensionChoice, Stage, default_baseline};
use crate::ends::{Ends, Parity, Seat};
use crate::error::{Error, Result};
use crate::numeric::{noise, sum};
use crate::operator::Chain;
use crate::verdict::{Auto, CANDIDATES, Unjudged};

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

/// Refuses a stage that contradicts itself or the chain; no record is needed to tell.
///
/// # Errors
/// `Usage` for assertions beside an extension, for a baseline that would have no effect, and for an extension that rests on
/// a verdict under operators that allow none.
pub fn refuse_contradictions(stage: &Stage, assertion: &Assertion, chain: &Chain) -> Result<()> {
    let extension = stage.extension;
    let is_auto = extension == ExtensionChoice::Auto;
    if !assertion.is_empty() && !is_auto {
        return Err(Error::usage(format!("--assert {assertion} and --extension {extension} both choose the ends"))
            .remedy("leave one out"));
    }
    let one_sided = assertion.left.is_some() != assertion.right.is_some();
    if let Some(baseline) = stage.baseline
        && one_sided
    {
        return Err(Error::usage(format!(
            "--baseline {baseline} has no place beside --assert {assertion}: the forecast continues the other end"
        ))
        .remedy("assert both ends, or leave --baseline out"));
    }
    if let Some(baseline) = stage.baseline
        && assertion.is_empty()
        && !matches!(extension, ExtensionChoice::Fixed(_))
    {
        return Err(Error::usage(format!("--baseline {baseline}: --extension {extension} brings its own"))
            .remedy("leave --baseline out, or name the extension"));
    }
    let rests_on_verdict = matches!(extension, ExtensionChoice::Forecast | ExtensionChoice::Symmetric) || one_sided;
    match unjudged_chain(chain) {
        Some(reason @ (Unjudged::NoCorner | Unjudged::KeepsOffset)) if rests_on_verdict => {
            let option = if one_sided { format!("--assert {assertion}") } else { format!("--extension {extension}") };
            Err(Error::usage(format!("{option} rests on a forecast, and there is none: {reason}")).remedy(
                "add a filter with a corner (--highpass for an integral), assert both ends, or name another extension",
            ))
        }
        _ => Ok(()),
    }
}

/// Chooses the continuation of one channel. Where an extension that rests on a verdict is asked for and the record cannot
/// be judged, even is taken, and `how` says so.
///
/// # Errors
/// Those of `refuse_contradictions`; `Unsupported` for an assertion about one end of a record that cannot be judged.
pub fn choose(
    samples: &[f64],
    chain: &Chain,
    stage: &Stage,
    assertion: &Assertion,
    judgement: Option<&Judgement>,
) -> Result<Chosen> {
    refuse_contradictions(stage, assertion, chain)?;
    let named = |ends: Ends, how: How| {
        let ends = ends.seated(stage.seat);
        // Odd ends of a derivative continue the record about its end values, never about zero.
        let odd_derivative = chain.turns() > 0 && how == How::Default && ends.name() == "odd";
        let own = || if odd_derivative { BaselineKind::Line } else { default_baseline(ends, chain) };
        let baseline = stage.baseline.unwrap_or_else(own);
        Chosen { name: ends.name().to_owned(), continuation: Continuation::Symmetric(ends, baseline), how }
    };
    if let ExtensionChoice::Fixed(ends) = stage.extension {
        return Ok(named(ends, How::Asked));
    }
    if !assertion.is_empty() {
        return asserted(samples, chain, stage, assertion, judgement);
    }
    let default = || named(derivative_ends(samples, chain), How::Default);
    let Some(judgement) = judgement else { return Ok(default()) };
    let forecast = |how: How| match &judgement.forecast {
        Some(ends) => Chosen { name: "forecast".to_owned(), continuation: Continuation::Given(ends.clone()), how },
        None => default(),
    };
    let Some(verdict) = judgement.verdict.as_ref().filter(|verdict| !verdict.edges.is_empty()) else {
        return Ok(default());
    };
    Ok(match stage.extension {
        ExtensionChoice::Forecast => forecast(How::Asked),
        ExtensionChoice::Symmetric => match CANDIDATES.iter().find(|candidate| candidate.name == verdict.pick.name) {
            Some(candidate) => Chosen {
                name: candidate.name.to_owned(),
                continuation: Continuation::Symmetric(candidate.ends.seated(stage.seat), candidate.baseline),
                how: How::Verdict,
            },
            None => default(),
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
    chain: &Chain,
    stage: &Stage,
    assertion: &Assertion,
    judgement: Option<&Judgement>,
) -> Result<Chosen> {
    // The assertion is about the record itself: unless it is asked for, nothing is split off before the reflection.
    let baseline = stage.baseline.unwrap_or(BaselineKind::None);
    let symmetric = |ends: Ends, how: How| Chosen {
        name: ends.name().to_owned(),
        continuation: Continuation::Symmetric(ends, baseline),
        how,
    };
    if assertion.left == Some(Property::Closed) {
        return Ok(symmetric(Ends::Periodic, How::Asserted));
    }
    let parities = [assertion.left, assertion.right].map(|property| property.and_then(Property::parity));
    if let [Some(left), Some(right)] = parities {
        return Ok(symmetric(Ends::mirror(left, right, stage.seat), How::Asserted));
    }
    if chain.is_identity() {
        return Ok(symmetric(Ends::EVEN.seated(stage.seat), How::Default));
    }
    let forecast = match judgement.map(|judgement| (&judgement.forecast, judgement.unjudged)) {
        Some((Some(forecast), _)) => forecast.clone(),
        // A constant goes on as it is.
        Some((None, Some(Unjudged::Constant))) => {
            let reach = chain.reaches().reach.samples().map_or(samples.len(), |reach| reach.ceil() as usize);
            [0, 1].map(|_| vec![samples[0]; reach.max(8).min(samples.len())])
        }
        _ => {
            let reason = judgement.and_then(|j| j.unjudged).map_or(String::new(), |reason| format!(": {reason}"));
            return Err(Error::unsupported(format!(
                "--assert {assertion} leaves the other end to a forecast, and there is none{reason}"
            ))
            .remedy("assert both ends, or name an extension"));
        }
    };
    let reach = forecast[0].len().max(forecast[1].len());
    let [left, right] = forecast;
    let left = parities[0].map_or(left, |parity| reflected(samples, parity, stage.seat, Side::Left, reach));
    let right = parities[1].map_or(right, |parity| reflected(samples, parity, stage.seat, Side::Right, reach));
    Ok(Chosen {
        name: match assertion.left {
            Some(_) => format!("{assertion}/forecast"),
            None => format!("forecast/{assertion}"),
        },
        continuation: Continuation::Given([left, right]),
        how: How::Asserted,
    })
}

/// The samples past one end under a mirror there, counted outwards.
fn reflected(samples: &[f64], parity: Parity, seat: Seat, side: Side, count: usize) -> Vec<f64> {
    let (ends, len) = (Ends::mirror(parity, parity, seat), samples.len());
    let place = |k: usize| match side {
        Side::Left => -1 - k as i64,
        Side::Right => (len + k) as i64,
    };
    (0..count).map(|k| ends.fold(len, place(k)).map_or(0.0, |(n, sign)| sign * samples[n])).collect()
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn one_end_is_reflected_on_the_seat_of_the_run() {
        let samples = [1.0, 2.0, 3.0, 4.0];
        let cases = [
            (Parity::Even, Seat::Half, Side::Left, [1.0, 2.0, 3.0]),
            (Parity::Odd, Seat::Half, Side::Left, [-1.0, -2.0, -3.0]),
            (Parity::Even, Seat::Whole, Side::Left, [2.0, 3.0, 4.0]),
            (Parity::Odd, Seat::Whole, Side::Left, [0.0, -1.0, -2.0]),
            (Parity::Even, Seat::Half, Side::Right, [4.0, 3.0, 2.0]),
            (Parity::Even, Seat::Whole, Side::Right, [3.0, 2.0, 1.0]),
            (Parity::Odd, Seat::Whole, Side::Right, [0.0, -4.0, -3.0]),
        ];
        for (parity, seat, side, expected) in cases {
            assert_eq!(reflected(&samples, parity, seat, side, 3), expected, "{parity:?} {seat:?} {side:?}");
        }
    }
}
