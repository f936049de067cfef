//! Transforms of long records: few passes over memory, eight signals at a time.

mod awkward;
mod butterfly;
mod convolution;
mod cosine;
mod four;
mod grid;
mod lanes;
mod prime;
mod roots;
mod rows;
mod tiles;
mod turn;

pub use four::LongFour;

use awkward::AwkwardCosine;
use cosine::LongCosine;

use crate::ends::Parity;

/// Below this many points the general kernels are as fast.
const LEAST: usize = 8192;

/// Prime factors from here on are too long for the lanes of a grid.
const LARGE_PRIME: usize = 20_000;

/// DCT-II, DCT-III and their sine counterparts of a long record.
#[derive(Debug)]
pub enum LongTwo {
    /// Both sides of the grid are short.
    Grid(Box<LongCosine>),
    /// The length has a large prime factor.
    Prime(Box<AwkwardCosine>),
}

impl LongTwo {
    /// The transform for `len` points, where it wins over the general kernels.
    pub fn new(len: usize) -> Option<Self> {
        if len < LEAST {
            return None;
        }
        let largest = largest_prime(len);
        if largest >= LARGE_PRIME {
            return AwkwardCosine::new(largest, len / largest).map(|plan| Self::Prime(Box::new(plan)));
        }
        grid::height(len).map(|height| Self::Grid(Box::new(LongCosine::new(height, len / height))))
    }

    /// Numbers of scratch that a transform needs.
    pub fn scratch_len(&self) -> usize {
        match self {
            Self::Grid(plan) => plan.scratch_len(),
            Self::Prime(plan) => plan.scratch_len(),
        }
    }

    /// c_k = A_k sum_n x_n cos(pi k (n + 1/2)/N), or with odd mirrors A_k sum_n x_n sin(pi (k + 1)(n + 1/2)/N), in place.
    pub fn forward(&self, x: &mut [f64], scratch: &mut [f64], mirrors: Parity) {
        match self {
            Self::Grid(plan) => plan.forward(x, scratch, mirrors),
            Self::Prime(plan) => plan.forward(x, scratch, mirrors),
        }
    }

    /// The inverse of [`LongTwo::forward`].
    pub fn inverse(&self, c: &mut [f64], scratch: &mut [f64], mirrors: Parity) {
        match self {
            Self::Grid(plan) => plan.inverse(c, scratch, mirrors),
            Self::Prime(plan) => plan.inverse(c, scratch, mirrors),
        }
    }
}

/// DCT-IV and DST-IV for `len` points, where it wins over the general kernels.
pub fn long_four(len: usize) -> Option<LongFour> {
    if len < LEAST || !len.is_multiple_of(2) || largest_prime(len) >= LARGE_PRIME {
        return None;
    }
    grid::height(len / 2).map(|height| LongFour::new(height, len / 2 / height))
}

fn largest_prime(len: usize) -> usize {
    grid::primes(len).last().copied().unwrap_or(1)
}
