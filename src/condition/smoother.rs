//! Penalised smoothing in the basis of the record: strength by cross-validation, missing samples, outliers.
//!
//! The fit z to samples y with weights W has the least sum W (y - z)^2 + s |D^m z|^2, D the difference of neighbours in the
//! extended record: the basis diagonalises its penalty, (2 - 2 cos w)^m (Garcia 2010, Computational Statistics & Data Analysis
//! 54, 1167, eqs 6 to 9, from memory, for m = 2 and even ends). Where weights differ, the normal equations are solved by
//! preconditioned conjugate gradients; the fixed-point iteration of that paper stops far from the solution across gaps.

use std::f64::consts::{PI, TAU};
use std::sync::Arc;

use crate::basis::{Plan, Planner};
use crate::ends::Ends;
use crate::error::Result;
use crate::numeric::quantile::{HAMPEL_SCALE, median};

/// Smooths records of one length under one choice of ends. Weights other than 1 are for the half-sample seat.
#[derive(Debug, Clone)]
pub struct Smoother {
    plan: Arc<Plan>,
    /// (2 - 2 cos w_k)^m.
    penalties: Vec<f64>,
    order: i32,
}

/// A strength found by generalised cross-validation.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Validated {
    /// The strength s.
    pub strength: f64,
    /// (RSS/n)/(1 - Tr/N)^2 there.
    pub score: f64,
    /// True where the score still falls at the weakest strength tried: no white noise was found.
    pub at_weakest: bool,
}

/// A fit against outliers.
#[derive(Debug, Clone, PartialEq)]
pub struct Robust {
    /// The fit.
    pub values: Vec<f64>,
    /// The final weights, from 0 to 1.
    pub weights: Vec<f64>,
    /// The strength it was made with.
    pub strength: f64,
}

/// Weakest strength tried: a fit that keeps 99 % of the freedom of the samples.
const WEAKEST: f64 = 1e-3;
/// Strengths tried up to where the longest wave keeps a ten-thousandth.
const FLATTEST: f64 = 1e4;
/// Strengths a decade on the first, coarse walk.
const A_DECADE: f64 = 3.0;
/// Tuning constant of the bisquare: 95 % efficiency on normal noise (Huber 1981).
const BISQUARE: f64 = 4.685;
/// Re-weightings of a robust fit.
const REWEIGHTINGS: usize = 3;
/// Steps of conjugate gradients at most.
const STEPS: usize = 2000;

impl Smoother {
    /// A smoother of records of `len` samples that penalises differences of `order` m (1 to 4).
    ///
    /// # Errors
    /// `Unsupported` for a record of no samples.
    pub fn new(planner: &Planner, ends: Ends, len: usize, order: i32) -> Result<Smoother> {
        let plan = planner.plan(ends, len)?;
        let penalty = |k: usize| {
            let half = (PI * ends.frequency(len, k)).sin();
            (4.0 * half * half).powi(order)
        };
        Ok(Smoother { penalties: (0..len).map(penalty).collect(), plan, order })
    }

    /// The fit to samples of equal weight.
    pub fn smooth(&self, samples: &[f64], strength: f64) -> Vec<f64> {
        let mut values = samples.to_vec();
        self.in_basis(&mut values, |k, c| c / (1.0 + strength * self.penalties[k]));
        values
    }

    /// Degrees of freedom of the fit: the trace of what takes samples to it.
    pub fn freedom(&self, strength: f64) -> f64 {
        self.penalties.iter().map(|p| 1.0 / (1.0 + strength * p)).sum()
    }

    /// The generalised cross-validation score of a strength for samples of equal weight.
    pub fn score(&self, samples: &[f64], strength: f64) -> f64 {
        self.score_of(&self.coefficients(samples), strength)
    }

    /// The strength of least score for samples of equal weight.
    pub fn validated(&self, samples: &[f64]) -> Validated {
        let coefficients = self.coefficients(samples);
        self.least(self.range(), |strength| self.score_of(&coefficients, strength))
    }

