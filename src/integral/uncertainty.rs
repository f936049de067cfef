//! How uncertain white noise in a record leaves its integral, along the record and after a high-pass.
//!
//! White noise of standard deviation sigma a sample has independent cosine coefficients of variance 2 sigma^2/N (the mean
//! sigma^2/N). Every one of them is integrated, given the constants that the end conditions ask for, and high-passed, on a
//! grid of its own; the squares add up. What comes out depends on the end conditions and on corner times length alone:
//! for two integrals sigma_d(u) = phi(u/L) sigma sqrt(L^3) in steps, for one sigma_v(u) = phi(u/L) sigma sqrt(L).

use std::f64::consts::{PI, TAU};

use crate::basis::Plan;
use crate::ends::Ends;
use crate::error::Result;

use super::constants::{Arrival, AtRest, Solver};

/// Points of the grid, and coefficients that are summed: beyond them lies less than 1/(256^3 * 3) of a displacement's
/// variance and 1/256 of a velocity's.
const GRID: usize = 256;
/// Cycles of the high-pass corner that a longer record is cut to: its middle then feels neither end, whatever the shape.
const CYCLES: f64 = 24.0;

/// A high-pass that runs on the integral: its gain by frequency in cycles per sample, and its corner there.
#[derive(Clone, Copy)]
pub struct HighPass<'a> {
    /// Gain.
    pub gain: &'a dyn Fn(f64) -> f64,
    /// Lowest corner.
    pub corner: f64,
}

/// What is done to the noise.
#[derive(Clone, Copy)]
pub struct Trial<'a> {
    /// End conditions.
    pub solver: &'a Solver,
    /// -1 or -2.
    pub turns: i32,
    /// Gain before the integral, by frequency in cycles per sample.
    pub gain: &'a dyn Fn(f64) -> f64,
    /// High-pass after it.
    pub high: Option<HighPass<'a>>,
    /// Length of the record in steps.
    pub length: f64,
    /// Samples that an offset taken off is the mean of.
    pub offset_samples: Option<usize>,
}

/// Standard deviation of the integral of white noise 1 along the record.
#[derive(Debug, Clone)]
pub struct Band {
    /// Variance on the grid, of the trial's own length.
    variance: Vec<f64>,
    length: f64,
    /// The length that was tried: that of the record, or `CYCLES` of the high-pass where that is less.
    tried: f64,
}

impl Band {
    /// Forms it: some 256 short transforms.
    ///
    /// # Errors
    /// `Usage` for stretches that hold no points of the grid.
    pub fn of(trial: &Trial<'_>) -> Result<Band> {
        let solver = &trial.solver.homogeneous();
        let trial = &Trial { solver, ..*trial };
        let tried = trial.high.map_or(trial.length, |high| trial.length.min(CYCLES / high.corner));
        let plan = Plan::new(Ends::EVEN, GRID)?;
        let mut scratch = vec![0.0; plan.scratch_len()];
        let mut variance = vec![0.0; GRID];
        let power = if trial.turns == -1 { tried } else { tried.powi(3) };
        let mut add = |mut wave: Vec<f64>, weight: f64| {
            if let Some(high) = trial.high {
                plan.forward(&mut wave, &mut scratch);
                wave.iter_mut().enumerate().for_each(|(k, c)| *c *= (high.gain)(k as f64 / (2.0 * tried)));
                plan.inverse(&mut wave, &mut scratch);
            }
            variance.iter_mut().zip(&wave).for_each(|(sum, v)| *sum += weight * v * v);
        };
        if *trial.solver == Solver::ZeroMean {
            // Cosine and sine of a harmonic have the variance 2/N each, and their squares add up to 1 everywhere.
            let share = |k: usize| {
                let f = k as f64 / tried;
                let high = trial.high.map_or(1.0, |high| (high.gain)(f));
                2.0 * ((trial.gain)(f) * high).powi(2) / (TAU * k as f64).powi(-2 * trial.turns)
            };
            let total: f64 = (1..4 * GRID).map(share).sum();
            return Ok(Band { variance: vec![total * power; GRID], length: trial.length, tried });
        }
        for k in 0..GRID {
            let wave = integrated(trial, k, tried)?;
            add(wave, if k == 0 { power } else { 2.0 * power });
        }
        if let Some(count) = trial.offset_samples {
            // An offset that is wrong by 1, and its variance 1/count.
            let rest = at_rest(trial.turns, &[], Arrival::default());
            let constants = trial.solver.solve(&rest, 1.0, || Ok(Vec::new()))?;
            let wrong: Vec<f64> = (0..GRID).map(|n| constants.at(trial.turns, midpoint(n), 1.0)).collect();
            add(wrong, tried.powi(-2 * trial.turns) / count as f64);
        }
        Ok(Band { variance, length: trial.length, tried })
    }

