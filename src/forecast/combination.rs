//! The forecasters weighted by how well each would have foretold the record's own ends, seen through the operator.

use crate::baseline::Side;
use crate::forecast::evidence::{EndEvidence, Evidence};
use crate::forecast::member::COUNT;
use crate::forecast::{Response, variance};

/// How many places of the edge zone the backcasts are judged at.
const PLACES: usize = 16;

/// The three long analogues need this many blocks of history.
const LONG_ANALOGUES_FROM: usize = 128;

/// The record's continuation past both ends and its predicted error in the operator's output.
pub struct Forecast {
    /// Past the left end, outwards.
    pub left: Vec<f64>,
    /// Past the right end, outwards.
    pub right: Vec<f64>,
    /// Weight of each forecaster at the left and the right end, in the order of `member::NAMES`.
    pub weights: [[f64; COUNT]; 2],
    /// Mean squared error of the output in the edge zones that the autoregression's innovations lead to.
    pub innovation_variance: f64,
    /// The same from the backcasts.
    pub backcast_variance: f64,
    /// Output variance by distance from the left and the right end, sample by sample.
    pub profiles: [Vec<f64>; 2],
}

impl Forecast {
    /// Combines the evidence for an operator.
    pub fn combine(evidence: &Evidence, response: &Response) -> Forecast {
        let len = evidence.samples();
        let block = evidence.block();
        let pad = response.reach().max(8).min(len);
        let steps = pad.div_ceil(block);
        let zone = response.zone(len);
        let sight = Sight::of(response, zone, steps, block);
        let sides = [Side::Left, Side::Right].map(|side| evidence.at(side));
        let scores = sides.map(|end| Backcasts::of(end, &sight, steps));
        let weights = weights(&scores, sides[0].past.len());
        let continuation = |end: &EndEvidence, weights: &[f64; COUNT]| {
            let members = end.fits.continued(&end.past, steps);
            let mut ahead = Vec::with_capacity(steps * block);
            for step in 0..steps {
                let value: f64 = members.iter().zip(weights).map(|(m, w)| if *w > 0.0 { w * m[step] } else { 0.0 }).sum();
                ahead.extend(std::iter::repeat_n(value, block));
            }
            ahead.truncate(pad);
            ahead
        };
        let by_innovations =
            sides.map(|end| variance::profile(&end.fits, response, block, steps, zone, evidence.quantum()));
        let by_backcasts = [0, 1].map(|side| scores[side].variances(&weights[side]));
        let mean = |v: &[f64]| if v.is_empty() { 0.0 } else { v.iter().sum::<f64>() / v.len() as f64 };
        let profiles = [0, 1].map(|side| {
            let backcast = sight.spread(&by_backcasts[side], zone);
            by_innovations[side].iter().zip(&backcast).map(|(a, b)| 0.5 * (a + b)).collect()
        });
        Forecast {
            left: continuation(sides[0], &weights[0]),
            right: continuation(sides[1], &weights[1]),
            innovation_variance: 0.5 * (mean(&by_innovations[0]) + mean(&by_innovations[1])),
            backcast_variance: 0.5 * (mean(&by_backcasts[0]) + mean(&by_backcasts[1])),
            weights,
            profiles,
        }
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
    fn of(response: &Response, zone: usize, steps: usize, block: usize) -> Sight {
        let place = |k: usize| k * (zone - 1) / (PLACES - 1);
        let places: Vec<usize> = (0..PLACES).map(place).collect();
        let row = |&j: &usize| (0..steps).map(|m| response.area(j + 1 + m * block, j + 1 + (m + 1) * block)).collect();
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

/// Errors in the output that each forecaster would have made after each cut of one end.
struct Backcasts {
    /// Cut by cut, forecaster by forecaster, place by place.
    errors: Vec<[[f64; PLACES]; COUNT]>,
}

impl Backcasts {
    fn of(end: &EndEvidence, sight: &Sight, steps: usize) -> Backcasts {
        let n = end.past.len();
        let cut = |(h, fits): &(usize, super::member::Fits)| {
            let (past, truth) = end.past.split_at(n - h);
            fits.continued(past, *h.min(&steps)).map(|ahead| {
                let errors: Vec<f64> = ahead.iter().zip(truth).map(|(a, t)| a - t).collect();
                sight.output(&errors)
            })
        };
        Backcasts { errors: end.cuts.iter().map(cut).collect() }
    }

    /// (mean over the cuts of the RMS output error)^2 of each forecaster: the root keeps one bad cut from deciding.
    fn scores(&self) -> [f64; COUNT] {
        let mut scores = [0.0; COUNT];
        for (member, score) in scores.iter_mut().enumerate() {
            let rms = |cut: &[[f64; PLACES]; COUNT]| mean_square(&cut[member]).sqrt();
            let mean = self.errors.iter().map(rms).sum::<f64>() / self.errors.len().max(1) as f64;
            *score = mean * mean;
        }
        scores
    }

    /// Mean squared output error of the weighted forecast at each place, over the cuts.
    fn variances(&self, weights: &[f64; COUNT]) -> [f64; PLACES] {
        let mut variances = [0.0; PLACES];
        for cut in &self.errors {
            for (place, variance) in variances.iter_mut().enumerate() {
                let error: f64 = (0..COUNT).map(|k| if weights[k] > 0.0 { weights[k] * cut[k][place] } else { 0.0 }).sum();
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