    /// The fit to samples with `weights` from 0 (missing: the sample may be anything finite) to 1, from a first guess.
    pub fn weighted(&self, samples: &[f64], weights: &[f64], strength: f64, guess: &[f64]) -> Vec<f64> {
        let len = samples.len();
        let mean_weight = weights.iter().sum::<f64>() / len as f64;
        if mean_weight <= 0.0 {
            return guess.to_vec();
        }
        // In the basis: (C W C^T + s Lambda) z = C W y, preconditioned by mean(W) + s Lambda.
        let mut right: Vec<f64> =
            samples.iter().zip(weights).map(|(y, w)| if *w > 0.0 { y * w } else { 0.0 }).collect();
        let mut scratch = vec![0.0; self.plan.scratch_len()];
        self.plan.forward(&mut right, &mut scratch);
        let mut z = guess.to_vec();
        self.plan.forward(&mut z, &mut scratch);
        let mut work = vec![0.0; len];
        let mut apply = |v: &[f64], out: &mut Vec<f64>| {
            work.copy_from_slice(v);
            self.plan.inverse(&mut work, &mut scratch);
            work.iter_mut().zip(weights).for_each(|(x, w)| *x *= w);
            self.plan.forward(&mut work, &mut scratch);
            out.clear();
            out.extend(work.iter().zip(v).zip(&self.penalties).map(|((x, v), p)| x + strength * p * v));
        };
        let eased = |r: &[f64]| -> Vec<f64> {
            r.iter().zip(&self.penalties).map(|(r, p)| r / (mean_weight + strength * p)).collect()
        };
        let mut product = Vec::with_capacity(len);
        apply(&z, &mut product);
        let mut residual: Vec<f64> = right.iter().zip(&product).map(|(b, a)| b - a).collect();
        let mut eased_residual = eased(&residual);
        let mut direction = eased_residual.clone();
        let mut slope = dot(&residual, &eased_residual);
        let goal = self.tolerance(weights, strength).powi(2) * dot(&right, &eased(&right));
        for _ in 0..STEPS {
            if slope <= goal {
                break;
            }
            apply(&direction, &mut product);
            let bend = dot(&direction, &product);
            if bend <= 0.0 {
                break; // rounding has used up the direction
            }
            let step = slope / bend;
            z.iter_mut().zip(&direction).for_each(|(z, d)| *z += step * d);
            residual.iter_mut().zip(&product).for_each(|(r, a)| *r -= step * a);
            eased_residual = eased(&residual);
            let next = dot(&residual, &eased_residual);
            let share = next / slope;
            slope = next;
            direction.iter_mut().zip(&eased_residual).for_each(|(d, r)| *d = r + share * *d);
        }
        self.plan.inverse(&mut z, &mut scratch);
        z
    }

    /// The strength of least score for samples with weights, and the fit with it. `near` narrows the search to a factor of
    /// a hundred either way.
    pub fn weighted_validated(&self, samples: &[f64], weights: &[f64], near: Option<f64>) -> (Validated, Vec<f64>) {
        let known = weights.iter().filter(|w| **w > 0.0).count().max(1) as f64;
        let (weakest, strongest) = self.range();
        let range = near.map_or((weakest, strongest), |s| ((s / 100.0).max(weakest), (s * 100.0).min(strongest)));
        let mut fit = bridged(samples, weights);
        let found = self.least(range, |strength| {
            fit = self.weighted(samples, weights, strength, &fit);
            let rss: f64 = fit
                .iter()
                .zip(samples)
                .zip(weights)
                .map(|((z, y), w)| if *w > 0.0 { w * (y - z).powi(2) } else { 0.0 })
                .sum();
            (rss / known) / (1.0 - self.freedom(strength) / samples.len() as f64).powi(2)
        });
        let values = self.weighted(samples, weights, found.strength, &fit);
        (found, values)
    }

