//! `spectrum`: what a record, or two, or a record before and after its operators, holds at every frequency.

mod density;
mod overlay;
mod reading;

use rayon::prelude::*;

use crate::audit::level::Level;
use crate::basis::Planner;
use crate::condition::Stage;
use crate::error::{Error, Finding, Result};
use crate::job::chain;
use crate::job::intake::{self, Intake};
use crate::operator::Chain;
use crate::place::Place;
use crate::read::Input;
use crate::record::{Channel, Record};
use crate::report::{ChannelSpectrum, InputReport, SCHEMA, SPECTRUM_CAUTION, SpectrumReport, Tool, Trace};
use crate::settings::{Method, Settings};

use overlay::Subject;

/// The spectrum of a record, or of two laid over each other.
///
/// With operators a record stands beside what they make of it, where both have one unit. A second record is paired channel by
/// channel: by name, or by order where no name is shared.
///
/// # Errors
/// Whatever stops reading or resolving; `Usage` for options that do not go together; `Unsupported` where the record is too
/// short for what is asked.
pub fn spectrum(first: Input, second: Option<Input>, settings: &Settings) -> Result<SpectrumReport> {
    check(settings, second.is_some())?;
    let planner = Planner::new();
    let first = Taken::of(first, settings)?;
    let second = second.map(|input| Taken::of(input, settings)).transpose()?;
    let pairs = match &second {
        Some(second) => paired(&first.intake.record, &second.intake.record)?,
        None => vec![None; first.intake.record.channel_count()],
    };
    let channels: Vec<Channel<'_>> = first.intake.record.channels().collect();
    let mut spectra: Vec<ChannelSpectrum> = channels
        .par_iter()
        .zip(&pairs)
        .filter(|(_, pair)| second.is_none() || pair.is_some())
        .map(|(channel, pair)| {
            let other = second.as_ref().zip(*pair).map(|(taken, index)| (taken, taken.intake.record.channel(index)));
            one(*channel, &first, other, settings, &planner).map_err(|error| error.at(Place::channel(channel.name)))
        })
        .collect::<Result<_>>()?;
    let axis = first.intake.record.axis();
    let mut notes: Vec<Finding> = first.notes.clone();
    if let Some(second) = &second {
        let place = Place::file(&second.intake.outline.source.path);
        notes.extend(second.notes.iter().map(|note| note.clone().at(place.clone())));
    }
    notes.extend(shared_notes(&mut spectra));
    intake::refuse_notes(settings, &notes)?;
    intake::refuse_notes(settings, &spectra.iter().flat_map(|s| s.notes.clone()).collect::<Vec<_>>())?;
    Ok(SpectrumReport {
        schema: SCHEMA,
        tool: Tool::THIS,
        command: "spectrum",
        settings: settings.to_map(),
        input: InputReport::new(&first.intake.outline.source, axis),
        second: second.as_ref().map(|s| InputReport::new(&s.intake.outline.source, s.intake.record.axis())),
        notes,
        chain: first.chain.describe(axis),
        channels: spectra,
        outputs: Vec::new(),
        caution: SPECTRUM_CAUTION,
    })
}

/// Takes out the remarks that every channel of several has in common: they are told once.
fn shared_notes(spectra: &mut [ChannelSpectrum]) -> Vec<Finding> {
    let [first, others @ ..] = spectra else { return Vec::new() };
    if others.is_empty() {
        return Vec::new();
    }
    let same = |a: &Finding, b: &Finding| a.code == b.code && a.text == b.text;
    let is_shared = |note: &&Finding| others.iter().all(|other| other.notes.iter().any(|n| same(n, note)));
    let shared: Vec<Finding> = first.notes.iter().filter(is_shared).cloned().collect();
    for channel in spectra {
        channel.notes.retain(|note| !shared.iter().any(|other| same(other, note)));
    }
    shared.into_iter().map(|note| Finding::new(note.code, format!("every channel: {}", note.text))).collect()
}

/// A record ready for its spectrum.
struct Taken {
    intake: Intake,
    chain: Chain,
    notes: Vec<Finding>,
}

impl Taken {
    fn of(input: Input, settings: &Settings) -> Result<Taken> {
        let intake = intake::take(input, settings)?;
        let record = &intake.record;
        let (chain, remarks) = chain::of(record, settings)?;
        intake::refuse_notes(settings, &remarks)?;
        if chain.treatments().resampling.is_some() {
            return Err(Error::usage("--resample and --decimate: a spectrum is formed on the record's own grid")
                .remedy("condition the record first"));
        }
        if (0..record.channel_count()).any(|index| !record.missing(index).is_empty()) {
            return Err(Error::usage("--gaps smooth: a spectrum needs every sample").remedy("use --gaps fill"));
        }
        let notes = record.findings().iter().cloned().chain(remarks).collect();
        Ok(Taken { intake, chain, notes })
    }

