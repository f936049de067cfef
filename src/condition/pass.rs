//! One pass of the chain over one channel: baseline off, transform, multiply, back, baseline carried and added.

use realfft::num_complex::Complex;

use super::blocks::{self, Layout};
use crate::baseline::Baseline;
use crate::basis::grid::{self, Grid};
use crate::basis::{Planner, series};
use crate::ends::{Ends, Parity};
use crate::error::Result;
use crate::integral::Arrival;
use crate::numeric::polynomial::Polynomial;
use crate::numeric::sum;
use crate::operator::{Pass, Resampling, Start};

/// What a pass made of a record.
#[derive(Debug, Clone)]
pub struct Passed {
    /// The output at the record's own sample positions, per step^turns (see `apply`).
    pub output: Vec<f64>,
    /// Relative difference between the energy of the remainder and that of its coefficients: rounding only.
    pub parseval: f64,
    /// Where the first sample of the output stands, in steps from the left mirror.
    pub first: f64,
    /// Distance of the output's samples, in steps.
    pub spacing: f64,
    /// Where integrals arrive at the end of the span, in steps; zero without integrals.
    pub arrival: Arrival,
}

/// The channel proper within a record that continues it.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub struct Span {
    /// Samples before it.
    pub lead: usize,
    /// Its own samples.
    pub len: usize,
}

impl Span {
    /// A record that nothing continues.
    pub fn whole(samples: &[f64]) -> Span {
        Span { lead: 0, len: samples.len() }
    }

    /// Its own mirrors, in steps from the left mirror of the continued record.
    pub fn mirrors(self, ends: Ends) -> [f64; 2] {
        [self.lead as f64, self.lead as f64 + ends.length(self.len)]
    }
}

/// Applies `pass` to `samples` under `ends` after splitting `baseline` off. The channel proper is `span`, `len` samples of it
/// from sample `lead` on: what stands before and after continues it.
///
/// Derivatives are per step and integrals in steps: the caller multiplies by step^(-turns). Integrals start at rest: the
/// first is zero at the start of the span, and so is the second. A pass that resamples gives the values of the
/// channel's new grid alone.
///
/// # Errors
/// `Unsupported` for a record of no samples.
pub fn apply(
    samples: &[f64],
    ends: Ends,
    baseline: &Baseline,
    pass: &Pass,
    span: Span,
    planner: &Planner,
) -> Result<Passed> {
    let len = samples.len();
    if let Some(layout) = Layout::of(pass, len) {
        return blocks::apply(samples, ends, baseline, pass, layout, planner);
    }
    apply_whole(samples, ends, baseline, pass, span, planner)
}