    /// Standard deviation at `u` steps from the start, for noise 1 a sample; in steps.
    pub fn deviation(&self, u: f64) -> f64 {
        // Where only part of the record was tried, each half stands for its own end, its inner end for the middle.
        let (u, half) = (u.clamp(0.0, self.length), self.tried / 2.0);
        let place = if u <= half {
            u
        } else if self.length - u <= half {
            self.tried - (self.length - u)
        } else {
            half
        };
        let at = (place / self.tried * GRID as f64 - 0.5).clamp(0.0, (GRID - 1) as f64);
        let n = (at as usize).min(GRID - 2);
        let share = at - n as f64;
        (self.variance[n] * (1.0 - share) + self.variance[n + 1] * share).max(0.0).sqrt()
    }
}

fn midpoint(n: usize) -> f64 {
    (n as f64 + 0.5) / GRID as f64
}

fn at_rest(turns: i32, samples: &[f64], arrival: Arrival) -> AtRest<'_> {
    AtRest { turns, samples, position: midpoint(0), spacing: 1.0 / GRID as f64, length: 1.0, arrival }
}

/// The integral of cosine k of amplitude 1 over a unit length, on the grid, with its constants.
fn integrated(trial: &Trial<'_>, k: usize, tried: f64) -> Result<Vec<f64>> {
    let gain = (trial.gain)((k as f64 / (2.0 * tried)).min(0.5));
    let w = PI * k as f64;
    let velocity = |u: f64| gain * if k == 0 { u } else { (w * u).sin() / w };
    let displacement = |u: f64| gain * if k == 0 { u * u / 2.0 } else { (1.0 - (w * u).cos()) / (w * w) };
    // The sine of a whole number of half-turns is zero, which rounding of pi must not blur.
    let first = if k == 0 { gain } else { 0.0 };
    let arrival = Arrival { first, second: if trial.turns == -1 { 0.0 } else { displacement(1.0) } };
    let places = (0..GRID).map(midpoint);
    let mut samples: Vec<f64> =
        if trial.turns == -1 { places.map(velocity).collect() } else { places.map(displacement).collect() };
    let rest = at_rest(trial.turns, &samples, arrival);
    let constants = trial.solver.solve(&rest, 0.0, || Ok((0..GRID).map(midpoint).map(velocity).collect()))?;
    for (n, value) in samples.iter_mut().enumerate() {
        *value += constants.at(trial.turns, midpoint(n), 1.0);
    }
    Ok(samples)
}

/// The integral of G^2 / u^(2 turns) over u = f/corner from 0, for a high-pass gain G(u) that vanishes at 0 as u^turns or
/// faster: the I of sigma_d = sqrt(S I/((2 pi)^4 fc^3)), and of sigma_v = sqrt(S I/((2 pi)^2 fc)), with S the one-sided
/// density of the noise. For the squared Butterworth of order n and two integrals I = Gamma(2 - 3/2n) Gamma(3/2n)/(2n).
pub fn high_pass_area(gain: impl Fn(f64) -> f64, turns: i32) -> f64 {
    let power = 2 * turns.abs();
    // Trapezoid over ln u; u^(1 - power) falls by ten orders of magnitude or is added in closed form.
    let (low, high, count) = (1e-4_f64, 1e4_f64, 8000);
    let step = (high / low).ln() / f64::from(count);
    let term = |u: f64| gain(u).powi(2) * u.powi(1 - power);
    let inner: f64 = (1..count).map(|n| term(low * (f64::from(n) * step).exp())).sum();
    let ends = (term(low) + term(high)) / 2.0;
    step * (inner + ends) + high.powi(1 - power) / f64::from(power - 1)
}