    fn path(&self) -> &str {
        &self.intake.outline.source.path
    }
}

/// Options that do not go together.
fn check(settings: &Settings, two: bool) -> Result<()> {
    let options = &settings.spectrum;
    let basis = options.method == Method::Basis;
    if basis && (!options.bands.is_empty() || options.octaves.is_some() || options.road) {
        return Err(Error::usage("--band, --octaves and --road are read from a density, not from coefficients")
            .remedy("use --method welch or sine"));
    }
    if options.against.is_some() && two {
        return Err(Error::usage("two records and two extensions cannot be laid over each other at once")
            .remedy("leave out --against or the second file"));
    }
    if options.against.is_some() && !basis && settings.requests.is_empty() {
        return Err(Error::usage(
            "--against changes nothing here: a density without operators assumes nothing about the ends",
        )
        .remedy("use --method basis, or give operators such as --lowpass 40Hz"));
    }
    Ok(())
}

/// The channel of the second record that belongs to each of the first.
fn paired(first: &Record, second: &Record) -> Result<Vec<Option<usize>>> {
    if first.axis().is_time() != second.axis().is_time() {
        return Err(Error::usage("one record runs along time, the other along length"));
    }
    let by_name: Vec<Option<usize>> =
        first.channels().map(|a| second.channels().position(|b| a.name == b.name)).collect();
    if by_name.iter().any(Option::is_some) {
        return Ok(by_name);
    }
    if first.channel_count() == second.channel_count() {
        return Ok((0..first.channel_count()).map(Some).collect());
    }
    Err(Error::usage("the two records share no channel name and differ in the number of channels")
        .remedy("choose the channels with --channel"))
}

fn one(
    channel: Channel<'_>,
    first: &Taken,
    other: Option<(&Taken, Channel<'_>)>,
    settings: &Settings,
    planner: &Planner,
) -> Result<ChannelSpectrum> {
    let mut subjects = Vec::new();
    match other {
        Some((second, partner)) => {
            subjects.push(overlay::last(channel, &first.chain, settings, first.path(), planner)?);
            subjects.push(overlay::last(partner, &second.chain, settings, second.path(), planner)?);
        }
        None => subjects.extend(overlay::subjects(channel, &first.chain, settings, planner)?),
    }
    let mut notes = Vec::new();
    let mut traces = Vec::new();
    for subject in &subjects {
        traces.push(trace(subject, settings, planner, &mut notes)?);
    }
    let ratio = match traces.as_slice() {
        [below, above] if other.is_some() => density::ratio(above, below, settings.spectrum.confidence),
        _ => None,
    };
    if other.is_some() && ratio.is_none() && settings.spectrum.method != Method::Basis {
        let text = "the two densities differ in unit or spacing: no ratio is formed (give --segment as a duration)";
        notes.push(Finding::new("no_ratio", text));
    }
    notes.dedup();
    let place = Place::channel(channel.name);
    let active = overlay::is_active(&first.chain);
    let gain = active.then(|| {
        let step = channel.axis.step_base();
        frequencies(&traces[0]).iter().map(|f| first.chain.gain((f * step).min(0.5))).collect()
    });
    Ok(ChannelSpectrum {
        name: channel.name.to_owned(),
        traces,
        gain,
        ratio,
        notes: notes.into_iter().map(|note| note.at(place.clone())).collect(),
    })
}

fn frequencies(trace: &Trace) -> &[f64] {
    let density = trace.density.as_ref().and_then(|density| density.series.as_ref());
    let coefficients = trace.coefficients.as_ref().and_then(|found| found.series.as_ref());
    density
        .map(|series| series.frequency.as_slice())
        .or(coefficients.map(|s| s.frequency.as_slice()))
        .unwrap_or_default()
}

fn trace(subject: &Subject<'_>, settings: &Settings, planner: &Planner, notes: &mut Vec<Finding>) -> Result<Trace> {
    let mut trace = Trace {
        label: subject.label.clone(),
        unit: subject.unit.clone(),
        extension: subject.extension.clone(),
        baseline: subject.baseline.clone(),
        level: Level::of(&subject.samples),
        density: None,
        coefficients: None,
        lines: Vec::new(),
        bands: Vec::new(),
        octaves: Vec::new(),
        road: None,
    };
    if settings.spectrum.method == Method::Basis {
        trace.coefficients = Some(reading::coefficients(subject, planner)?);
        return Ok(trace);
    }
    let (found, report) = density::density(subject, settings, planner, notes)?;
    trace.density = Some(report);
    reading::read(subject, &found, settings, planner, &mut trace, notes)?;
    Ok(trace)
}

/// The stage of the settings with another extension in it.
fn staged(settings: &Settings, stage: Stage) -> Settings {
    let mut other = settings.clone();
    other.stage = stage;
    other.assertion = Default::default();
    other
}
