//! `compare`: every extension side by side on one record, and the picture of it.

use rayon::prelude::*;
use serde_json::{Map, Value};

use crate::baseline::{Baseline, BaselineKind, EndEstimates};
use crate::basis::Planner;
use crate::compare::{self, Judgement};
use crate::condition::scale_of;
use crate::ends::{Ends, Seat};
use crate::error::Result;
use crate::job::bound::refuse_beyond_memory;
use crate::job::chain;
use crate::job::intake;
use crate::job::judgement::{Judged, trusted_report};
use crate::job::picture::{Scene, draw};
use crate::job::preparation::{self, prepare};
use crate::job::requirement;
use crate::metric::{METRICS, Subject};
use crate::operator::Chain;
use crate::read::Input;
use crate::record::Channel;
use crate::report::{self, ChannelComparison, Comparison, InputReport, Jump, Picture, Row, SCHEMA, Tool, Veto};
use crate::settings::Settings;
use crate::verdict::{CANDIDATES, EVEN, ODD_ZERO, PERIODIC};

/// Compares the extensions of every channel; pictures are made where they are wanted.
///
/// # Errors
/// Whatever stops reading or resolving.
pub fn compare(input: Input, settings: &Settings, pictures: bool) -> Result<(Comparison, Vec<Picture>)> {
    let intake = intake::take(input, settings)?;
    let record = &intake.record;
    let (chain, remarks) = chain::of(record, settings)?;
    intake::refuse_notes(settings, &remarks)?;
    refuse_beyond_memory(record, &chain, settings)?;
    preparation::check(&chain, settings)?;
    let planner = Planner::new();
    let channels: Vec<Channel<'_>> = record.channels().collect();
    let compared: Vec<(ChannelComparison, Option<Picture>)> = channels
        .par_iter()
        .enumerate()
        .map(|(index, channel)| one(*channel, record.missing(index), &chain, settings, &planner, pictures))
        .collect::<Result<_>>()?;
    let (channels, pictures): (Vec<_>, Vec<_>) = compared.into_iter().unzip();
    for channel in &channels {
        intake::refuse_notes(settings, &channel.notes)?;
    }
    let unmet = requirement::unmet(settings, &channels);
    let report = Comparison {
        schema: SCHEMA,
        tool: Tool::THIS,
        command: "compare",
        settings: settings.to_map(),
        input: InputReport::new(&intake.outline.source, record.axis()),
        notes: record.findings().iter().cloned().chain(remarks).collect(),
        chain: chain.describe(record.axis()),
        channels,
        requirement_met: unmet.is_empty(),
        unmet,
        caution: report::caution(&chain),
    };
    Ok((report, pictures.into_iter().flatten().collect()))
}

fn one(
    channel: Channel<'_>,
    missing: &[usize],
    chain: &Chain,
    settings: &Settings,
    planner: &Planner,
    picture: bool,
) -> Result<(ChannelComparison, Option<Picture>)> {
    compare::refuse_contradictions(&settings.stage, &settings.assertion, chain)?;
    let prepared = prepare(channel, missing, chain, settings, planner)?;
    let channel = Channel { samples: &prepared.samples, ..channel };
    let chain = &prepared.chain.on_own_grid();
    let seat = settings.stage.seat;
    let judgement = compare::judge(channel, chain, seat, &settings.tolerance, planner)?;
    let chosen = compare::choose(channel.samples, chain, &settings.stage, &settings.assertion, Some(&judgement))?;
    let candidates = rows(channel, chain, seat, &judgement, planner)?;
    let excess = |row: usize| candidates[row].metrics.get("leakage_excess_db").and_then(Value::as_f64);
    let veto = excess(PERIODIC).zip(excess(EVEN)).and_then(|(periodic, even)| Veto::of(periodic, even));
    let estimates = judgement.estimates;
    let judged = Judged::of(channel, chain, settings, chosen, Some(judgement), planner)?;
    let unit = channel.unit.turned(chain.turns(), channel.axis.unit()).0;
    let comparison = ChannelComparison {
        name: channel.name.to_owned(),
        takes: judged.chosen.name.clone(),
        verdict: judged.verdict(channel, &unit),
        not_judged: judged.unjudged,
        assertions: judged.standings.clone(),
        notes: judged.notes(channel, settings),
        used: judged.edge.clone(),
        unit,
        unit_in: channel.unit.clone(),
        candidates,
        edge: Some(estimates),
        jump: Some(Jump::of(&estimates)),
        veto,
        trusted: judged.trusted(channel.axis),
    };
    let scene = Scene { takes: &comparison.takes, unit: &comparison.unit, trusted: comparison.trusted };
    let picture = picture.then(|| draw(channel, chain, seat, &judged, &scene, planner)).transpose()?;
    Ok((comparison, picture))
}

/// One row an extension; the explanations are measured in the extension's own basis.
fn rows(channel: Channel<'_>, chain: &Chain, seat: Seat, judgement: &Judgement, planner: &Planner) -> Result<Vec<Row>> {
    let edges = judgement.verdict.as_ref().map(|v| v.edges.as_slice()).unwrap_or_default();
    let blank = || METRICS.iter().map(|metric| (metric.key.to_owned(), Value::Null)).collect::<Map<_, _>>();
    let row = |name: &'static str, reference: bool, metrics: Map<String, Value>| {
        let edge = edges.iter().find(|edge| edge.name == name);
        Row {
            name,
            reference,
            predicted_error: edge.map(|e| e.predicted_error),
            relative_error: edge.map(|e| e.relative_error),
            bound: edge.map(|e| e.bound),
            adequacy: edge.map(|e| e.adequacy),
            trusted: edge.and_then(|e| e.trusted).map(|span| trusted_report(span, channel.axis)),
            metrics,
        }
    };
    let mut found = Vec::new();
    for (candidate, reference) in CANDIDATES.iter().map(|c| (c, false)).chain([(&ODD_ZERO, true)]) {
        let metrics = metrics_of(channel, candidate.ends.seated(seat), candidate.baseline, chain, planner)?;
        found.push(row(candidate.name, reference, metrics));
    }
    found.insert(CANDIDATES.len(), row("forecast", false, blank()));
    found.push(row("zero", true, blank()));
    found.push(row("hold", true, blank()));
    Ok(found)
}

fn metrics_of(
    channel: Channel<'_>,
    ends: Ends,
    kind: BaselineKind,
    chain: &Chain,
    planner: &Planner,
) -> Result<Map<String, Value>> {
    let scale = scale_of(chain, channel.samples.len());
    let baseline = Baseline::fit(kind, channel.samples, ends, scale)?;
    // At the mirrors of these ends: on the whole-sample seat each parity has its own.
    let estimates = EndEstimates::of(channel.samples, ends, scale);
    let subject = Subject::of(channel.samples, ends, &baseline, &estimates, planner)?;
    Ok(METRICS.iter().map(|metric| (metric.key.to_owned(), Value::from((metric.measure)(&subject)))).collect())
}