/// As `apply`, by the transform of the record's own length whatever that costs: what the way in blocks is held against.
///
/// # Errors
/// As `apply`.
pub fn apply_whole(
    samples: &[f64],
    ends: Ends,
    baseline: &Baseline,
    pass: &Pass,
    span: Span,
    planner: &Planner,
) -> Result<Passed> {
    let len = samples.len();
    let plan = planner.plan(ends, len)?;
    let first = ends.first_position();
    let position = |n: usize| n as f64 + first;

    let split = baseline.polynomial();
    let mut work: Vec<f64> = if split.is_zero() {
        samples.to_vec()
    } else {
        samples.iter().enumerate().map(|(n, v)| v - split.at(position(n))).collect()
    };
    let energy = weighted_energy(&work, ends);
    let mut scratch = vec![0.0; plan.scratch_len()];
    plan.forward(&mut work, &mut scratch);
    let kept = sum::sum_of_squares(&work);
    let parseval = if energy > 0.0 { (kept - energy).abs() / energy } else { 0.0 };

    let turns = pass.turns();
    let mut carried = split.clone();
    if turns < 0 && has_constant(ends) {
        // The constant has no integral in the basis: it joins the baseline, where it has one.
        carried = carried.plus_constant(work[0] / constant_norm(ends, len));
        work[0] = 0.0;
    }
    let mut turned_work = (!pass.is_real()).then(|| work.clone());
    multiply(&mut work, turned_work.as_deref_mut(), ends, pass);
    let mut polynomial = turned(pass.carry(&carried), turns);
    let mut arrival = Arrival::default();
    if turns < 0 {
        (polynomial, arrival) = from_rest(polynomial, &work, ends, turns, span.mirrors(ends));
    }
    let odd = turns.rem_euclid(2) == 1;
    if let Some(resampling) = pass.resampling() {
        let places = places(ends, resampling, span.lead);
        let nothing = vec![0.0; if odd { len } else { 0 }];
        let (straight, turned) = match (odd, &turned_work) {
            (true, _) => (nothing.as_slice(), Some(work.as_slice())),
            (false, other) => (work.as_slice(), other.as_deref()),
        };
        let mut output = grid::on_grid(ends, len, straight, turned, places);
        if !polynomial.is_zero() {
            for (m, value) in output.iter_mut().enumerate() {
                let numerator = places.first + m as i128 * i128::from(places.step);
                *value += polynomial.at(numerator as f64 / places.parts as f64);
            }
        }
        let parts = places.parts as f64;
        let (first, spacing) = (places.first as f64 / parts, places.step as f64 / parts);
        return Ok(Passed { output, parseval, first, spacing, arrival });
    }
    if odd {
        plan.inverse_turned(&mut work, &mut scratch);
    } else {
        plan.inverse(&mut work, &mut scratch);
    }
    if let Some(mut other) = turned_work {
        plan.inverse_turned(&mut other, &mut scratch);
        work.iter_mut().zip(&other).for_each(|(value, other)| *value += other);
    }
    if !polynomial.is_zero() {
        for (n, value) in work.iter_mut().enumerate() {
            *value += polynomial.at(position(n));
        }
    }
    Ok(Passed { output: work, parseval, first, spacing: 1.0, arrival })
}

/// Where the samples of a new grid stand, counted from the left mirror of a record that begins `lead` samples earlier.
fn places(ends: Ends, resampling: Resampling, lead: usize) -> Grid {
    let (over, under) = (resampling.ratio.numerator, resampling.ratio.denominator);
    // Twice the positions, in parts of 1/under of a step: all whole numbers.
    let twice_first = (2.0 * ends.first_position()) as i128;
    let origin = (twice_first + 2 * lead as i128) * i128::from(under);
    let shift = match resampling.start {
        Start::Centre => i128::from(over) - i128::from(under),
        Start::Kept => 0,
    };
    Grid { first: origin + shift, step: 2 * over, parts: 2 * under, count: resampling.count }
}

/// Sum of w x^2 with the weight 1/2 on even whole-sample mirrors.
fn weighted_energy(samples: &[f64], ends: Ends) -> f64 {
    let last = samples.len() - 1;
    let mut energy = sum::sum_of_squares(samples);
    for n in if last == 0 { vec![0] } else { vec![0, last] } {
        energy -= (1.0 - ends.weight(samples.len(), n)) * samples[n] * samples[n];
    }
    energy
}

/// True where function 0 of the basis is the constant.
fn has_constant(ends: Ends) -> bool {
    matches!(ends, Ends::Periodic | Ends::Mirror { left: Parity::Even, right: Parity::Even, .. })
}

/// The weighted norm of the constant 1: coefficient 0 divided by it is the mean.
fn constant_norm(ends: Ends, len: usize) -> f64 {
    let ends_off = (1.0 - ends.weight(len, 0)) + if len > 1 { 1.0 - ends.weight(len, len - 1) } else { 0.0 };
    (len as f64 - ends_off).sqrt()
}

/// True where basis function `k` is a cosine about the left mirror.
fn is_cosine(ends: Ends, k: usize) -> bool {
    match ends {
        Ends::Periodic => k == 0 || k % 2 == 1,
        Ends::Mirror { left, .. } => left == Parity::Even,
    }
}

