//! The picture of one judged channel: its continuations past both ends, and the outputs they lead to.

use crate::baseline::Baseline;
use crate::basis::Planner;
use crate::compare::Judgement;
use crate::condition::{condition, condition_continued, scale_of};
use crate::error::Result;
use crate::operator::Chain;
use crate::record::Channel;
use crate::report::{ChannelReport, Curve, Picture, TrustedReport};
use crate::settings::Settings;
use crate::unit::Unit;
use crate::verdict::CANDIDATES;

/// What a picture says beside its curves.
pub struct Scene<'a> {
    /// The extension in use.
    pub takes: &'a str,
    /// Unit of the output.
    pub unit: &'a Unit,
    /// What is trusted.
    pub trusted: Option<TrustedReport>,
    /// The verdict in words.
    pub sentence: &'a str,
}

impl<'a> Scene<'a> {
    /// Of a conditioned channel.
    pub fn of(report: &'a ChannelReport) -> Scene<'a> {
        Scene {
            takes: &report.extension.kind,
            unit: &report.unit,
            trusted: report.trusted,
            sentence: report.verdict.as_ref().map_or("", |verdict| verdict.sentence.as_str()),
        }
    }
}

/// Samples drawn past each end, at most.
const PAST: usize = 400;

/// The continuations past both ends and the outputs over the edge zones; `None` where nothing was judged.
pub fn draw(
    channel: Channel<'_>,
    chain: &Chain,
    settings: &Settings,
    judgement: &Judgement,
    scene: &Scene<'_>,
    planner: &Planner,
) -> Result<Option<Picture>> {
    let (Some([left, right]), Some(verdict)) = (&judgement.forecast, &judgement.verdict) else { return Ok(None) };
    let (samples, len) = (channel.samples, channel.samples.len());
    let past = left.len().min(PAST).min(len);
    let seat = settings.stage.seat;
    let mut curves = Vec::new();
    let foretold = condition_continued(channel, chain, left, right, seat, planner)?.output;
    curves.push(Curve { name: "forecast", past: [left[..past].to_vec(), right[..past].to_vec()], output: foretold });
    for candidate in &CANDIDATES {
        let baseline = Baseline::fit(candidate.baseline, samples, candidate.ends, scale_of(chain, len))?;
        let split = baseline.polynomial();
        let at = |n: i64| split.at(n as f64 + candidate.ends.first_position());
        let outside = |n: i64| {
            let (source, sign) = candidate.ends.fold(len, n).unwrap_or((0, 0.0));
            sign * (samples[source] - at(source as i64)) + at(n)
        };
        let sides = [
            (0..past as i64).map(|k| outside(-1 - k)).collect(),
            (0..past as i64).map(|k| outside(len as i64 + k)).collect(),
        ];
        let output = condition(channel, chain, candidate.ends.seated(seat), candidate.baseline, planner)?.output;
        curves.push(Curve { name: candidate.name, past: sides, output });
    }
    Ok(Some(Picture {
        name: channel.name.to_owned(),
        unit_in: channel.unit.to_string(),
        unit: scene.unit.to_string(),
        axis: channel.axis.clone(),
        record: samples.to_vec(),
        curves,
        deviation: judgement.deviation.clone(),
        zone: verdict.zone,
        takes: scene.takes.to_owned(),
        trusted: scene.trusted,
        sentence: scene.sentence.to_owned(),
    }))
}
