//! The computation of a job: every channel judged, continued, conditioned and reported.

use ndarray::Array2;
use rayon::prelude::*;

use crate::audit::level::Level;
use crate::baseline::BaselineKind;
use crate::basis::Planner;
use crate::compare::{Chosen, Continuation, How, Judgement};
use crate::condition::{self, Outcome};
use crate::ends::{Ends, Parity, Seat};
use crate::error::{Error, Finding, Result};
use crate::job::bound::refuse_beyond_memory;
use crate::job::integral::{self, Column};
use crate::job::judgement::{self, Judged, Page, trusted_report};
use crate::job::passage::passage;
use crate::job::picture::{Scene, draw};
use crate::job::preparation::prepare;
use crate::job::{derivative, split};
use crate::metric::exposure::Exposure;
use crate::operator::Chain;
use crate::place::Place;
use crate::record::{Channel, Record};
use crate::report::page::{Passage, Stack};
use crate::report::{BaselineReport, ChannelReport, ExtensionReport, InOut, ReachReport, SmoothReport, TrustedReport};
use crate::settings::Settings;
use crate::verdict::{Auto, Trusted};

/// A channel this long is worked on alone: several at once would hold several times its transform memory.
const ALONE_FROM: usize = 1 << 20;

/// A conditioned record with its channels' reports.
pub struct Worked {
    pub record: Record,
    pub channels: Vec<ChannelReport>,
    /// What stands beside the channels.
    pub columns: Vec<Column>,
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
    let primary = split::primary(chain, settings, &axis, len)?;
    let bench = Bench { chain, primary: primary.as_ref(), settings, planner, page };
    let work = |(index, row): (usize, &mut [f64])| -> Result<Finished> {
        let channel = Channel { name: &names[index], unit: &units[index], axis: &axis, samples: row };
        let mut finished = one(channel, &missing[index], &bench)?;
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
    let (mut outputs, mut passages, mut columns) = (Vec::new(), Vec::new(), Vec::new());
    for finished in worked? {
        channels.push(finished.report);
        outputs.push(finished.output);
        columns.extend(finished.columns);
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
    Ok(Worked { record, channels, columns, passages })
}

/// A channel that is done.
struct Finished {
    report: ChannelReport,
    output: Vec<f64>,
    columns: Vec<Column>,
    passage: Option<Passage>,
}

/// What all channels of a run share.
#[derive(Clone, Copy)]
struct Bench<'a> {
    chain: &'a Chain,
    /// The chain without its split, where there is one.
    primary: Option<&'a Chain>,
    settings: &'a Settings,
    planner: &'a Planner,
    page: Page,
}

fn one(channel: Channel<'_>, missing: &[usize], bench: &Bench<'_>) -> Result<Finished> {
    let Bench { chain, primary, settings, planner, page } = *bench;
    let prepared = prepare(channel, missing, chain, settings, planner)?;
    let (raw, chain) = (channel, &*prepared.chain);
    let channel = Channel { samples: &prepared.samples, ..channel };
    let (chosen, judgement, mut outcome) = outcome(channel, chain, settings, planner, page)?;
    let seat = settings.stage.seat;
    // What is told of an integral is measured at the record's own rate.
    let own = chain.on_own_grid();
    let integral = if chain.turns() < 0 && chain.treatments().resampling.is_some() {
        let own_outcome = formed(channel, &own, &chosen, seat, planner)?;
        integral::form(channel, &own, settings, &own_outcome, past(&chosen), planner)?
    } else {
        integral::form(channel, chain, settings, &outcome, past(&chosen), planner)?
    };
    let whole = match primary {
        Some(primary) => Some(formed(channel, primary, &chosen, seat, planner)?.output),
        None => None,
    };
    let judged = match chain.treatments().resampling {
        None => Judged::by_output(channel, settings, chosen, judgement, &outcome.output),
        Some(_) => Judged::of(channel, chain, settings, chosen, judgement, planner)?,
    };
    let mut report = report(channel, raw, chain, settings, &judged, &outcome);
    report.notes.extend(prepared.notes);
    report.notes.extend(derivative::remark(channel, chain, &outcome));
    let (mut columns, mut stack) = (Vec::new(), None);
    if let Some(formed) = integral {
        report.notes.extend(formed.notes);
        report.integral = Some(formed.report);
        columns = formed.columns;
        // On another grid the result has no deviation of its own, sample by sample.
        let drawn = page == Page::Wanted && chain.treatments().resampling.is_none();
        stack = drawn.then(|| Stack::of(channel.axis, &formed.corrected, &outcome.output, &formed.deviations));
    }
    if let (Some(whole), Some(corner)) = (whole, split::corner(settings)) {
        let parts = split::of(channel, corner, whole, std::mem::take(&mut outcome.output), settings);
        report.split = Some(parts.report);
        columns.extend(parts.columns);
        outcome.output = parts.primary;
    }
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
            let passage = passage(raw, &outcome.output, &axis, chain, &report, picture, planner);
            Some(Passage { integral: stack, ..passage })
        }
    };
    Ok(Finished { report, output: outcome.output, columns, passage })
}