/// Multiplies every coefficient by the response and by the power of angular frequency (per step) that the turns ask for.
///
/// A derivative takes a cosine to -omega sine and a sine to +omega cosine; an integral takes a cosine to +1/omega sine
/// and a sine to -1/omega cosine; two of either multiply by -omega^2 or -1/omega^2. A response R + i I takes a cosine to
/// R cosine - I sine and a sine to R sine + I cosine: `turned` gets the second terms. Only passes without turns have one.
pub(super) fn multiply(coefficients: &mut [f64], mut turned: Option<&mut [f64]>, ends: Ends, pass: &Pass) {
    let len = coefficients.len();
    let turns = pass.turns();
    let (mut last_frequency, mut last_gain) = (f64::NAN, Complex::default());
    for k in 0..len {
        let frequency = ends.frequency(len, k);
        // Periodic functions come in pairs of one frequency: the gain is worked out once.
        if frequency != last_frequency {
            let omega = std::f64::consts::TAU * frequency;
            last_gain = match turns {
                0 if turned.is_some() => pass.response(frequency),
                0 => Complex::new(pass.gain(frequency), 0.0),
                _ if frequency == 0.0 => Complex::default(),
                _ => Complex::new(pass.gain(frequency) * omega.powi(turns), 0.0),
            };
            last_frequency = frequency;
        }
        let sign = match turns {
            0 => 1.0,
            2 | -2 => -1.0,
            1 if is_cosine(ends, k) => -1.0,
            -1 if !is_cosine(ends, k) => -1.0,
            _ => 1.0,
        };
        coefficients[k] *= sign * last_gain.re;
        if let Some(turned) = turned.as_deref_mut() {
            turned[k] *= if is_cosine(ends, k) { -last_gain.im } else { last_gain.im };
        }
    }
}

/// The integrated polynomial with the constant, and after a second integral the slope, that make it and the integrated
/// series together zero at the start of the span; and where both integrals then arrive at its end.
fn from_rest(
    polynomial: Polynomial,
    coefficients: &[f64],
    ends: Ends,
    turns: i32,
    [start, end]: [f64; 2],
) -> (Polynomial, Arrival) {
    let len = coefficients.len();
    if turns == -1 {
        let first = |p: &Polynomial, x: f64| series::turned_value_at(ends, len, coefficients, x) + p.at(x);
        let polynomial = polynomial.clone().plus_constant(-first(&polynomial, start));
        let arrival = Arrival { first: first(&polynomial, end), second: 0.0 };
        return (polynomial, arrival);
    }
    // The slope of the second integral is the first: a sine becomes omega times a cosine, a cosine minus omega a sine.
    let slopes: Vec<f64> = coefficients
        .iter()
        .enumerate()
        .map(|(k, c)| {
            let omega = std::f64::consts::TAU * ends.frequency(len, k);
            if is_cosine(ends, k) { -omega * c } else { omega * c }
        })
        .collect();
    let first = |p: &Polynomial, x: f64| series::turned_value_at(ends, len, &slopes, x) + p.derivative().at(x);
    let second = |p: &Polynomial, x: f64| series::value_at(ends, len, coefficients, x) + p.at(x);
    let slope = first(&polynomial, start);
    let at_start = second(&polynomial, start);
    let polynomial = polynomial.plus_constant(slope * start - at_start).plus_slope(-slope);
    let arrival = Arrival { first: first(&polynomial, end), second: second(&polynomial, end) };
    (polynomial, arrival)
}

/// The polynomial after `turns` derivatives (positive) or integrals from x = 0 (negative).
pub(super) fn turned(mut polynomial: Polynomial, turns: i32) -> Polynomial {
    for _ in 0..turns.abs() {
        polynomial = if turns > 0 { polynomial.derivative() } else { polynomial.integral() };
    }
    polynomial
}
