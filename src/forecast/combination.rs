//! The forecasters weighted by how well each would have foretold the record's own ends, seen through the operator.

use crate::baseline::Side;
use crate::forecast::evidence::{EndEvidence, Evidence};
use crate::forecast::member::{COUNT, Fits};
use crate::forecast::{Response, variance};
use crate::numeric::sum;

/// How many places of the edge zone the backcasts are judged at.
const PLACES: usize = 16;

/// The three long analogues need this many blocks of history.
const LONG_ANALOGUES_FROM: usize = 128;

/// The record's continuation past both ends and its predicted error in the operator's output.
pub struct Forecast {
    /// Samples per block of the continuation.
    block: usize,
    /// Continuation in samples at each end.
    pad: usize,
    /// Past the left and the right end, outwards, block by block.
    blocks: [Vec<f64>; 2],
    /// Weight of each forecaster at the left and the right end, in the order of `member::NAMES`.
    pub weights: [[f64; COUNT]; 2],
    /// Mean squared error of the output in the edge zones that the autoregression's innovations lead to.
    pub innovation_variance: f64,
    /// The same from the backcasts.
    pub backcast_variance: f64,
    /// Output variance by distance from the left and the right end, sample by sample, as far as an end can be trimmed.
    profiles: [Vec<f64>; 2],
}

impl Forecast {
    /// Combines the evidence for an operator.
    pub fn combine(evidence: &Evidence, response: &Response) -> Forecast {
        let len = evidence.samples();
        let block = evidence.block();
        let pad = response.reach().max(8).min(len);
        let steps = pad.div_ceil(block);
        let zone = response.zone(len);
        let both = [Side::Left, Side::Right];
        let sights = both.map(|side| Sight::of(response, side, zone, steps, block));
        let sides = both.map(|side| evidence.at(side));
        let scores = [0, 1].map(|side| Backcasts::of(sides[side], &sights[side], steps));
        let weights = weights(&scores, sides[0].past.len());
        let blocks = [0, 1].map(|side| mixture(&sides[side].fits.continued(&sides[side].past, steps), &weights[side]));
        let farthest = response.trimmable(len).max(zone);
        // Rounding to the quantisation step is the least that is unforeseen.
        let rounding = evidence.quantum().powi(2) / (12.0 * block as f64);
        let by_innovations = both.map(|side| {
            let (predictor, innovation) = evidence.at(side).fits.innovations();
            variance::profile(&predictor, innovation.max(rounding), response, side, block, steps, farthest)
        });
        let by_backcasts = [0, 1].map(|side| scores[side].variances(&sights[side], &weights[side]));
        let wide = both.map(|side| Sight::of(response, side, farthest, steps, block));
        let profiles = [0, 1].map(|side| {
            let backcast = wide[side].spread(&scores[side].variances(&wide[side], &weights[side]), farthest);
            by_innovations[side].iter().zip(&backcast).map(|(a, b)| 0.5 * (a + b)).collect()
        });
        Forecast {
            block,
            pad,
            blocks,
            innovation_variance: 0.5 * (sum::mean(&by_innovations[0][..zone]) + sum::mean(&by_innovations[1][..zone])),
            backcast_variance: 0.5 * (sum::mean(&by_backcasts[0]) + sum::mean(&by_backcasts[1])),
            weights,
            profiles,
        }
    }

    /// The continuation past one end in samples, outwards.
    pub fn continuation(&self, side: Side) -> Vec<f64> {
        let samples = self.blocks(side).iter().flat_map(|&value| std::iter::repeat_n(value, self.block));
        samples.take(self.pad).collect()
    }

    /// The continuation past one end in blocks, outwards; beyond them it is reflected evenly.
    pub fn blocks(&self, side: Side) -> &[f64] {
        &self.blocks[side as usize]
    }

    /// The record with both continuations, and where it starts in there.
    pub fn padded(&self, samples: &[f64]) -> (Vec<f64>, usize) {
        let left = self.continuation(Side::Left);
        let mut line: Vec<f64> = left.iter().rev().copied().collect();
        line.extend_from_slice(samples);
        line.extend(self.continuation(Side::Right));
        (line, left.len())
    }

    /// Samples per block.
    pub fn block(&self) -> usize {
        self.block
    }

    /// Predicted variance of the output at distances 0, 1, ... samples from an end.
    pub fn profile(&self, side: Side) -> &[f64] {
        &self.profiles[side as usize]
    }

    /// Predicted RMS error of the output over both edge zones.
    pub fn predicted_error(&self) -> f64 {
        (0.5 * (self.innovation_variance + self.backcast_variance)).sqrt()
    }
}

/// How blocks outside the record are seen from places inside: sums of the impulse response.
struct Sight {
    /// Distances from the end, in samples.
    places: Vec<usize>,
    /// Row by row: one a place, one entry a block.
    rows: Vec<Vec<f64>>,
}

impl Sight {
    fn of(response: &Response, side: Side, zone: usize, steps: usize, block: usize) -> Sight {
        let place = |k: usize| k * (zone - 1) / (PLACES - 1);
        let places: Vec<usize> = (0..PLACES).map(place).collect();
        let seen = |j: usize, m: usize| response.area(side, j + 1 + m * block, j + 1 + (m + 1) * block);
        let row = |&j: &usize| (0..steps).map(|m| seen(j, m)).collect();
        let rows = places.iter().map(row).collect();
        Sight { places, rows }
    }

