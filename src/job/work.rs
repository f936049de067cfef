//! The computation of a job: every channel judged, continued, conditioned and reported.

use ndarray::Array2;
use rayon::prelude::*;

use crate::audit::level::Level;
use crate::baseline::BaselineKind;
use crate::basis::Planner;
use crate::compare::{self, Chosen, Continuation, How, Judgement};
use crate::condition::{self, ExtensionChoice, Outcome};
use crate::ends::{Ends, Seat};
use crate::error::{Error, Finding, Result};
use crate::job::picture::{Scene, draw};
use crate::job::preparation::prepare;
use crate::metric::exposure::Exposure;
use crate::numeric::sum;
use crate::operator::Chain;
use crate::place::Place;
use crate::record::{Axis, Channel, Record};
use crate::report::page::Passage;
use crate::report::{
    BaselineReport, ChannelReport, ExtensionReport, InOut, ReachReport, SmoothReport, TrustedReport, VerdictReport,
};
use crate::settings::Settings;
use crate::unit::Unit;
use crate::verdict::{Auto, Edge};

/// A channel this long is worked on alone: several at once would hold several times its transform memory.
const ALONE_FROM: usize = 1 << 20;

/// A conditioned record with its channels' reports.
pub struct Worked {
    pub record: Record,
    pub channels: Vec<ChannelReport>,
    /// What a page draws, one entry a channel; empty where no page is wanted.
    pub passages: Vec<Passage>,
}

/// Whether a page will show what was done: then every channel is judged, and its lines are kept.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Page {
    Wanted,
    Unwanted,
}