/// The corner, in cycles per step, at which noise `sigma` a sample leaves the deviation `wanted` in the integral (in
/// steps), away from the ends: fc = (S I/((2 pi)^4 wanted^2))^(1/3) for two integrals, with S = 2 sigma^2 per cycle a step.
pub fn corner_for(wanted: f64, sigma: f64, area: f64, turns: i32) -> f64 {
    let share = 2.0 * sigma * sigma * area / (TAU.powi(2 * turns.abs()) * wanted * wanted);
    if turns == -1 { share } else { share.cbrt() }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn band(solver: &Solver, turns: i32, high: Option<HighPass<'_>>, length: f64) -> Band {
        Band::of(&Trial { solver, turns, gain: &|_| 1.0, high, length, offset_samples: None }).expect("a band")
    }

    #[test]
    fn bands_without_a_high_pass_are_the_closed_forms() {
        type Form = fn(f64) -> f64;
        let cases: [(Solver, i32, Form); 8] = [
            (Solver::StartRest, -2, |u| u.powi(3) / 3.0),
            (Solver::Rest, -2, |u| u.powi(3) / 3.0 - u.powi(4) / 4.0),
            (Solver::Pinned(-3.0), -2, |u| (u * (1.0 - u)).powi(2) / 3.0),
            (Solver::StartRestTo(0.0), -2, |u| u.powi(3) * (1.0 - u).powi(2) / 3.0),
            (Solver::RestTo(7.5), -2, |u| (u * (1.0 - u)).powi(3) / 3.0),
            (Solver::ZeroMean, -2, |_| 1.0 / 720.0),
            (Solver::StartRest, -1, |u| u),
            (Solver::Rest, -1, |u| u * (1.0 - u)),
        ];
        for (solver, turns, form) in cases {
            let length = 1000.0_f64;
            let band = band(&solver, turns, None, length);
            for u in [0.1, 0.3, 0.5, 0.8, 0.95] {
                let scale = if turns == -1 { length.sqrt() } else { length.powf(1.5) };
                let found = band.deviation(u * length) / scale;
                // The tail beyond 256 terms, and a straight line between neighbouring points of the grid.
                assert!((found / form(u).sqrt() - 1.0).abs() < 0.01, "{solver:?} {u}: {found} {}", form(u).sqrt());
            }
        }
    }

    #[test]
    fn steady_bands_have_the_tabled_values() {
        // Quadrature of the same model by other means, four digits: ends and middle of the least-squares quadratic and
        // cubic residuals.
        for (drift, end, middle) in [(false, 0.0391, 0.0145), (true, 0.0233, 0.0145)] {
            let band = band(&Solver::Steady { drift }, -2, None, 1.0);
            for (u, wanted) in [(0.0, end), (0.5, middle), (1.0, end)] {
                assert!((band.deviation(u) / wanted - 1.0).abs() < 0.03, "{drift} {u}: {}", band.deviation(u));
            }
        }
    }

    #[test]
    fn a_high_pass_leaves_the_closed_form_inside() {
        // Gamma(2 - 3/(2n)) Gamma(3/(2n))/(2n) of the squared Butterworth; 1/3 of the brick wall.
        for (order, area) in [(2, 0.277_680_2), (4, 0.265_659_0), (8, 0.287_153_6)] {
            let shape = move |u: f64| if u == 0.0 { 0.0 } else { 1.0 / (1.0 + u.powi(-2 * order)) };
            let found = high_pass_area(shape, -2);
            assert!((found / area - 1.0).abs() < 2e-3, "{order}: {found}");
            let corner = 0.002;
            let gain = |f: f64| shape(f / corner);
            let band = band(&Solver::Steady { drift: true }, -2, Some(HighPass { gain: &gain, corner }), 20_000.0);
            let inside = (2.0 * found / (TAU.powi(4) * corner.powi(3))).sqrt();
            let middle = band.deviation(10_000.0);
            assert!((middle / inside - 1.0).abs() < 0.03, "{order}: {middle} {inside}");
            assert!((corner_for(inside, 1.0, found, -2) / corner - 1.0).abs() < 1e-12);
            assert!(band.deviation(0.0) > 2.0 * middle, "{order}: {}", band.deviation(0.0));
        }
        assert!((high_pass_area(|u| if u < 1.0 { 0.0 } else { 1.0 }, -2) * 3.0 - 1.0).abs() < 5e-3);
        // One integral, order 1: the integral of u^2/(1 + u^2)^2 is pi/4.
        let first = high_pass_area(|u| u * u / (1.0 + u * u), -1);
        assert!((first / (PI / 4.0) - 1.0).abs() < 1e-3, "{first}");
    }
}