    /// What the operator makes of errors in the first blocks outside, at each place.
    fn output(&self, errors: &[f64]) -> [f64; PLACES] {
        let mut out = [0.0; PLACES];
        for (value, row) in out.iter_mut().zip(&self.rows) {
            *value = row.iter().zip(errors).map(|(b, e)| b * e).sum();
        }
        out
    }

    /// Values at the places, joined by straight lines over the whole zone.
    fn spread(&self, values: &[f64], zone: usize) -> Vec<f64> {
        let mut line = Vec::with_capacity(zone);
        let mut at = 0;
        for j in 0..zone {
            while at + 2 < PLACES && self.places[at + 1] < j {
                at += 1;
            }
            let (a, b) = (self.places[at], self.places[at + 1]);
            let share = if b > a { (j as f64 - a as f64) / (b - a) as f64 } else { 0.0 };
            line.push(values[at] + share.clamp(0.0, 1.0) * (values[at + 1] - values[at]));
        }
        line
    }
}

/// Weighted sum of the forecasters' values; one without weight may be anything.
fn mixture(members: &[Vec<f64>; COUNT], weights: &[f64; COUNT]) -> Vec<f64> {
    let mut mixed = vec![0.0; members[0].len()];
    for (member, weight) in members.iter().zip(weights).filter(|(_, w)| **w > 0.0) {
        for (value, m) in mixed.iter_mut().zip(member) {
            *value += weight * m;
        }
    }
    mixed
}

/// Errors that each forecaster would have made after each cut of one end.
struct Backcasts {
    /// Cut by cut, forecaster by forecaster, block by block.
    errors: Vec<[Vec<f64>; COUNT]>,
    /// The same in the output, place by place.
    outputs: Vec<[[f64; PLACES]; COUNT]>,
}

impl Backcasts {
    fn of(end: &EndEvidence, sight: &Sight, steps: usize) -> Backcasts {
        let n = end.past.len();
        let cut = |(h, fits): &(usize, Fits)| {
            let (past, truth) = end.past.split_at(n - h);
            fits.continued(past, *h.min(&steps)).map(|ahead| ahead.iter().zip(truth).map(|(a, t)| a - t).collect())
        };
        let errors: Vec<[Vec<f64>; COUNT]> = end.cuts.iter().map(cut).collect();
        let output = |members: &[Vec<f64>; COUNT]| std::array::from_fn(|k| sight.output(&members[k]));
        Backcasts { outputs: errors.iter().map(output).collect(), errors }
    }

    /// (mean over the cuts of the RMS output error)^2 of each forecaster: the root keeps one bad cut from deciding.
    fn scores(&self) -> [f64; COUNT] {
        let mut scores = [0.0; COUNT];
        for (member, score) in scores.iter_mut().enumerate() {
            let rms = |cut: &[[f64; PLACES]; COUNT]| mean_square(&cut[member]).sqrt();
            let mean = self.outputs.iter().map(rms).sum::<f64>() / self.outputs.len().max(1) as f64;
            *score = mean * mean;
        }
        scores
    }

    /// Mean squared output error of the weighted forecast at each place, over the cuts.
    fn variances(&self, sight: &Sight, weights: &[f64; COUNT]) -> [f64; PLACES] {
        let mut variances = [0.0; PLACES];
        for cut in &self.errors {
            let output = sight.output(&mixture(cut, weights));
            for (variance, error) in variances.iter_mut().zip(output) {
                *variance += error * error / self.errors.len() as f64;
            }
        }
        variances
    }
}

fn mean_square(values: &[f64]) -> f64 {
    values.iter().map(|v| v * v).sum::<f64>() / values.len() as f64
}

/// Weights of both ends: scores relative to the best, half shared between the ends, to the power -2.
fn weights(ends: &[Backcasts; 2], blocks: usize) -> [[f64; COUNT]; 2] {
    let used = |member: usize| member + 1 < COUNT || blocks >= LONG_ANALOGUES_FROM;
    let relative = [0, 1].map(|side| {
        let scores = ends[side].scores();
        let largest = scores.iter().copied().filter(|s| s.is_finite()).fold(0.0, f64::max);
        // A perfect forecaster must not make the others' scores infinite: 1e-20 in power is 1e-10 in amplitude.
        let floor = (1e-20 * largest).max(f64::MIN_POSITIVE);
        let best = (0..COUNT).filter(|k| used(*k)).map(|k| scores[k]).fold(f64::INFINITY, f64::min).max(floor);
        scores.map(|s| (s.max(floor)) / best)
    });
    [0, 1].map(|side| {
        let mut weights = [0.0; COUNT];
        for (member, weight) in weights.iter_mut().enumerate() {
            let shared = 0.5 * relative[side][member] + 0.25 * (relative[0][member] + relative[1][member]);
            *weight = if used(member) && shared.is_finite() { shared.powi(-2) } else { 0.0 };
        }
        let total: f64 = weights.iter().sum();
        if total > 0.0 { weights.map(|w| w / total) } else { [1.0 / COUNT as f64; COUNT] }
    })
}

#[cfg(test)]
mod tests;