/// Conditions all channels; rows of the sample array are replaced one by one, or written anew on another grid.
pub fn run(record: Record, chain: &Chain, settings: &Settings, planner: &Planner, page: Page) -> Result<Worked> {
    let (axis, names, units, mut samples, findings) = record.into_parts();
    let len = axis.len();
    let Some(flat) = samples.as_slice_mut() else { unreachable!("a record's samples are contiguous") };
    let resampling = chain.treatments().resampling;
    let work = |(index, row): (usize, &mut [f64])| -> Result<Finished> {
        let channel = Channel { name: &names[index], unit: &units[index], axis: &axis, samples: row };
        let mut finished = one(channel, chain, settings, planner, page)?;
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

fn one(channel: Channel<'_>, chain: &Chain, settings: &Settings, planner: &Planner, page: Page) -> Result<Finished> {
    let prepared = prepare(channel, chain, planner)?;
    let (raw, chain) = (channel, &*prepared.chain);
    let channel = Channel { samples: &prepared.samples, ..channel };
    let (chosen, judgement) = choose(channel, chain, settings, planner, page)?;
    let outcome = match &chosen.continuation {
        Continuation::Symmetric(ends, baseline) => condition::condition(channel, chain, *ends, *baseline, planner)?,
        Continuation::Given([left, right]) => {
            condition::condition_continued(channel, chain, left, right, settings.stage.seat, planner)?
        }
    };
    if let Some(n) = outcome.output.iter().position(|v| !v.is_finite()) {
        let place = Place { sample: Some(n as u64), ..Place::channel(channel.name) };
        return Err(Error::unsupported("the result is too large for a double")
            .at(place)
            .remedy("scale the channel with --calibrate"));
    }
    let mut report = report(raw, chain, settings, &chosen, judgement.as_ref(), &outcome);
    report.notes.extend(prepared.notes);
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
            let picture = judgement
                .as_ref()
                .map(|judgement| draw(channel, chain, settings, judgement, &Scene::of(&report), planner))
                .transpose()?;
            Some(Passage::of(raw, &outcome.output, &axis, report.unit == report.unit_in, picture.flatten()))
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

/// The continuation of a channel, and the judgement it rests on. A named extension without `--require`, a tolerance or
/// treatment of the edges is taken as it is: nothing then asks for a verdict.
pub fn choose(
    channel: Channel<'_>,
    chain: &Chain,
    settings: &Settings,
    planner: &Planner,
    page: Page,
) -> Result<(Chosen, Option<Judgement>)> {
    let fixed = matches!(settings.stage.extension, ExtensionChoice::Fixed(_));
    let wanted = page == Page::Wanted || !fixed || settings.require.is_some() || settings.edges != Default::default();
    let judgement = (wanted && !chain.is_identity())
        .then(|| compare::judge(channel, chain, settings.stage.seat, &settings.tolerance, planner))
        .transpose()?;
    let chosen = compare::choose(channel.samples, chain, &settings.stage, &settings.assertion, judgement.as_ref())?;
    Ok((chosen, judgement))
}

/// The extension and the baseline as reports name them.
pub fn stage_reports(chosen: &Chosen, chain: &Chain, settings: &Settings) -> (ExtensionReport, String) {
    let (ends, baseline, transform) = match chosen.continuation {
        Continuation::Symmetric(ends, baseline) => (ends, baseline, ends.transform().to_owned()),
        Continuation::Given(_) => {
            let even = Ends::EVEN.seated(settings.stage.seat);
            (even, condition::default_baseline(even, chain), format!("{} of the continued record", even.transform()))
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
    chosen: &Chosen,
    judgement: Option<&Judgement>,
    outcome: &Outcome,
) -> ChannelReport {
    let (before, after) = (Level::of(channel.samples), Level::of(&outcome.output));
    let polynomial = outcome.baseline.polynomial();
    let reaches = chain.reaches();
    let (extension, _) = stage_reports(chosen, chain, settings);
    let kind = outcome.baseline.kind();
    let fitted = matches!(kind, BaselineKind::Level(_) | BaselineKind::Line | BaselineKind::Slopes);
    let edge = edge_of(chosen, judgement);
    let verdict = verdict_report(channel, &outcome.unit, settings, judgement, edge);
    let mut notes = Vec::new();
    if let Some(standing) = verdict.as_ref().and_then(|v| v.assertion)
        && standing == compare::Standing::Contradicted
    {
        let text = format!("the record speaks against --assert {}", settings.assertion);
        notes.push(Finding::new("assertion_contradicted", text).at(Place::channel(channel.name)));
    }
    ChannelReport {
        name: channel.name.to_owned(),
        unit: outcome.unit.clone(),
        unit_in: channel.unit.clone(),
        notes,
        baseline: BaselineReport {
            kind: kind.to_string(),
            how: if settings.stage.baseline.is_some() { How::Asked } else { chosen.how },
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
        verdict,
        candidates: judgement.and_then(|j| j.verdict.as_ref()).map(|v| v.edges.clone()).unwrap_or_default(),
        edge: judgement.map(|j| j.estimates),
        trusted: edge.and_then(|edge| edge.trusted).and_then(|span| match chain.treatments().resampling {
            None => Some(trusted_report(span.first, span.last, channel.axis)),
            Some(grid) => {
                let (first, last) = grid.within(span.first, span.last, channel.samples.len())?;
                Some(trusted_report(first, last, &grid.axis(channel.axis)))
            }
        }),
        despike: None,
        smoothing: None,
        exposure: None,
        rms: InOut { before: before.map(|l| l.rms), after: after.map(|l| l.rms) },
        level: InOut { before, after },
        repaired: 0,
        repairs: Vec::new(),
        parseval: outcome.parseval,
    }
}

/// The row of the verdict that belongs to the continuation in use, where there is one.
pub fn edge_of<'a>(chosen: &Chosen, judgement: Option<&'a Judgement>) -> Option<&'a Edge> {
    let verdict = judgement?.verdict.as_ref()?;
    match &chosen.continuation {
        Continuation::Given(_) if chosen.how != How::Asserted => verdict.edge(Auto::Forecast.name()),
        Continuation::Given(_) => None,
        Continuation::Symmetric(ends, baseline) => {
            let plain = ends.seated(Seat::Half);
            let row = crate::verdict::CANDIDATES
                .iter()
                .find(|c| c.ends == plain && (c.baseline == *baseline || same_level(c.baseline, *baseline)))?;
            verdict.edge(row.name)
        }
    }
}

/// `level` without a side is the level at the odd end, which is what the mixed candidates have.
fn same_level(candidate: BaselineKind, baseline: BaselineKind) -> bool {
    matches!((candidate, baseline), (BaselineKind::Level(Some(_)), BaselineKind::Level(None)))
}

/// A trusted span with its stamps.
pub fn trusted_report(first: usize, last: usize, axis: &Axis) -> TrustedReport {
    TrustedReport { first, last, from: axis.stamp(first), to: axis.stamp(last) }
}

/// The verdict as a report: its sentence ends with the cost of the extension in use.
pub fn verdict_report(
    channel: Channel<'_>,
    unit: &Unit,
    settings: &Settings,
    judgement: Option<&Judgement>,
    edge: Option<&Edge>,
) -> Option<VerdictReport> {
    let judgement = judgement?;
    let verdict = judgement.verdict.as_ref()?;
    let standing = (!settings.assertion.is_empty())
        .then(|| settings.assertion.standing(judgement, sum::standard_deviation(channel.samples)));
    let mut sentence = verdict.pick_sentence();
    if let Some(edge) = edge {
        if let Some(pick) = verdict.edge(verdict.pick.name).filter(|pick| pick.name != edge.name) {
            sentence = format!("{sentence} ({} would cost {})", pick.name, verdict.cost(pick, unit));
        }
        sentence = format!("{sentence}; {}: {}", edge.name, verdict.edge_sentence(edge, unit, channel.axis));
    }
    if let Some(standing) = standing {
        let word = match standing {
            compare::Standing::NotContradicted => "not contradicted",
            compare::Standing::Contradicted => "contradicted",
            compare::Standing::Untested => "untested",
        };
        sentence = format!("{sentence}; asserted {}: {word} by this record", settings.assertion);
    }
    Some(VerdictReport {
        pick: verdict.pick.name,
        level: verdict.pick.level,
        margin: verdict.pick.margin,
        ties: verdict.pick.ties.clone(),
        choice_immaterial: verdict.pick.choice_immaterial,
        adequacy: edge.map(|edge| edge.adequacy),
        predicted_error: edge.map(|edge| edge.predicted_error),
        bound: edge.map(|edge| edge.bound),
        tolerance: verdict.tolerance,
        output_deviation: verdict.output_deviation,
        zone: verdict.zone,
        joins: verdict.structure,
        assertion: standing,
        sentence,
    })
}