    /// The fit from which outliers are kept away: bisquare weights from the residuals, three times over, on top of `base`
    /// weights (0 for a missing sample). Without a strength the least score under the weights of each turn gives it.
    pub fn robust(&self, samples: &[f64], base: Option<&[f64]>, strength: Option<f64>) -> Robust {
        let mut weights = base.map_or_else(|| vec![1.0; samples.len()], <[f64]>::to_vec);
        let (mut strength_now, mut values) = match (base, strength) {
            (None, strength) => {
                let found = strength.unwrap_or_else(|| self.validated(samples).strength);
                (found, self.smooth(samples, found))
            }
            (Some(base), Some(strength)) => (strength, self.weighted(samples, base, strength, &bridged(samples, base))),
            (Some(base), None) => {
                let (found, fit) = self.weighted_validated(samples, base, None);
                (found.strength, fit)
            }
        };
        for _ in 0..REWEIGHTINGS {
            let leverage = self.freedom(strength_now) / samples.len() as f64;
            weights = bisquare(samples, &values, base, leverage);
            if strength.is_none() {
                let (found, fit) = self.weighted_validated(samples, &weights, Some(strength_now));
                (strength_now, values) = (found.strength, fit);
            } else {
                values = self.weighted(samples, &weights, strength_now, &values);
            }
        }
        Robust { values, weights, strength: strength_now }
    }

    /// Conjugate gradients must resolve what the penalty alone decides: the middle of the longest gap, of g samples, by
    /// s (pi/2g)^2m.
    fn tolerance(&self, weights: &[f64], strength: f64) -> f64 {
        let longest = weights.split(|w| *w > 0.0).map(<[f64]>::len).max().unwrap_or(0).max(1) as f64;
        (1e-4 * strength * (PI / (2.0 * longest)).powi(2 * self.order)).clamp(1e-14, 1e-10)
    }

    fn coefficients(&self, samples: &[f64]) -> Vec<f64> {
        let mut c = samples.to_vec();
        let mut scratch = vec![0.0; self.plan.scratch_len()];
        self.plan.forward(&mut c, &mut scratch);
        c
    }

    fn score_of(&self, coefficients: &[f64], strength: f64) -> f64 {
        let (mut rss, mut trace) = (0.0, 0.0);
        for (c, p) in coefficients.iter().zip(&self.penalties) {
            let kept = 1.0 / (1.0 + strength * p);
            trace += kept;
            let lost = c * strength * p * kept;
            rss += lost * lost;
        }
        let n = coefficients.len() as f64;
        (rss / n) / (1.0 - trace / n).powi(2)
    }

    /// Strengths worth trying.
    fn range(&self) -> (f64, f64) {
        let longest = self.penalties.iter().copied().filter(|p| *p > 0.0).fold(f64::INFINITY, f64::min);
        let strongest = if longest.is_finite() { FLATTEST / longest } else { WEAKEST };
        (WEAKEST, strongest.max(WEAKEST))
    }

