//! The computation of a job: every channel judged, continued, conditioned and reported.

use ndarray::Array2;
use rayon::prelude::*;

use crate::audit::level::Level;
use crate::baseline::BaselineKind;
use crate::basis::Planner;
use crate::compare::{Chosen, Continuation, How, Judgement};
use crate::condition::{self, Outcome};
use crate::ends::{Ends, Seat};
use crate::error::{Error, Finding, Result};
use crate::job::bound::refuse_beyond_memory;
use crate::job::judgement::{self, Judged, Page, trusted_report};
use crate::job::picture::{Scene, draw};
use crate::job::preparation::prepare;
use crate::metric::exposure::Exposure;
use crate::operator::Chain;
use crate::place::Place;
use crate::record::{Channel, Record};
use crate::report::page::Passage;
use crate::report::{BaselineReport, ChannelReport, ExtensionReport, InOut, ReachReport, SmoothReport, TrustedReport};
use crate::settings::Settings;
use crate::verdict::{Auto, Trusted};

/// A channel this long is worked on alone: several at once would hold several times its transform memory.
const ALONE_FROM: usize = 1 << 20;

/// A conditioned record with its channels' reports.
pub struct Worked {
    pub record: Record,
    pub channels: Vec<ChannelReport>,
    /// What a page draws, one entry a channel; empty where no page is wanted.
    pub passages: Vec<Passage>,
}

/// Conditions all channels; rows of the sample array are replaced one by one, or written anew on another grid.
pub fn run(record: Record, chain: &Chain, settings: &Settings, planner: &Planner, page: Page) -> Result<Worked> {
    refuse_beyond_memory(&record, chain, settings)?;
    let missing: Vec<Vec<usize>> = (0..record.channel_count()).map(|index| record.missing(index).to_vec()).collect();
    let (axis, names, units, mut samples, findings) = record.into_parts();
    let len = axis.len();
    let Some(flat) = samples.as_slice_mut() else { unreachable!("a record's samples are contiguous") };
    let resampling = chain.treatments().resampling;
    let work = |(index, row): (usize, &mut [f64])| -> Result<Finished> {
        let channel = Channel { name: &names[index], unit: &units[index], axis: &axis, samples: row };
        let mut finished = one(channel, &missing[index], chain, settings, planner, page)?;
        if resampling.is_none() {
            row.copy_from_slice(&finished.output);
            finished.output = Vec::new();
        }
        Ok(finished)
    };
    let worked: Result<Vec<Finished>> = if len >= ALONE_FROM {
        flat.chunks_mut(len).enumerate().map(work).collect()
    } else {
        flat.par_chunks_mut(len).enumerate().map(work).collect()
    };
    let mut channels = Vec::with_capacity(names.len());
    let (mut outputs, mut passages) = (Vec::new(), Vec::new());
    for finished in worked? {
        channels.push(finished.report);
        outputs.push(finished.output);
        passages.extend(finished.passage);
    }
    let units = channels.iter().map(|report| report.unit.clone()).collect();
    let (axis, samples) = match resampling {
        None => (axis, samples),
        Some(resampling) => {
            let shape = (channels.len(), resampling.count);
            let grid = Array2::from_shape_vec(shape, outputs.concat())
                .map_err(|_| Error::unsupported("channels came out with different numbers of samples"))?;
            (resampling.axis(&axis), grid)
        }
    };
    let record = Record::new(axis, names, units, samples)?.with_findings(findings);
    Ok(Worked { record, channels, passages })
}

/// A channel that is done.
struct Finished {
    report: ChannelReport,
    output: Vec<f64>,
    passage: Option<Passage>,
}

