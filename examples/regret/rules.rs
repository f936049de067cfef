//! The rules to be scored, and their errors at the edges.

use std::collections::BTreeMap;

use endgrain::baseline::{Baseline, BaselineKind, EndEstimates, Scale, Side};
use endgrain::ends::Ends;
use endgrain::forecast::{Evidence, Forecast, Response, Shape};
use endgrain::numeric::polynomial::Polynomial;
use endgrain::numeric::{fourier, sum};
use rayon::prelude::*;

use crate::operators::{self, Trial};
use crate::records::Window;

/// What one case gives.
pub struct Score {
    pub operator: &'static str,
    pub group: String,
    pub file: String,
    pub len: usize,
    /// Predicted error of the forecast.
    pub predicted: f64,
    /// Named errors; the first `HINDSIGHT` are the reference.
    pub errors: Vec<(&'static str, f64)>,
}

/// The number of symmetric candidates that the best in hindsight is taken from.
pub const HINDSIGHT: usize = 14;

pub fn score_all(windows: &[Window], wanted: Option<&str>, fine: bool) -> Vec<Score> {
    let per_window: Vec<Vec<Score>> = windows.par_iter().map(|window| score_window(window, wanted, fine)).collect();
    per_window.into_iter().flatten().collect()
}

fn score_window(window: &Window, wanted: Option<&str>, fine: bool) -> Vec<Score> {
    // One set of fits serves every operator with the same block length.
    let mut evidence: BTreeMap<usize, Option<Evidence>> = BTreeMap::new();
    operators::trials(window.len, fine)
        .filter(|trial| wanted.is_none_or(|name| trial.name == name))
        .map(|trial| {
            let block = Evidence::block_length(trial.shortest);
            let evidence = evidence.entry(block).or_insert_with(|| Evidence::gather(window.samples(), block));
            score_case(window, &trial, evidence.as_ref())
        })
        .collect()
}

fn score_case(window: &Window, trial: &Trial, evidence: Option<&Evidence>) -> Score {
    let x = window.samples();
    let n = x.len();
    let shape = Shape { gain: &*trial.gain, turns: 0, shortest_wavelength: trial.shortest };
    let response = Response::on_grid(shape, 4 * n);
    let zone = response.zone(n);
    let truth = extended(trial, Ends::EVEN, &window.whole)[window.start..window.start + n].to_vec();
    let floor = 1e-4 * sum::standard_deviation(&truth);
    let error = |y: &[f64]| edge_rms(y, &truth, zone).max(floor);

    let scale = Scale { shortest_wavelength: trial.shortest, zone };
    let found = EndEstimates::of(x, Ends::EVEN, scale);
    let (left, right) = (found.left, found.right);
    let length = n as f64;
    let kind = |ends, kind| match Baseline::fit(kind, x, ends, scale) {
        Ok(baseline) => with_baseline(trial, ends, baseline.polynomial(), x),
        Err(_) => vec![f64::NAN; n],
    };
    let powers = |ends, powers: &[f64]| with_baseline(trial, ends, &Polynomial::from_powers(length, powers), x);
    // Through the first and last sample: positions 1/2 and N - 1/2.
    let chord = if n > 1 { (x[n - 1] - x[0]) / (length - 1.0) } else { 0.0 };
    let mut errors = vec![
        ("even", error(&kind(Ends::EVEN, BaselineKind::None))),
        ("periodic", error(&kind(Ends::Periodic, BaselineKind::None))),
        ("even-slope", error(&kind(Ends::EVEN, BaselineKind::Slopes))),
        ("odd-ends", error(&kind(Ends::ODD, BaselineKind::Line))),
        ("odd-mean", error(&kind(Ends::ODD, BaselineKind::Mean))),
        ("even-odd", error(&kind(Ends::EVEN_ODD, BaselineKind::Level(Some(Side::Right))))),
        ("odd-even", error(&kind(Ends::ODD_EVEN, BaselineKind::Level(Some(Side::Left))))),
        ("periodic-line", error(&kind(Ends::Periodic, BaselineKind::Line))),
        ("odd-zero", error(&kind(Ends::ODD, BaselineKind::None))),
        ("odd first/last", error(&powers(Ends::ODD, &[x[0] - 0.5 * chord, chord]))),
        ("even-odd slope", error(&powers(Ends::EVEN_ODD, &[right.value - left.slope * length, left.slope]))),
        ("odd-even slope", error(&powers(Ends::ODD_EVEN, &[left.value, right.slope]))),
        ("even-odd value", error(&powers(Ends::EVEN_ODD, &[right.value]))),
        ("odd-even value", error(&powers(Ends::ODD_EVEN, &[left.value]))),
    ];
    let pad = response.reach().max(8).min(n);
    errors.push(("zero", error(&padded(trial, x, &vec![0.0; n], &vec![0.0; n]))));
    errors.push(("hold", error(&padded(trial, x, &vec![x[0]; pad], &vec![x[n - 1]; pad]))));
    let forecast = evidence.map(|e| Forecast::combine(e, &response));
    let foretold = forecast.as_ref().map(|f| padded(trial, x, &f.continuation(Side::Left), &f.continuation(Side::Right)));
    errors.push(("forecast", foretold.as_ref().map_or(f64::NAN, |y| error(y))));
    let predicted = forecast.as_ref().map_or(f64::NAN, |f| f.predicted_error().max(floor));
    Score { predicted, operator: trial.name, group: window.group.clone(), file: window.file.clone(), len: n, errors }
}

/// RMS difference over both edge zones together.
fn edge_rms(y: &[f64], truth: &[f64], zone: usize) -> f64 {
    let n = y.len();
    let squares = |range: std::ops::Range<usize>| range.map(|j| (y[j] - truth[j]).powi(2)).sum::<f64>();
    ((squares(0..zone) + squares(n - zone..n)) / (2 * zone) as f64).sqrt()
}

/// The operator over a record extended by `ends`.
fn extended(trial: &Trial, ends: Ends, x: &[f64]) -> Vec<f64> {
    let n = x.len();
    let period = match ends {
        Ends::Periodic => n,
        Ends::Mirror { left, right, .. } => n * if left == right { 2 } else { 4 },
    };
    let mut line: Vec<f64> =
        (0..period as i64).map(|i| ends.fold(n, i).map_or(0.0, |(at, sign)| sign * x[at])).collect();
    fourier::filter(&mut line, &trial.gain, 0);
    line.truncate(n);
    line
}

/// The baseline is split off, the remainder extended, and what the operator makes of the baseline put back.
fn with_baseline(trial: &Trial, ends: Ends, baseline: &Polynomial, x: &[f64]) -> Vec<f64> {
    let rest: Vec<f64> = x.iter().enumerate().map(|(j, v)| v - baseline.at(j as f64 + 0.5)).collect();
    let mut y = extended(trial, ends, &rest);
    let [value, bend] = trial.at_zero;
    let carried = baseline.scaled(value).plus(&baseline.derivative().derivative().scaled(-0.5 * bend));
    for (j, v) in y.iter_mut().enumerate() {
        *v += carried.at(j as f64 + 0.5);
    }
    y
}

/// The operator over the record with given continuations (outwards from each end), even beyond.
fn padded(trial: &Trial, x: &[f64], left: &[f64], right: &[f64]) -> Vec<f64> {
    let line: Vec<f64> = left.iter().rev().chain(x).chain(right).copied().collect();
    extended(trial, Ends::EVEN, &line)[left.len()..left.len() + x.len()].to_vec()
}