/// A channel under the continuation of a run.
fn formed(channel: Channel<'_>, chain: &Chain, chosen: &Chosen, seat: Seat, planner: &Planner) -> Result<Outcome> {
    match &chosen.continuation {
        Continuation::Symmetric(ends, baseline) => condition::condition(channel, chain, *ends, *baseline, planner),
        Continuation::Given([left, right]) => {
            condition::condition_continued(channel, chain, left, right, seat, planner)
        }
    }
}

/// The samples past both ends, where they are given.
fn past(chosen: &Chosen) -> Option<[&[f64]; 2]> {
    match &chosen.continuation {
        Continuation::Given([left, right]) => Some([left, right]),
        Continuation::Symmetric(..) => None,
    }
}

/// A prepared channel conditioned, with the continuation it took and the judgement that rests on.
///
/// # Errors
/// Those of choosing and conditioning; `Unsupported` for a result too large for a double.
pub fn outcome(
    channel: Channel<'_>,
    chain: &Chain,
    settings: &Settings,
    planner: &Planner,
    page: Page,
) -> Result<(Chosen, Option<Judgement>, Outcome)> {
    let (chosen, mut judgement) = judgement::choose(channel, chain, settings, planner, page)?;
    let known = foretold(&chosen, judgement.as_mut()).filter(|_| chain.treatments().resampling.is_none());
    let outcome = known.map_or_else(|| formed(channel, chain, &chosen, settings.stage.seat, planner), Ok)?;
    if let Some(n) = outcome.output.iter().position(|v| !v.is_finite()) {
        let place = Place { sample: Some(n as u64), ..Place::channel(channel.name) };
        return Err(Error::unsupported("the result is too large for a double")
            .at(place)
            .remedy("scale the channel with --calibrate"));
    }
    Ok((chosen, judgement, outcome))
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
    let end_treatment = match chosen.continuation {
        Continuation::Symmetric(..) => end_treatment(ends, baseline),
        Continuation::Given(_) => "extrapolation by linear prediction".to_owned(),
    };
    let seat = match ends.seat() {
        Seat::Half => "half-sample",
        Seat::Whole => "whole-sample",
    };
    (
        ExtensionReport { kind: chosen.name.clone(), seat, transform, end_treatment, how: chosen.how },
        baseline.to_string(),
    )
}

/// The methods that ISO 16610-28:2016 names for the ends of a profile (terms from memory), as far as they are these.
fn end_treatment(ends: Ends, baseline: BaselineKind) -> String {
    let method = |parity: Parity| match parity {
        Parity::Even => "line symmetrical reflection",
        Parity::Odd => "point symmetrical reflection",
    };
    let method = match ends {
        Ends::Periodic => "closed profile".to_owned(),
        Ends::Mirror { left, right, .. } if left == right => method(left).to_owned(),
        Ends::Mirror { left, right, .. } => format!("{} at the left, {} at the right", method(left), method(right)),
    };
    let about = match baseline {
        BaselineKind::None => "",
        BaselineKind::Mean => " about the mean",
        BaselineKind::Level(_) => " about the level at the odd end",
        BaselineKind::Line => " about the line through the end values",
        BaselineKind::Slopes | BaselineKind::Tangents => " about the parabola with the end slopes",
        BaselineKind::Trend(_) => " about the least-squares polynomial",
    };
    format!("{method}{about}")
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
        split: None,
        integral: None,
        rms: InOut { before: before.map(|l| l.rms), after: after.map(|l| l.rms) },
        level: InOut { before, after },
        parseval: outcome.parseval,
    }
}
