//! `compare`: every extension side by side on one record, and the picture of it.

use rayon::prelude::*;
use serde_json::{Map, Value};

use crate::baseline::{Baseline, BaselineKind, EndEstimates};
use crate::basis::Planner;
use crate::compare::{self, Judgement};
use crate::condition::scale_of;
use crate::ends::Ends;
use crate::error::Result;
use crate::job::intake;
use crate::job::picture::{Scene, draw};
use crate::job::preparation::prepare;
use crate::job::repairs;
use crate::job::work;
use crate::metric::{METRICS, Subject};
use crate::operator::Chain;
use crate::read::Input;
use crate::record::Channel;
use crate::report::{self, ChannelComparison, Comparison, InputReport, Jump, Picture, Row, SCHEMA, Tool};
use crate::settings::Settings;
use crate::verdict::{CANDIDATES, ODD_ZERO};

/// Compares the extensions of every channel; pictures are made where they are wanted.
///
/// # Errors
/// Whatever stops reading or resolving.
pub fn compare(input: Input, settings: &Settings, pictures: bool) -> Result<(Comparison, Vec<Picture>)> {
    let intake = intake::take(input, settings)?;
    let record = &intake.record;
    let (chain, mut remarks) = Chain::resolve(&settings.requests, &settings.shape, record.axis(), record.len())?;
    remarks.extend(repairs::near_ends_of(&intake, &chain));
    intake::refuse_notes(settings, &remarks)?;
    let planner = Planner::new();
    let channels: Vec<Channel<'_>> = record.channels().collect();
    let compared: Vec<(ChannelComparison, Option<Picture>)> = channels
        .par_iter()
        .map(|channel| one(*channel, &chain, settings, &planner, pictures))
        .collect::<Result<_>>()?;
    let (channels, pictures): (Vec<_>, Vec<_>) = compared.into_iter().unzip();
    let requirement_met = settings.require.is_none_or(|required| {
        channels.iter().all(|c: &ChannelComparison| {
            c.verdict.as_ref().and_then(|v| v.adequacy).is_some_and(|found| found <= required)
        })
    });
    let report = Comparison {
        schema: SCHEMA,
        tool: Tool::THIS,
        command: "compare",
        settings: settings.to_map(),
        input: InputReport::new(&intake.outline.source, record.axis()),
        notes: record.findings().iter().cloned().chain(remarks).collect(),
        chain: chain.describe(record.axis()),
        channels,
        requirement_met,
        caution: report::caution(&chain),
    };
    Ok((report, pictures.into_iter().flatten().collect()))
}

fn one(
    channel: Channel<'_>,
    chain: &Chain,
    settings: &Settings,
    planner: &Planner,
    picture: bool,
) -> Result<(ChannelComparison, Option<Picture>)> {
    let prepared = prepare(channel, chain, planner)?;
    let channel = Channel { samples: &prepared.samples, ..channel };
    let chain = &prepared.chain.on_own_grid();
    let judgement = compare::judge(channel, chain, settings.stage.seat, &settings.tolerance, planner)?;
    let chosen = compare::choose(channel.samples, chain, &settings.stage, &settings.assertion, Some(&judgement))?;
    let edge = work::edge_of(&chosen, Some(&judgement));
    let unit = channel.unit.turned(chain.turns(), channel.axis.unit()).0;
    let verdict = work::verdict_report(channel, &unit, settings, Some(&judgement), edge);
    let comparison = ChannelComparison {
        name: channel.name.to_owned(),
        unit,
        unit_in: channel.unit.clone(),
        takes: chosen.name.clone(),
        verdict,
        candidates: rows(channel, chain, &judgement, planner)?,
        edge: Some(judgement.estimates),
        jump: Some(Jump::of(&judgement.estimates)),
        trusted: edge
            .and_then(|edge| edge.trusted)
            .map(|span| work::trusted_report(span.first, span.last, channel.axis)),
    };
    let scene = Scene {
        takes: &comparison.takes,
        unit: &comparison.unit,
        trusted: comparison.trusted,
        sentence: sentence_of(&comparison),
    };
    let picture = picture.then(|| draw(channel, chain, settings, &judgement, &scene, planner)).transpose()?;
    Ok((comparison, picture.flatten()))
}

fn sentence_of(comparison: &ChannelComparison) -> &str {
    comparison.verdict.as_ref().map_or("", |verdict| verdict.sentence.as_str())
}

/// One row an extension; the explanations are measured in the extension's own basis.
fn rows(channel: Channel<'_>, chain: &Chain, judgement: &Judgement, planner: &Planner) -> Result<Vec<Row>> {
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
            trusted: edge.and_then(|e| e.trusted).map(|span| work::trusted_report(span.first, span.last, channel.axis)),
            metrics,
        }
    };
    let mut found = Vec::new();
    for (candidate, reference) in CANDIDATES.iter().map(|c| (c, false)).chain([(&ODD_ZERO, true)]) {
        let metrics = metrics_of(channel, candidate.ends, candidate.baseline, chain, &judgement.estimates, planner)?;
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
    estimates: &EndEstimates,
    planner: &Planner,
) -> Result<Map<String, Value>> {
    let baseline = Baseline::fit(kind, channel.samples, ends, scale_of(chain, channel.samples.len()))?;
    let subject = Subject::of(channel.samples, ends, &baseline, estimates, planner)?;
    Ok(METRICS.iter().map(|metric| (metric.key.to_owned(), Value::from((metric.measure)(&subject)))).collect())
}
