//! The computation of a job: every channel judged, continued, conditioned and reported.

use rayon::prelude::*;

use crate::audit::level::Level;
use crate::baseline::BaselineKind;
use crate::basis::Planner;
use crate::compare::{self, Chosen, Continuation, How, Judgement};
use crate::condition::{self, ExtensionChoice, Outcome};
use crate::ends::{Ends, Seat};
use crate::error::{Error, Finding, Result};
use crate::numeric::sum;
use crate::operator::Chain;
use crate::place::Place;
use crate::record::{Axis, Channel, Record};
use crate::report::{BaselineReport, ChannelReport, ExtensionReport, InOut, ReachReport, TrustedReport, VerdictReport};
use crate::settings::Settings;
use crate::unit::Unit;
use crate::verdict::{Auto, Edge};

/// A channel this long is worked on alone: several at once would hold several times its transform memory.
const ALONE_FROM: usize = 1 << 20;

/// A conditioned record with its channels' reports.
pub struct Worked {
    pub record: Record,
    pub channels: Vec<ChannelReport>,
}

/// Conditions all channels; rows of the sample array are replaced one by one.
pub fn run(record: Record, chain: &Chain, settings: &Settings) -> Result<Worked> {
    let (axis, names, units, mut samples, findings) = record.into_parts();
    let len = axis.len();
    let planner = Planner::new();
    let Some(flat) = samples.as_slice_mut() else { unreachable!("a record's samples are contiguous") };
    let work = |(index, row): (usize, &mut [f64])| -> Result<ChannelReport> {
        let channel = Channel { name: &names[index], unit: &units[index], axis: &axis, samples: row };
        let (report, output) = one(channel, chain, settings, &planner)?;
        row.copy_from_slice(&output);
        Ok(report)
    };
    let reports: Result<Vec<ChannelReport>> = if len >= ALONE_FROM {
        flat.chunks_mut(len).enumerate().map(work).collect()
    } else {
        flat.par_chunks_mut(len).enumerate().map(work).collect()
    };
    let channels = reports?;
    let units = channels.iter().map(|report| report.unit.clone()).collect();
    let record = Record::new(axis, names, units, samples)?.with_findings(findings);
    Ok(Worked { record, channels })
}

fn one(
    channel: Channel<'_>,
    chain: &Chain,
    settings: &Settings,
    planner: &Planner,
) -> Result<(ChannelReport, Vec<f64>)> {
    let (chosen, judgement) = choose(channel, chain, settings, planner)?;
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
    let report = report(channel, chain, settings, &chosen, judgement.as_ref(), &outcome);
    Ok((report, outcome.output))
}

/// The continuation of a channel, and the judgement it rests on. A named extension without `--require`, a tolerance or
/// treatment of the edges is taken as it is: nothing then asks for a verdict.
pub fn choose(
    channel: Channel<'_>,
    chain: &Chain,
    settings: &Settings,
    planner: &Planner,
) -> Result<(Chosen, Option<Judgement>)> {
    let fixed = matches!(settings.stage.extension, ExtensionChoice::Fixed(_));
    let identity = chain.turns() == 0 && chain.passes().iter().all(|pass| pass.is_identity());
    let wanted = !fixed || settings.require.is_some() || settings.edges != Default::default();
    let judgement = (wanted && !identity)
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
        trusted: edge.and_then(|edge| edge.trusted).map(|span| trusted_report(span.first, span.last, channel.axis)),
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