fn one(
    channel: Channel<'_>,
    missing: &[usize],
    chain: &Chain,
    settings: &Settings,
    planner: &Planner,
    page: Page,
) -> Result<Finished> {
    let prepared = prepare(channel, missing, chain, settings, planner)?;
    let (raw, chain) = (channel, &*prepared.chain);
    let channel = Channel { samples: &prepared.samples, ..channel };
    let (chosen, mut judgement) = judgement::choose(channel, chain, settings, planner, page)?;
    let seat = settings.stage.seat;
    let known = foretold(&chosen, judgement.as_mut()).filter(|_| chain.treatments().resampling.is_none());
    let outcome = match (&chosen.continuation, known) {
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
    let judged = match chain.treatments().resampling {
        None => Judged::by_output(channel, settings, chosen, judgement, &outcome.output),
        Some(_) => Judged::of(channel, chain, settings, chosen, judgement, planner)?,
    };
    let mut report = report(channel, raw, chain, settings, &judged, &outcome);
    report.notes.extend(prepared.notes);
    if !chain.is_real() && matches!(judged.chosen.continuation, Continuation::Symmetric(Ends::Mirror { .. }, _)) {
        let reach =
            report.reach.samples.map_or_else(|| "the whole record".to_owned(), |r| format!("{} samples", r.ceil()));
        let text = format!(
            "{} ends run backwards in time, which no response that shifts phases undoes: within {reach} of an end the result \
             is not to be trusted; --extension forecast continues forwards",
            judged.chosen.name
        );
        report.notes.push(Finding::new("phase_at_mirror", text).at(Place::channel(channel.name)));
    }
    report.despike = prepared.despiked;
    report.smoothing = prepared.smoothing.map(|smoothing| SmoothReport { outliers: outcome.outliers, ..smoothing });
    let axis = chain.treatments().resampling.map_or_else(|| channel.axis.clone(), |grid| grid.axis(channel.axis));
    if let Some(weighting) = chain.treatments().weighting {
        let running_s = settings.running_rms.unwrap_or(DEFAULT_RUNNING_S);
        let exposure = Exposure::of(&outcome.output, &outcome.unit, &axis, weighting.name, running_s);
        report.notes.extend(exposure_notes(channel, &exposure, report.trusted.as_ref()));
        report.exposure = Some(exposure);
    }
    let passage = match page {
        Page::Unwanted => None,
        Page::Wanted => {
            let picture = draw(channel, &chain.on_own_grid(), seat, &judged, &Scene::of(&report), planner)?;
            let picture = Some(picture).filter(|picture| !picture.curves.is_empty());
            Some(Passage::of(raw, &outcome.output, &axis, report.unit == report.unit_in, picture))
        }
    };
    Ok(Finished { report, output: outcome.output, passage })
}

/// Integration time of the running RMS that ISO 2631-1:1997, 6.3.1, recommends.
const DEFAULT_RUNNING_S: f64 = 1.0;

/// What the figures of an exposure rest on, where that is doubtful.
fn exposure_notes(channel: Channel<'_>, exposure: &Exposure, trusted: Option<&TrustedReport>) -> Vec<Finding> {
    let mut notes = Vec::new();
    let mut say = |code, text: String| notes.push(Finding::new(code, text).at(Place::channel(channel.name)));
    if channel.unit.meaning().is_none_or(|m| (m.length, m.time) != (1, -2)) {
        let text = format!(
            "weighted as if it were an acceleration, but its unit is \"{}\": give it by --unit or --calibrate",
            channel.unit
        );
        say("weighting_unit", text);
    }
    if let (Some(at), Some(trusted)) = (exposure.mtvv_at, trusted)
        && !(trusted.from..=trusted.to).contains(&at)
    {
        let text =
            "the running RMS is largest near an end, outside the trusted span: the maximum may be made by the ends";
        say("mtvv_untrusted", text.to_owned());
    }
    notes
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
    raw: Channel<'_>,
    chain: &Chain,
    settings: &Settings,
    judged: &Judged,
    outcome: &Outcome,
) -> ChannelReport {
    let (before, after) = rayon::join(|| Level::of(raw.samples), || Level::of(&outcome.output));
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
        trusted: judged.trusted(channel.axis).and_then(|span| match chain.treatments().resampling {
            None => Some(span),
            Some(grid) => {
                let (first, last) = grid.within(span.first, span.last, channel.samples.len())?;
                Some(trusted_report(Trusted { first, last }, &grid.axis(channel.axis)))
            }
        }),
        despike: None,
        smoothing: None,
        exposure: None,
        rms: InOut { before: before.map(|l| l.rms), after: after.map(|l| l.rms) },
        level: InOut { before, after },
        parseval: outcome.parseval,
    }
}
