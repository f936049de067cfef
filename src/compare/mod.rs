//! Judging a channel under a chain: the verdict, what it rests on, and the continuation that a run will take.

mod assertion;
mod choice;
mod tolerance;

use realfft::num_complex::Complex;

use crate::baseline::{EndEstimates, Side};
use crate::basis::Planner;
use crate::condition::{condition, condition_continued, scaling};
use crate::ends::{Ends, Seat};
use crate::error::Result;
use crate::forecast::{Evidence, Forecast, Response, Shape, turned};
use crate::numeric::noise;
use crate::operator::Chain;
use crate::record::Channel;
use crate::verdict::{self, Case, Extension, FlatEnds, Formed, Verdict};

pub use assertion::{Assertion, Property, Standing};
pub use choice::{Chosen, Continuation, How, choose};
pub use tolerance::ToleranceRequest;

/// What is known about the ends of one channel under one chain.
#[derive(Debug, Clone)]
pub struct Judgement {
    /// The verdict; `None` where the chain has nothing to judge: no corner, or an integral that keeps zero frequency.
    pub verdict: Option<Verdict>,
    /// Values, slopes and levels at the half-sample mirrors, with standard errors.
    pub estimates: EndEstimates,
    /// The forecast past the left and the right end, counted outwards; `None` where nothing could be judged.
    pub forecast: Option<[Vec<f64>; 2]>,
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
    let tolerance = tolerance.resolve(&output_unit)?;
    let noise = noise::sigma(samples);
    let (_, factor) = scaling(channel, chain);
    let gain = |f: f64| factor * turned(chain.gain(f), f, chain.turns());
    let integrates_offset = chain.turns() < 0 && chain.gain(0.0) != 0.0;
    let Some(shortest_wavelength) = chain.shortest_wavelength_samples().filter(|_| !integrates_offset) else {
        let estimates = EndEstimates::with_noise(samples, Ends::EVEN, crate::condition::scale_of(chain, len), noise);
        let structure = verdict::Structure::default();
        return Ok(Judgement { verdict: None, estimates, forecast: None, deviation: Default::default(), structure });
    };
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
    // An output that cannot be formed is not judged: the run itself will tell why.
    let output = |extension: Extension<'_>| {
        let outcome = match extension {
            Extension::Symmetric(candidate) => {
                condition(channel, chain, candidate.ends.seated(seat), candidate.baseline, planner)
            }
            Extension::Continued { left, right } => condition_continued(channel, chain, left, right, seat, planner),
        };
        outcome.map_or_else(|_| vec![f64::NAN; len], |outcome| outcome.output)
    };
    let forecast = evidence.as_ref().map(|evidence| Forecast::combine(evidence, &response));
    let case = Case {
        samples,
        past: evidence.as_ref().zip(forecast.as_ref()),
        structure,
        estimates,
        response: &response,
        output: &output,
        formed: if chain.passes().len() > 1 || !chain.is_real() { Formed::InSeveral } else { Formed::InOnePass },
        tolerance,
    };
    let verdict = Verdict::of(&case, FlatEnds::Ignored);
    let judged = !verdict.edges.is_empty();
    let forecast = forecast.filter(|_| judged);
    let sides = [Side::Left, Side::Right];
    let deviation = sides.map(|side| {
        forecast.as_ref().map_or_else(Vec::new, |f| f.profile(side).iter().map(|variance| variance.sqrt()).collect())
    });
    let forecast = forecast.map(|forecast| sides.map(|side| forecast.continuation(side)));
    Ok(Judgement { verdict: Some(verdict), estimates, forecast, deviation, structure })
}

#[cfg(test)]
mod tests;
