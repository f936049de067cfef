//! The picture of one channel: its continuations past both ends, and the outputs they lead to.

use crate::baseline::Baseline;
use crate::basis::Planner;
use crate::compare::Judgement;
use crate::condition::{condition, condition_continued, scale_of};
use crate::ends::Seat;
use crate::error::Result;
use crate::job::judgement::Judged;
use crate::operator::Chain;
use crate::record::Channel;
use crate::report::{ChannelReport, Curve, Picture, TrustedReport};
use crate::unit::Unit;
use crate::verdict::{Auto, CANDIDATES, Candidate};

/// What a picture says beside its curves.
pub struct Scene<'a> {
    /// The extension in use.
    pub takes: &'a str,
    /// Unit of the output.
    pub unit: &'a Unit,
    /// What is trusted.
    pub trusted: Option<TrustedReport>,
}

impl<'a> Scene<'a> {
    /// Of a conditioned channel.
    pub fn of(report: &'a ChannelReport) -> Scene<'a> {
        Scene { takes: &report.extension.kind, unit: &report.unit, trusted: report.trusted }
    }
}

/// Samples drawn past each end, at most.
const PAST: usize = 400;

/// The continuations past both ends and the outputs over the edge zones; the record alone where nothing was judged.
pub fn draw(
    channel: Channel<'_>,
    chain: &Chain,
    seat: Seat,
    judged: &Judged,
    scene: &Scene<'_>,
    planner: &Planner,
) -> Result<Picture> {
    let known = judged.judgement.as_ref();
    Ok(Picture {
        name: channel.name.to_owned(),
        unit_in: channel.unit.to_string(),
        unit: scene.unit.to_string(),
        axis: channel.axis.clone(),
        record: channel.samples.to_vec(),
        curves: known.map_or(Ok(Vec::new()), |judgement| curves(channel, chain, seat, judgement, planner))?,
        deviation: known.map(|judgement| judgement.deviation.clone()).unwrap_or_default(),
        zone: known.and_then(|judgement| judgement.verdict.as_ref()).map_or(0, |verdict| verdict.zone),
        takes: scene.takes.to_owned(),
        trusted: scene.trusted,
        not_judged: judged.unjudged,
    })
}

/// The forecast, then the candidates; nothing where nothing was judged.
fn curves(
    channel: Channel<'_>,
    chain: &Chain,
    seat: Seat,
    judgement: &Judgement,
    planner: &Planner,
) -> Result<Vec<Curve>> {
    let Some([left, right]) = &judgement.forecast else { return Ok(Vec::new()) };
    let past = left.len().min(PAST).min(channel.samples.len());
    let output = match &judgement.foretold {
        Some(outcome) => outcome.output.clone(),
        None => condition_continued(channel, chain, left, right, seat, planner)?.output,
    };
    let sides = [left[..past].to_vec(), right[..past].to_vec()];
    let mut curves = vec![Curve { name: Auto::Forecast.name(), past: sides, output }];
    for candidate in &CANDIDATES {
        curves.push(curve(channel, chain, candidate, seat, past, planner)?);
    }
    Ok(curves)
}

/// A candidate past both ends, and its output.
fn curve(
    channel: Channel<'_>,
    chain: &Chain,
    candidate: &Candidate,
    seat: Seat,
    past: usize,
    planner: &Planner,
) -> Result<Curve> {
    let (samples, ends) = (channel.samples, candidate.ends.seated(seat));
    let len = samples.len();
    let baseline = Baseline::fit(candidate.baseline, samples, ends, scale_of(chain, len))?;
    let split = baseline.polynomial();
    let at = |n: i64| split.at(n as f64 + ends.first_position());
    let outside = |n: i64| {
        let (source, sign) = ends.fold(len, n).unwrap_or((0, 0.0));
        sign * (samples[source] - at(source as i64)) + at(n)
    };
    let sides = [
        (0..past as i64).map(|k| outside(-1 - k)).collect(),
        (0..past as i64).map(|k| outside(len as i64 + k)).collect(),
    ];
    let output = condition(channel, chain, ends, candidate.baseline, planner)?.output;
    Ok(Curve { name: candidate.name, past: sides, output })
}
