//! Which samples a spectrum shows: the record, the record before and after its operators, or two extensions.

use std::borrow::Cow;

use crate::baseline::{Baseline, BaselineKind};
use crate::basis::Planner;
use crate::compare::Continuation;
use crate::condition::{Stage, default_baseline, scale_of};
use crate::ends::Ends;
use crate::error::Result;
use crate::job::judgement::Page;
use crate::job::preparation::prepare;
use crate::job::work;
use crate::numeric::polynomial::Polynomial;
use crate::operator::Chain;
use crate::record::{Axis, Channel};
use crate::report::ExtensionReport;
use crate::settings::{Method, Settings};
use crate::unit::Unit;

/// Samples whose spectrum is formed.
pub struct Subject<'a> {
    pub label: String,
    pub samples: Cow<'a, [f64]>,
    pub unit: Unit,
    pub axis: &'a Axis,
    pub extension: Option<ExtensionReport>,
    pub baseline: Option<String>,
    /// Ends and baseline of the coefficients.
    pub basis: (Ends, Polynomial),
}

/// True where a chain changes a record at all.
pub fn is_active(chain: &Chain) -> bool {
    !chain.is_identity()
}

/// Everything to lay over each other for one record.
pub fn subjects<'a>(
    channel: Channel<'a>,
    chain: &Chain,
    settings: &Settings,
    planner: &Planner,
) -> Result<Vec<Subject<'a>>> {
    let active = is_active(chain);
    let mut found = Vec::new();
    if active && chain.turns() == 0 && settings.spectrum.method != Method::Basis {
        found.push(plain(channel, "before".to_owned()));
    }
    let Some(against) = settings.spectrum.against else {
        found.push(last(channel, chain, settings, if active { "after" } else { "record" }, planner)?);
        return Ok(found);
    };
    found.push(named(channel, chain, settings, planner)?);
    let stage = Stage { extension: against.extension, baseline: against.baseline, ..settings.stage };
    found.push(named(channel, chain, &super::staged(settings, stage), planner)?);
    Ok(found)
}

/// What the operators make of a record, or the record itself without any, under a label.
pub fn last<'a>(
    channel: Channel<'a>,
    chain: &Chain,
    settings: &Settings,
    label: &str,
    planner: &Planner,
) -> Result<Subject<'a>> {
    if !is_active(chain) && settings.spectrum.method != Method::Basis {
        return Ok(plain(channel, label.to_owned()));
    }
    let mut subject = named(channel, chain, settings, planner)?;
    subject.label = label.to_owned();
    Ok(subject)
}

/// The same, named by its extension and baseline.
fn named<'a>(channel: Channel<'a>, chain: &Chain, settings: &Settings, planner: &Planner) -> Result<Subject<'a>> {
    let prepared = prepare(channel, &[], chain, settings, planner)?;
    let (raw, chain) = (channel, &*prepared.chain);
    let channel = Channel { samples: &prepared.samples, ..raw };
    let (chosen, _, outcome) = work::outcome(channel, chain, settings, planner, Page::Unwanted)?;
    let (extension, baseline) = work::stage_reports(&chosen, chain, settings);
    let samples: Cow<'a, [f64]> =
        if is_active(chain) { Cow::Owned(outcome.output) } else { Cow::Borrowed(raw.samples) };
    // A continued record has no basis of its own length: its output is shown in the cosines that the continuation ends in.
    let (ends, kind) = match chosen.continuation {
        Continuation::Symmetric(ends, kind) => (ends, kind),
        Continuation::Given(_) => (Ends::EVEN.seated(settings.stage.seat), BaselineKind::None),
    };
    let fitted = if is_active(chain) && chain.turns() != 0 { default_baseline(ends, chain) } else { kind };
    let basis = Baseline::fit(fitted, &samples, ends, scale_of(chain, samples.len()))?;
    let label = if baseline == "none" { extension.kind.clone() } else { format!("{} + {baseline}", extension.kind) };
    Ok(Subject {
        label,
        samples,
        unit: outcome.unit,
        axis: raw.axis,
        extension: Some(extension),
        baseline: Some(baseline),
        basis: (ends, basis.polynomial().clone()),
    })
}

fn plain(channel: Channel<'_>, label: String) -> Subject<'_> {
    let length = Ends::EVEN.length(channel.samples.len());
    Subject {
        label,
        samples: Cow::Borrowed(channel.samples),
        unit: channel.unit.clone(),
        axis: channel.axis,
        extension: None,
        baseline: None,
        basis: (Ends::EVEN, Polynomial::zero(length)),
    }
}
