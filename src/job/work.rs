//! The computation of a job: every channel judged, continued, conditioned and reported.

use rayon::prelude::*;

use crate::audit::level::Level;
use crate::baseline::BaselineKind;
use crate::basis::Planner;
use crate::compare::{Chosen, Continuation, How, Judgement};
use crate::condition::{self, Outcome};
use crate::ends::Seat;
use crate::error::{Error, Result};
use crate::job::judgement::{self, Judged, Page};
use crate::job::picture::{Scene, draw};
use crate::operator::Chain;
use crate::place::Place;
use crate::record::{Channel, Record};
use crate::report::page::Passage;
use crate::report::{BaselineReport, ChannelReport, ExtensionReport, InOut, ReachReport};
use crate::settings::Settings;
use crate::verdict::Auto;

/// A channel this long is worked on alone: several at once would hold several times its transform memory.
const ALONE_FROM: usize = 1 << 20;

/// A conditioned record with its channels' reports.
pub struct Worked {
    pub record: Record,
    pub channels: Vec<ChannelReport>,
    /// What a page draws, one entry a channel; empty where no page is wanted.
    pub passages: Vec<Passage>,
}

/// Conditions all channels; rows of the sample array are replaced one by one.
pub fn run(record: Record, chain: &Chain, settings: &Settings, page: Page) -> Result<Worked> {
    let (axis, names, units, mut samples, findings) = record.into_parts();
    let len = axis.len();
    let planner = Planner::new();
    let Some(flat) = samples.as_slice_mut() else { unreachable!("a record's samples are contiguous") };
    let work = |(index, row): (usize, &mut [f64])| -> Result<(ChannelReport, Option<Passage>)> {
        let channel = Channel { name: &names[index], unit: &units[index], axis: &axis, samples: row };
        let (report, output, passage) = one(channel, chain, settings, &planner, page)?;
        row.copy_from_slice(&output);
        Ok((report, passage))
    };
    let worked: Result<Vec<(ChannelReport, Option<Passage>)>> = if len >= ALONE_FROM {
        flat.chunks_mut(len).enumerate().map(work).collect()
    } else {
        flat.par_chunks_mut(len).enumerate().map(work).collect()
    };
    let (channels, passages): (Vec<_>, Vec<_>) = worked?.into_iter().unzip();
    let units = channels.iter().map(|report| report.unit.clone()).collect();
    let record = Record::new(axis, names, units, samples)?.with_findings(findings);
    Ok(Worked { record, channels, passages: passages.into_iter().flatten().collect() })
}

fn one(
    channel: Channel<'_>,
    chain: &Chain,
    settings: &Settings,
    planner: &Planner,
    page: Page,
) -> Result<(ChannelReport, Vec<f64>, Option<Passage>)> {
    let (chosen, mut judgement) = judgement::choose(channel, chain, settings, planner, page)?;
    let seat = settings.stage.seat;
    let outcome = match (&chosen.continuation, foretold(&chosen, judgement.as_mut())) {
        (_, Some(outcome)) => outcome,
        (Continuation::Symmetric(ends, baseline), None) => {
            condition::condition(channel, chain, *ends, *baseline, planner)?
        }
        (Continuation::Given([left, right]), None) => {
            condition::condition_continued(channel, chain, left, right, seat, planner)?
        }
    };
    if let Some(n) = outcome.output.iter().position(|v| !v.is_finite()) {
        let place = Place { sample: Some(n as u64), ..Place::channel(channel.name) };
        return Err(Error::unsupported("the result is too large for a double")
            .at(place)
            .remedy("scale the channel with --calibrate"));
    }
    let judged = Judged::of(channel, settings, chosen, judgement, &outcome.output);
    let report = report(channel, chain, settings, &judged, &outcome);
    let passage = match page {
        Page::Unwanted => None,
        Page::Wanted => {
            let scene = Scene { takes: &report.extension.kind, unit: &report.unit, trusted: report.trusted };
            let picture = draw(channel, chain, seat, &judged, &scene, planner)?;
            let same_unit = report.unit == report.unit_in;
            let picture = Some(picture).filter(|picture| !picture.curves.is_empty());
            Some(Passage::of(channel, &outcome.output, channel.axis, same_unit, picture))
        }
    };
    Ok((report, outcome.output, passage))
}

/// The output under the forecast, where that is what was chosen: it is known from judging. Where another row of the verdict
/// was chosen, it is dropped, since it is as large as the record.
fn foretold(chosen: &Chosen, judgement: Option<&mut Judgement>) -> Option<Outcome> {
    let judgement = judgement?;
    let row = judgement.row(chosen)?;
    let is_forecast = row.name == Auto::Forecast.name();
    judgement.foretold.take().filter(|_| is_forecast)
}

/// The extension and the baseline as reports name them.
pub fn stage_reports(chosen: &Chosen, chain: &Chain, settings: &Settings) -> (ExtensionReport, String) {
    let (ends, baseline, transform) = match chosen.continuation {
        Continuation::Symmetric(ends, baseline) => (ends, baseline, ends.transform().to_owned()),
        Continuation::Given(_) => {
            let (ends, baseline) = condition::beyond(settings.stage.seat, chain);
            (ends, baseline, format!("{} of the continued record", ends.transform()))
        }
    };
    let seat = match ends.seat() {
        Seat::Half => "half-sample",
        Seat::Whole => "whole-sample",
    };
    (ExtensionReport { kind: chosen.name.clone(), seat, transform, how: chosen.how }, baseline.to_string())
}

fn report(
    channel: Channel<'_>,
    chain: &Chain,
    settings: &Settings,
    judged: &Judged,
    outcome: &Outcome,
) -> ChannelReport {
    let (before, after) = (Level::of(channel.samples), Level::of(&outcome.output));
    let polynomial = outcome.baseline.polynomial();
    let reaches = chain.reaches();
    let (extension, _) = stage_reports(&judged.chosen, chain, settings);
    let kind = outcome.baseline.kind();
    let fitted = matches!(kind, BaselineKind::Level(_) | BaselineKind::Line | BaselineKind::Slopes);
    let judgement = judged.judgement.as_ref();
    ChannelReport {
        name: channel.name.to_owned(),
        unit: outcome.unit.clone(),
        unit_in: channel.unit.clone(),
        notes: judged.notes(channel, settings),
        baseline: BaselineReport {
            kind: kind.to_string(),
            how: if settings.stage.baseline.is_some() { How::Asked } else { judged.chosen.how },
            coefficients: polynomial.coefficients().to_vec(),
            centre: polynomial.centre(),
            half_width: polynomial.half_width(),
            fit_width: fitted.then_some(outcome.scale.shortest_wavelength / 2.0),
            fit_width_assumed: fitted && chain.shortest_wavelength_samples().is_none(),
        },
        extension,
        reach: ReachReport {
            samples: reaches.reach.samples(),
            axis: reaches.reach.samples().map(|samples| samples * channel.axis.step()),
            numeric_samples: reaches.numeric,
        },
        verdict: judged.verdict(channel, &outcome.unit),
        not_judged: judged.unjudged,
        assertions: judged.standings.clone(),
        candidates: judgement.and_then(|j| j.verdict.as_ref()).map(|v| v.edges.clone()).unwrap_or_default(),
        edge: judgement.map(|j| j.estimates),
        trusted: judged.trusted(channel.axis),
        rms: InOut { before: before.map(|l| l.rms), after: after.map(|l| l.rms) },
        level: InOut { before, after },
        parseval: outcome.parseval,
    }
}
