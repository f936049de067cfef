//! Judging a channel under a chain: the verdict, what it rests on, and the continuation that a run will take.

mod assertion;
mod choice;
mod cost;
mod tolerance;

use realfft::num_complex::Complex;

use crate::baseline::{EndEstimates, Side};
use crate::basis::Planner;
use crate::condition::{Outcome, condition, condition_continued, scale_of, scaling};
use crate::ends::{Ends, Seat};
use crate::error::Result;
use crate::forecast::{Evidence, Forecast, Response, Shape, turned};
use crate::numeric::noise;
use crate::operator::Chain;
use crate::record::Channel;
use crate::verdict::{self, Case, Extension, FlatEnds, Formed, Past, Unjudged, Verdict};

pub use assertion::{Assertion, EndStanding, Property, Standing, standings_text};
pub use choice::{Chosen, Continuation, How, choose, refuse_contradictions};
pub use tolerance::ToleranceRequest;

/// What is known about the ends of one channel under one chain.
#[derive(Debug, Clone)]
pub struct Judgement {
    /// The verdict; `None` where the chain has nothing to judge: no corner, or an integral that keeps zero frequency.
    pub verdict: Option<Verdict>,
    /// Why nothing was judged; `None` where it was.
    pub unjudged: Option<Unjudged>,
    /// Values, slopes and levels at the half-sample mirrors, with standard errors.
    pub estimates: EndEstimates,
    /// The forecast past the left and the right end, counted outwards; `None` where nothing could be judged.
    pub forecast: Option<[Vec<f64>; 2]>,
    /// What the chain makes of the channel under the forecast; `None` where nothing could be judged.
    pub foretold: Option<Outcome>,
    /// Standard deviation that the forecast gives the output, by distance from the left and the right end.
    pub deviation: [Vec<f64>; 2],
    /// Joins of the ends, where the record is long enough.
    pub structure: verdict::Structure,
}

/// Judges a channel. The record must have been regularised; nothing here fails for what a record holds.
///
/// # Errors
/// `Usage` for a tolerance in a unit that the output does not have.
pub fn judge(
    channel: Channel<'_>,
    chain: &Chain,
    seat: Seat,
    tolerance: &ToleranceRequest,
    planner: &Planner,
) -> Result<Judgement> {
    let own = chain.on_own_grid();
    let chain = &own;
    let samples = channel.samples;
    let len = samples.len();
    let output_unit = channel.unit.turned(chain.turns(), channel.axis.unit()).0;
    let tolerance = tolerance.resolve("--tolerance", &output_unit)?;
    let noise = noise::sigma(samples);
    let Some(shortest_wavelength) = chain.shortest_wavelength_samples().filter(|_| !keeps_offset(chain)) else {
        return Ok(Judgement::without_verdict(samples, chain, noise));
    };
    let (_, factor) = scaling(channel, chain);
    let gain = |f: f64| factor * turned(chain.gain(f), f, chain.turns());
    let shape = Shape { gain: &gain, turns: chain.turns(), shortest_wavelength };
    let response = if chain.is_real() {
        Response::of(shape, len)
    } else {
        let phase = |f: f64| {
            let response = chain.response(f);
            if response.norm() > 0.0 { response / response.norm() } else { Complex::new(1.0, 0.0) }
        };
        Response::with_phase(shape, &phase, len)
    };
    let estimates = verdict::estimates(samples, &response, noise);
    let block = Evidence::block_length(shortest_wavelength);
    let evidence = Evidence::gather(samples, block);
    let structure = evidence.as_ref().map(verdict::structure).unwrap_or_default();
    let unjudged = Unjudged::of(samples, &response).map_or(Ok(()), Err);
    let past = unjudged.and_then(|()| evidence.as_ref().ok_or(Unjudged::FewBlocks));
    let past = past.map(|evidence| (evidence, Forecast::combine(evidence, &response)));
    let sides = [Side::Left, Side::Right];
    let ahead = past.as_ref().ok().map(|(_, forecast)| sides.map(|side| forecast.continuation(side)));
    // An output that cannot be formed is not judged: the run itself will tell why.
    let foretold =
        ahead.as_ref().and_then(|[left, right]| condition_continued(channel, chain, left, right, seat, planner).ok());
    let past = match (&past, &foretold) {
        (Ok((evidence, forecast)), Some(outcome)) => Ok(Past { evidence, forecast, foretold: &outcome.output }),
        (Ok(_), None) => Err(Unjudged::Unformed),
        (Err(reason), _) => Err(*reason),
    };
    let output = |extension: Extension<'_>| {
        let outcome = match extension {
            Extension::Symmetric(candidate) => {
                condition(channel, chain, candidate.ends.seated(seat), candidate.baseline, planner)
            }
            Extension::Continued { left, right } => condition_continued(channel, chain, left, right, seat, planner),
        };
        outcome.map_or_else(|_| vec![f64::NAN; len], |outcome| outcome.output)
    };
    let blocks_tell = chain.passes().len() == 1 && chain.is_real() && seat == Seat::Half;
    let case = Case {
        samples,
        past,
        structure,
        estimates,
        response: &response,
        output: &output,
        formed: if blocks_tell { Formed::InOnePass } else { Formed::Otherwise },
        tolerance,
    };
    let verdict = Verdict::of(&case, FlatEnds::Ignored);
    let deviation = verdict.scene.as_ref().map(|scene| scene.deviations().clone()).unwrap_or_default();
    let judged = verdict.unjudged.is_none();
    Ok(Judgement {
        unjudged: verdict.unjudged,
        verdict: Some(verdict),
        estimates,
        forecast: ahead.filter(|_| judged),
        foretold: foretold.filter(|_| judged),
        deviation,
        structure,
    })
}

/// True for a chain whose output depends on everything outside: an integral that keeps zero frequency.
fn keeps_offset(chain: &Chain) -> bool {
    chain.turns() < 0 && chain.gain(0.0) != 0.0
}

/// Why no record can be judged under a chain.
fn unjudged_chain(chain: &Chain) -> Option<Unjudged> {
    if chain.is_identity() {
        Some(Unjudged::NoOperator)
    } else if keeps_offset(chain) {
        Some(Unjudged::KeepsOffset)
    } else if chain.shortest_wavelength_samples().is_none() {
        Some(Unjudged::NoCorner)
    } else {
        None
    }
}

impl Judgement {
    /// What can be told without a corner: the ends themselves and how they join.
    fn without_verdict(samples: &[f64], chain: &Chain, noise: f64) -> Judgement {
        let scale = scale_of(chain, samples.len());
        let block = Evidence::block_length(scale.shortest_wavelength);
        let [left, right] = Evidence::histories(samples, block);
        Judgement {
            verdict: None,
            unjudged: unjudged_chain(chain),
            estimates: EndEstimates::with_noise(samples, Ends::EVEN, scale, noise),
            forecast: None,
            foretold: None,
            deviation: Default::default(),
            structure: verdict::structure_of([&left, &right]),
        }
    }
}

#[cfg(test)]
mod tests;
