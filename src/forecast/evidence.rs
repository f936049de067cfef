//! What a record's own past says about its continuation, whatever the operator: fits at both ends and their backcasts.

use crate::baseline::Side;
use crate::forecast::member::Fits;
use crate::numeric::{quantum, sum};

/// At most this many blocks of history are used at each end.
pub const LONGEST_HISTORY: usize = 4096;

/// Blocks per shortest corner wavelength: finer detail does not reach the output.
const BLOCKS_PER_WAVELENGTH: f64 = 64.0;

/// How many times the end is cut back to see how well the rest would have foretold it.
const CUTS: usize = 8;

/// The cuts go back by multiples of this fraction of the history.
const CUT_FRACTION: usize = 20;

/// Fits at both ends of one record, for one block length.
pub struct Evidence {
    /// Samples per block.
    block: usize,
    /// Samples of the record.
    len: usize,
    /// What the values are rounded to, as far as they show it.
    quantum: f64,
    left: EndEvidence,
    right: EndEvidence,
}

/// One end: its past in blocks, oldest first, and the models fitted to it and to what remains after each cut.
pub(super) struct EndEvidence {
    pub past: Vec<f64>,
    pub fits: Fits,
    /// Blocks cut off, and the fits to the rest.
    pub cuts: Vec<(usize, Fits)>,
}

impl Evidence {
    /// The block length that suits a shortest corner wavelength, both in samples.
    pub fn block_length(shortest_wavelength: f64) -> usize {
        ((shortest_wavelength / BLOCKS_PER_WAVELENGTH) as usize).max(1)
    }

    /// Gathers the evidence; `None` for a record of fewer than four blocks.
    pub fn gather(samples: &[f64], block: usize) -> Option<Evidence> {
        let block = block.max(1);
        if samples.len() / block < 4 {
            return None;
        }
        let end = |side| EndEvidence::of(block_means(samples, side, block));
        Some(Evidence {
            block,
            len: samples.len(),
            quantum: quantum::rounding(samples),
            left: end(Side::Left),
            right: end(Side::Right),
        })
    }

    /// The histories alone, in blocks towards the left and the right end, oldest first.
    pub fn histories(samples: &[f64], block: usize) -> [Vec<f64>; 2] {
        [Side::Left, Side::Right].map(|side| block_means(samples, side, block.max(1)))
    }

    /// Samples per block.
    pub fn block(&self) -> usize {
        self.block
    }

    /// Samples of the record it was gathered from.
    pub fn samples(&self) -> usize {
        self.len
    }

    /// What the values are rounded to, in the record's unit; 0 where they do not show it.
    pub fn quantum(&self) -> f64 {
        self.quantum
    }

    /// Block means of the history at one end, oldest first: the last one touches the end.
    pub fn blocks(&self, side: Side) -> &[f64] {
        &self.at(side).past
    }

    pub(super) fn at(&self, side: Side) -> &EndEvidence {
        match side {
            Side::Left => &self.left,
            Side::Right => &self.right,
        }
    }
}

impl EndEvidence {
    fn of(past: Vec<f64>) -> EndEvidence {
        let n = past.len();
        let cuts: Vec<usize> = (1..=CUTS).map(|q| q * n / CUT_FRACTION).filter(|h| *h >= 2).collect();
        let stops: Vec<usize> = std::iter::once(n).chain(cuts.iter().map(|h| n - h)).collect();
        let mut fits = Fits::to(&past, &stops);
        let rest = fits.split_off(1);
        EndEvidence { fits: fits.swap_remove(0), cuts: cuts.into_iter().zip(rest).collect(), past }
    }
}

/// Means over blocks counted from the end, oldest first (towards the end).
fn block_means(samples: &[f64], side: Side, block: usize) -> Vec<f64> {
    let count = (samples.len() / block).min(LONGEST_HISTORY);
    let mean = |k: usize| match side {
        Side::Left => sum::mean(&samples[k * block..(k + 1) * block]),
        Side::Right => sum::mean(&samples[samples.len() - (k + 1) * block..samples.len() - k * block]),
    };
    (0..count).rev().map(mean).collect()
}
