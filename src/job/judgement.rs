//! What a run takes past the ends of a channel, what it was judged by, and what is reported of that.

use crate::basis::Planner;
use crate::compare::{self, Chosen, Continuation, EndStanding, Judgement, Standing};
use crate::condition::{ExtensionChoice, condition, condition_continued};
use crate::error::{Finding, Result};
use crate::numeric::sum;
use crate::operator::Chain;
use crate::place::Place;
use crate::record::{Axis, Channel};
use crate::report::{TrustedReport, VerdictReport};
use crate::settings::{Edges, Settings};
use crate::unit::Unit;
use crate::verdict::{Edge, Trusted, Unjudged};

/// The choice of a channel with all that is known about it.
pub struct Judged {
    /// The continuation in use.
    pub chosen: Chosen,
    /// What it rests on; `None` where nothing asked for a verdict.
    pub judgement: Option<Judgement>,
    /// What it costs at the edges.
    pub edge: Option<Edge>,
    /// Why that is not known.
    pub unjudged: Option<Unjudged>,
    /// How the assertions stand, end by end.
    pub standings: Vec<EndStanding>,
}

/// Whether a page will show what was done: then every channel is judged, and its lines are kept.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Page {
    Wanted,
    Unwanted,
}

/// The continuation of a channel, and the judgement it rests on. A named extension without `--require`, a tolerance or
/// treatment of the edges is taken as it is: nothing then asks for a verdict.
///
/// # Errors
/// Those of `compare::choose` and `compare::judge`.
pub fn choose(
    channel: Channel<'_>,
    chain: &Chain,
    settings: &Settings,
    planner: &Planner,
    page: Page,
) -> Result<(Chosen, Option<Judgement>)> {
    compare::refuse_contradictions(&settings.stage, &settings.assertion, chain)?;
    let fixed = matches!(settings.stage.extension, ExtensionChoice::Fixed(_));
    let edges_matter =
        settings.require.is_some() || settings.is_given("tolerance") || settings.edges != Edges::default();
    let asked = edges_matter || !settings.assertion.is_empty() || page == Page::Wanted;
    let judgement = (asked || !fixed && !chain.is_identity())
        .then(|| compare::judge(channel, chain, settings.stage.seat, &settings.tolerance, planner))
        .transpose()?;
    let chosen = compare::choose(channel.samples, chain, &settings.stage, &settings.assertion, judgement.as_ref())?;
    Ok((chosen, judgement))
}

impl Judged {
    /// Of a channel on its own grid; the choice is conditioned only where the verdict has no row for it.
    ///
    /// # Errors
    /// Those of `condition`.
    pub fn of(
        channel: Channel<'_>,
        chain: &Chain,
        settings: &Settings,
        chosen: Chosen,
        judgement: Option<Judgement>,
        planner: &Planner,
    ) -> Result<Judged> {
        let known = judgement.as_ref().is_none_or(|judgement| judgement.row(&chosen).is_some());
        let output = match &chosen.continuation {
            _ if known => Vec::new(),
            Continuation::Symmetric(ends, baseline) => {
                condition(channel, &chain.on_own_grid(), *ends, *baseline, planner)?.output
            }
            Continuation::Given([left, right]) => {
                condition_continued(channel, &chain.on_own_grid(), left, right, settings.stage.seat, planner)?.output
            }
        };
        Ok(Judged::by_output(channel, settings, chosen, judgement, &output))
    }

    /// From the output that the choice led to.
    pub fn by_output(
        channel: Channel<'_>,
        settings: &Settings,
        chosen: Chosen,
        judgement: Option<Judgement>,
        output: &[f64],
    ) -> Judged {
        let standings =
            |judgement: &Judgement| settings.assertion.standings(judgement, sum::standard_deviation(channel.samples));
        let known = judgement.as_ref();
        Judged {
            edge: known.and_then(|judgement| judgement.cost(&chosen, output)),
            unjudged: known.and_then(|judgement| judgement.unjudged_under(&chosen, channel.samples)),
            standings: known.filter(|_| !settings.assertion.is_empty()).map(standings).unwrap_or_default(),
            chosen,
            judgement,
        }
    }

    /// The trusted span of what is used.
    pub fn trusted(&self, axis: &Axis) -> Option<TrustedReport> {
        self.edge.as_ref().and_then(|edge| edge.trusted).map(|span| trusted_report(span, axis))
    }

    /// Remarks: an assertion that the record speaks against, an extension that was asked for and could not be had.
    pub fn notes(&self, channel: Channel<'_>, settings: &Settings) -> Vec<Finding> {
        let against = |standing: &&EndStanding| standing.standing == Standing::Contradicted;
        let mut notes: Vec<Finding> = self
            .standings
            .iter()
            .filter(against)
            .map(|found| format!("the record speaks against --assert {found}"))
            .map(|text| Finding::new("assertion_contradicted", text))
            .collect();
        // A closed record is one assertion about both ends.
        notes.dedup();
        let asked = settings.stage.extension;
        let rests_on_verdict = matches!(asked, ExtensionChoice::Forecast | ExtensionChoice::Symmetric);
        if let (true, Some(reason)) = (rests_on_verdict, self.unjudged.filter(|reason| !reason.is_harmless())) {
            let text = format!("--extension {asked} has nothing to rest on: {reason}; {} is used", self.chosen.name);
            notes.push(Finding::new("extension_not_judged", text));
        }
        notes.into_iter().map(|note| note.at(Place::channel(channel.name))).collect()
    }

    /// The verdict as a report: its sentence ends with the cost of the extension in use.
    pub fn verdict(&self, channel: Channel<'_>, unit: &Unit) -> Option<VerdictReport> {
        let verdict = self.judgement.as_ref()?.verdict.as_ref()?;
        let edge = self.edge.as_ref();
        let mut sentence = verdict.pick_sentence();
        if let Some(edge) = edge {
            if let Some(pick) = verdict.edge(verdict.pick.name).filter(|pick| pick.name != edge.name) {
                sentence = format!("{sentence} ({} would cost {})", pick.name, verdict.cost(pick, unit));
            }
            sentence = format!("{sentence}; {}: {}", edge.name, verdict.edge_sentence(edge, unit, channel.axis));
        } else {
            sentence = format!("{sentence}; {} is used", self.chosen.name);
        }
        if !self.standings.is_empty() {
            sentence = format!("{sentence}; asserted {} by this record", compare::standings_text(&self.standings));
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
            assertion: self.standings.iter().map(|found| found.standing).max(),
            sentence,
        })
    }
}

/// A trusted span with its stamps.
pub fn trusted_report(span: Trusted, axis: &Axis) -> TrustedReport {
    TrustedReport { first: span.first, last: span.last, from: axis.stamp(span.first), to: axis.stamp(span.last) }
}