    /// The strength of least score: a coarse walk over all decades, then a golden section about the best of them.
    fn least(&self, (weakest, strongest): (f64, f64), mut score: impl FnMut(f64) -> f64) -> Validated {
        let (low, high) = (weakest.ln(), strongest.ln());
        let steps = ((high - low) / std::f64::consts::LN_10 * A_DECADE).ceil().max(1.0);
        let pace = (high - low) / steps;
        // From the strongest down: a fit across gaps starts smooth and is refined.
        let walk: Vec<(f64, f64)> = (0..=steps as usize)
            .map(|n| {
                let at = high - n as f64 * pace;
                (at, score(at.exp()))
            })
            .collect();
        let best = walk.iter().copied().filter(|(_, v)| v.is_finite()).min_by(|a, b| a.1.total_cmp(&b.1));
        let Some((at, _)) = best else {
            return Validated { strength: weakest, score: 0.0, at_weakest: true };
        };
        let (mut a, mut b) = ((at - pace).max(low), (at + pace).min(high));
        let share = (5_f64.sqrt() - 1.0) / 2.0;
        let (mut x, mut y) = (b - share * (b - a), a + share * (b - a));
        let (mut of_x, mut of_y) = (score(x.exp()), score(y.exp()));
        while b - a > 1e-3 {
            if of_x < of_y {
                (b, y, of_y) = (y, x, of_x);
                x = b - share * (b - a);
                of_x = score(x.exp());
            } else {
                (a, x, of_x) = (x, y, of_y);
                y = a + share * (b - a);
                of_y = score(y.exp());
            }
        }
        let middle = (a + b) / 2.0;
        Validated { strength: middle.exp(), score: score(middle.exp()), at_weakest: middle - low < 2e-3 }
    }

    fn in_basis(&self, values: &mut [f64], change: impl Fn(usize, f64) -> f64) {
        let mut scratch = vec![0.0; self.plan.scratch_len()];
        self.plan.forward(values, &mut scratch);
        values.iter_mut().enumerate().for_each(|(k, c)| *c = change(k, *c));
        self.plan.inverse(values, &mut scratch);
    }
}

/// Degrees of freedom of a second-order fit of `len` samples between `ends`, without a plan.
pub fn freedom(ends: Ends, len: usize, strength: f64) -> f64 {
    let kept = |k: usize| {
        let half = (TAU * ends.frequency(len, k) / 2.0).sin();
        1.0 / (1.0 + strength * (4.0 * half * half).powi(2))
    };
    (0..len).map(kept).sum()
}

/// (1 - (u/4.685)^2)^2 below 4.685 robust deviations of the residuals, 0 beyond; the deviation is that of a residual at a
/// sample of this leverage.
fn bisquare(samples: &[f64], fit: &[f64], base: Option<&[f64]>, leverage: f64) -> Vec<f64> {
    let base = |n: usize| base.map_or(1.0, |base| base[n]);
    let mut scratch: Vec<f64> = (0..samples.len()).filter(|&n| base(n) > 0.0).map(|n| samples[n] - fit[n]).collect();
    let centre = median(&mut scratch).unwrap_or(0.0);
    scratch.iter_mut().for_each(|r| *r = (*r - centre).abs());
    let deviation = HAMPEL_SCALE * median(&mut scratch).unwrap_or(0.0) * (1.0 - leverage).max(0.0).sqrt();
    let weight = |n: usize| {
        let u = (samples[n] - fit[n]) / (BISQUARE * deviation);
        match deviation > 0.0 {
            true if u.abs() < 1.0 => base(n) * (1.0 - u * u).powi(2),
            true => 0.0,
            false => base(n),
        }
    };
    (0..samples.len()).map(weight).collect()
}

/// The samples with those of no weight joined by straight lines: a first guess.
pub fn bridged(samples: &[f64], weights: &[f64]) -> Vec<f64> {
    let known: Vec<usize> = (0..samples.len()).filter(|&n| weights[n] > 0.0).collect();
    let mut guess = samples.to_vec();
    let (Some(&first), Some(&last)) = (known.first(), known.last()) else { return vec![0.0; samples.len()] };
    guess[..first].fill(samples[first]);
    guess[last + 1..].fill(samples[last]);
    for pair in known.windows(2) {
        let (from, to) = (pair[0], pair[1]);
        for n in from + 1..to {
            let share = (n - from) as f64 / (to - from) as f64;
            guess[n] = samples[from] + share * (samples[to] - samples[from]);
        }
    }
    guess
}

fn dot(a: &[f64], b: &[f64]) -> f64 {
    a.iter().zip(b).map(|(a, b)| a * b).sum()
}

#[cfg(test)]
mod tests;
