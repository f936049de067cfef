//! Differences at the ends of long records, from the blocks next to them alone.
//!
//! With a reach far shorter than the record, an extension changes the output only near the ends, and there only by what
//! lies outside: y_a(j) - y_b(j) = sum over m of h(j + 1 + m) (a_m - b_m), a and b the two continuations counted outwards.
//! The impulse response is smooth over one block of the history, so that block means serve in place of samples.

use crate::baseline::{EndEstimates, Side};
use crate::ends::{Ends, Parity};
use crate::forecast::{Evidence, Forecast, Response};
use crate::numeric::autoregression::dot;
use crate::numeric::polynomial::Polynomial;

use super::candidate::Candidate;
use super::difference::Difference;

/// The kernel is followed to this many reaches: the thousandth that lies past one reach would show in small differences.
const REACHES: usize = 2;

/// Largest admitted change of the impulse response over one block, summed over it and relative to its area.
const ROUGHEST: f64 = 0.25;

/// The outside of a record in blocks, and how they are seen from inside.
pub(super) struct Near<'a> {
    evidence: &'a Evidence,
    /// Blocks outside each end that are seen.
    blocks: usize,
    /// Places inside, one a block.
    places: usize,
    /// Impulse response summed over blocks.
    seen: Vec<f64>,
    /// Sign of the response at negative lags.
    mirrored: f64,
}

impl<'a> Near<'a> {
    /// `None` when the reach is not short against the record or the impulse response is rough over a block.
    pub fn new(evidence: &'a Evidence, response: &Response, farthest: usize) -> Option<Near<'a>> {
        let block = evidence.block();
        let far = REACHES * response.reach();
        let blocks = far.div_ceil(block);
        if 2 * far > evidence.samples() || blocks > evidence.blocks(Side::Left).len() {
            return None;
        }
        if block > 1 && response.roughness() * block as f64 > ROUGHEST {
            return None;
        }
        let places = farthest.div_ceil(block) + 1;
        let seen =
            (0..blocks + places).map(|i| response.area(Side::Left, i * block + 1, (i + 1) * block + 1)).collect();
        let mirrored = if response.shape().turns % 2 == 0 { 1.0 } else { -1.0 };
        Some(Near { evidence, blocks, places, seen, mirrored })
    }

    /// The blocks outside one end under a symmetric extension.
    pub fn symmetric(&self, candidate: &Candidate, found: &EndEstimates, mean: f64, side: Side) -> Vec<f64> {
        let len = self.evidence.samples();
        let length = len as f64;
        let block = self.evidence.block();
        let baseline = candidate.polynomial(found, mean, length);
        let bend = baseline.derivative().derivative();
        // Mean of a polynomial of degree 3 or less over the samples of block k outwards, exactly.
        let spread = ((block * block) as f64 - 1.0) / 24.0;
        let average = |p: &Polynomial, x: f64| p.at(x) + spread * bend.at(x);
        // The end itself, the direction out of the record, and the end whose blocks are repeated outside.
        let (end, outwards) = if side == Side::Left { (0.0, -1.0) } else { (length, 1.0) };
        let (source, sign) = match (candidate.ends, side) {
            (Ends::Periodic, Side::Left) => (Side::Right, 1.0),
            (Ends::Periodic, Side::Right) => (Side::Left, 1.0),
            (Ends::Mirror { left, .. }, Side::Left) => (side, sign(left)),
            (Ends::Mirror { right, .. }, Side::Right) => (side, sign(right)),
        };
        let own_end = if source == Side::Left { 0.0 } else { length };
        let inwards = if source == Side::Left { 1.0 } else { -1.0 };
        let blocks = self.evidence.blocks(source).iter().rev().take(self.blocks).enumerate();
        blocks
            .map(|(k, value)| {
                let middle = (k as f64 + 0.5) * block as f64;
                let rest = value - average(&baseline, own_end + inwards * middle);
                sign * rest + average(&baseline, end + outwards * middle)
            })
            .collect()
    }

    /// The blocks outside one end under the forecast, even beyond it.
    pub fn foretold(&self, forecast: &Forecast, side: Side) -> Vec<f64> {
        let ahead = forecast.blocks(side);
        let past = self.evidence.blocks(side);
        // Beyond the continuation it is reflected, then the record itself.
        let reflected = ahead.iter().rev().chain(past.iter().rev());
        ahead.iter().chain(reflected).take(self.blocks).copied().collect()
    }

    /// The same value in every block outside.
    pub fn constant(&self, value: f64) -> Vec<f64> {
        vec![value; self.blocks]
    }

    /// What the operator makes of the difference of two outsides, each left and right.
    pub fn difference(&self, outside: &[Vec<f64>; 2], forecast: &[Vec<f64>; 2]) -> Difference {
        let end = |side: usize, sign: f64| {
            let change: Vec<f64> = outside[side].iter().zip(&forecast[side]).map(|(a, b)| a - b).collect();
            (0..self.places).map(|i| sign * dot(&self.seen[i..i + change.len()], &change)).collect()
        };
        Difference { spacing: self.evidence.block(), ends: [end(0, 1.0), end(1, self.mirrored)] }
    }
}

fn sign(parity: Parity) -> f64 {
    match parity {
        Parity::Even => 1.0,
        Parity::Odd => -1.0,
    }
}
