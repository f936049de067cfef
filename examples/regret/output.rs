//! The operator over a whole record under each kind of extension, formed on the explicit extension.

use endgrain::ends::Ends;
use endgrain::numeric::fourier;
use endgrain::numeric::polynomial::Polynomial;

use crate::operators::Trial;

/// The operator over a record extended by `ends`.
pub fn extended(trial: &Trial, ends: Ends, x: &[f64]) -> Vec<f64> {
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
pub fn with_baseline(trial: &Trial, ends: Ends, baseline: &Polynomial, x: &[f64]) -> Vec<f64> {
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
pub fn padded(trial: &Trial, x: &[f64], left: &[f64], right: &[f64]) -> Vec<f64> {
    let line: Vec<f64> = left.iter().rev().chain(x).chain(right).copied().collect();
    extended(trial, Ends::EVEN, &line)[left.len()..left.len() + x.len()].to_vec()
}
