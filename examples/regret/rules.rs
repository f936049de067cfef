//! The rules to be scored, and their errors at the edges.

use std::collections::BTreeMap;

use endgrain::baseline::{Baseline, BaselineKind, Side};
use endgrain::ends::Ends;
use endgrain::forecast::{Evidence, Forecast, Response, Shape};
use endgrain::numeric::polynomial::Polynomial;
use endgrain::numeric::{noise, sum};
use endgrain::verdict::{
    self, Adequacy, CANDIDATES, Case, Edge, Extension, FlatEnds, Formed, Level, Past, Structure, Tolerance, Unjudged,
    Verdict,
};
use rayon::prelude::*;

use crate::operators::{self, Trial};
use crate::output::{extended, padded, with_baseline};
use crate::records::Window;

/// What one case gives.
pub struct Score {
    pub operator: &'static str,
    pub group: String,
    pub file: String,
    pub len: usize,
    /// Error of every fixed extension; the first `HINDSIGHT` are the reference.
    pub fixed: Vec<(&'static str, f64)>,
    pub level: Level,
    pub choice_immaterial: bool,
    /// Predicted RMS distance from even to the forecast.
    pub even_distance: f64,
    /// Largest error among the ties, relative to the output's standard deviation.
    pub worst_tie: f64,
    /// The symmetric pick, the forecast, and what `auto` takes.
    pub chosen: [Chosen; 3],
}

/// One judged extension and what it really costs.
pub struct Chosen {
    pub name: &'static str,
    pub error: f64,
    pub edge: Edge,
    /// Standard deviation that relative figures refer to.
    pub deviation: f64,
    /// At each end: share of the reach that is trimmed, and whether the rest keeps to the tolerance.
    pub sides: [(f64, bool); 2],
}

/// The number of symmetric candidates that the best in hindsight is taken from.
pub const HINDSIGHT: usize = 14;

/// The trial's tolerance, as a share of the output's standard deviation.
pub const TOLERANCE: f64 = 0.10;

pub fn score_all(windows: &[Window], wanted: Option<&str>, fine: bool) -> Vec<Score> {
    let per_window: Vec<Vec<Score>> = windows.par_iter().map(|window| score_window(window, wanted, fine)).collect();
    per_window.into_iter().flatten().collect()
}

fn score_window(window: &Window, wanted: Option<&str>, fine: bool) -> Vec<Score> {
    // One set of fits serves every operator with the same block length.
    let mut evidence: BTreeMap<usize, (Option<Evidence>, Structure)> = BTreeMap::new();
    operators::trials(window.len, fine)
        .filter(|trial| wanted.is_none_or(|name| trial.name == name))
        .map(|trial| {
            let block = Evidence::block_length(trial.shortest);
            let (evidence, structure) = evidence.entry(block).or_insert_with(|| {
                let evidence = Evidence::gather(window.samples(), block);
                let structure = evidence.as_ref().map(verdict::structure).unwrap_or_default();
                (evidence, structure)
            });
            score_case(window, &trial, evidence.as_ref(), *structure)
        })
        .collect()
}

fn score_case(window: &Window, trial: &Trial, evidence: Option<&Evidence>, structure: Structure) -> Score {
    let x = window.samples();
    let n = x.len();
    let shape = Shape { gain: &*trial.gain, turns: 0, shortest_wavelength: trial.shortest };
    let response = Response::of(shape, n);
    let zone = response.zone(n);
    let truth = extended(trial, Ends::EVEN, &window.whole)[window.start..window.start + n].to_vec();
    let floor = 1e-4 * sum::standard_deviation(&truth);
    let error = |y: &[f64]| edge_rms(y, &truth, zone).max(floor);

    let estimates = verdict::estimates(x, &response, noise::sigma(x));
    let (left, right) = (estimates.left, estimates.right);
    let length = n as f64;
    let scale = endgrain::baseline::Scale { shortest_wavelength: trial.shortest, zone };
    let kind = |ends, kind| match Baseline::fit(kind, x, ends, scale) {
        Ok(baseline) => with_baseline(trial, ends, baseline.polynomial(), x),
        Err(_) => vec![f64::NAN; n],
    };
    let powers = |ends, powers: &[f64]| with_baseline(trial, ends, &Polynomial::from_powers(length, powers), x);
    // Through the first and last sample: positions 1/2 and N - 1/2.
    let chord = if n > 1 { (x[n - 1] - x[0]) / (length - 1.0) } else { 0.0 };
    let mut outputs: Vec<(&'static str, Vec<f64>)> =
        CANDIDATES.iter().map(|c| (c.name, kind(c.ends, c.baseline))).collect();
    outputs.extend([
        ("periodic-line", kind(Ends::Periodic, BaselineKind::Line)),
        ("odd-zero", kind(Ends::ODD, BaselineKind::None)),
        ("odd first/last", powers(Ends::ODD, &[x[0] - 0.5 * chord, chord])),
        ("even-odd slope", powers(Ends::EVEN_ODD, &[right.value - left.slope * length, left.slope])),
        ("odd-even slope", powers(Ends::ODD_EVEN, &[left.value, right.slope])),
        ("even-odd value", powers(Ends::EVEN_ODD, &[right.value])),
        ("odd-even value", powers(Ends::ODD_EVEN, &[left.value])),
    ]);
    let pad = response.reach().max(8).min(n);
    outputs.push(("zero", padded(trial, x, &vec![0.0; n], &vec![0.0; n])));
    outputs.push(("hold", padded(trial, x, &vec![x[0]; pad], &vec![x[n - 1]; pad])));

    let output = |extension: Extension| match extension {
        Extension::Symmetric(candidate) => kind(candidate.ends, candidate.baseline),
        Extension::Continued { left, right } => padded(trial, x, left, right),
    };
    let tolerance = Tolerance::Share(TOLERANCE);
    let forecast = evidence.map(|evidence| Forecast::combine(evidence, &response));
    let foretold =
        forecast.as_ref().map(|f| padded(trial, x, &f.continuation(Side::Left), &f.continuation(Side::Right)));
    let past = match (evidence, &forecast, &foretold) {
        (Some(evidence), Some(forecast), Some(foretold)) => Ok(Past { evidence, forecast, foretold }),
        _ => Err(Unjudged::FewBlocks),
    };
    let case = Case {
        samples: x,
        past,
        structure,
        estimates,
        response: &response,
        output: &output,
        formed: Formed::InOnePass,
        tolerance,
    };
    let verdict = Verdict::of(&case, FlatEnds::Ignored);
    outputs.push(("forecast", foretold.unwrap_or_else(|| vec![f64::NAN; n])));

    let chosen = |name: &'static str| {
        let y = outputs.iter().find(|(other, _)| *other == name).map_or(&outputs[0].1, |(_, y)| y);
        let edge = verdict.edge(name).cloned().unwrap_or(Edge {
            name: name.into(),
            predicted_error: f64::NAN,
            relative_error: f64::NAN,
            bound: f64::INFINITY,
            adequacy: Adequacy::Outside,
            trusted: None,
        });
        let sides = sides(y, &truth, &edge, response.trimmable(n), TOLERANCE * verdict.output_deviation);
        Chosen { name, error: error(y), edge, deviation: verdict.output_deviation, sides }
    };
    let ties = outputs.iter().filter(|(name, _)| verdict.pick.ties.contains(name));
    let worst_tie = ties.map(|(_, y)| error(y)).fold(0.0, f64::max) / verdict.output_deviation;
    Score {
        operator: trial.name,
        group: window.group.clone(),
        file: window.file.clone(),
        len: n,
        level: verdict.pick.level,
        even_distance: verdict.distances.first().copied().unwrap_or(f64::NAN),
        choice_immaterial: verdict.pick.choice_immaterial,
        worst_tie,
        chosen: [chosen(verdict.pick.name), chosen("forecast"), chosen(verdict.auto.name())],
        fixed: outputs.iter().map(|(name, y)| (*name, error(y))).collect(),
    }
}

/// RMS difference over both edge zones together.
fn edge_rms(y: &[f64], truth: &[f64], zone: usize) -> f64 {
    let n = y.len();
    let squares = |range: std::ops::Range<usize>| range.map(|j| (y[j] - truth[j]).powi(2)).sum::<f64>();
    ((squares(0..zone) + squares(n - zone..n)) / (2 * zone) as f64).sqrt()
}

/// Trimmed share of the reach at each end, and whether every sample left within the reach keeps to the tolerance.
fn sides(y: &[f64], truth: &[f64], edge: &Edge, trimmable: usize, tolerance: f64) -> [(f64, bool); 2] {
    let n = y.len();
    let trimmed = edge.trusted.map_or([trimmable; 2], |t| [t.first, n - 1 - t.last]);
    let keeps = |trim: usize, at: &dyn Fn(usize) -> usize| {
        (trim..trimmable).all(|j| (y[at(j)] - truth[at(j)]).abs() <= tolerance)
    };
    let ok = [keeps(trimmed[0], &|j| j), keeps(trimmed[1], &|j| n - 1 - j)];
    [0, 1].map(|side| (trimmed[side] as f64 / trimmable.max(1) as f64, ok[side]))
}
