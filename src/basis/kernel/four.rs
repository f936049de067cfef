//! DCT-IV and DST-IV of long records of even length, in two passes over memory.
//!
//! With z_n = x_2n + i x_(N-1-2n) and phi = pi (2k + 1/2)(2n + 1/2)/N, C_2k - i C_(N-1-2k) = sum_n z_n exp(-i phi), and
//! phi = 2 pi k n/(N/2) + pi (k + 1/8)/N + pi (n + 1/8)/N: a transform of N/2 points between two equal twiddles. The N/2
//! points are laid out as a grid.

use super::grid::{Grid, TILE};
use super::lanes::{LANES, LaneTransform, POINT};
use super::roots::root;
use super::tiles::{Task, run, spread};
use super::turn::Twiddles;
use crate::ends::Parity;
use pulp::Arch;
use std::fmt;

/// Orthonormal transforms of N = 2 x height x width points.
pub struct LongFour {
    grid: Grid,
    column: LaneTransform,
    row: LaneTransform,
    /// exp(-i pi j1 / (2 height)), what lies before the columns.
    before: Vec<[f64; 2]>,
    /// exp(-i pi k2 / (2 width)), what follows the rows.
    after: Vec<[f64; 2]>,
    twiddles: Twiddles,
}

impl LongFour {
    /// A plan for columns of `height` points and rows of `width` points, at least 16.
    pub fn new(height: usize, width: usize) -> Self {
        let grid = Grid::new(height, width, height);
        let len = 2 * height * width;
        let quarters = |n: usize| (0..n as u64).map(|k| root(k, 4 * n as u64)).collect();
        Self {
            grid,
            column: LaneTransform::new(height),
            row: LaneTransform::new(width),
            before: quarters(height),
            after: quarters(width),
            twiddles: Twiddles::new(grid, 8 * len as u64, (2.0 / len as f64).sqrt(), (4, 1), (16, 4)),
        }
    }

    /// Numbers of scratch that a transform needs.
    pub fn scratch_len(&self) -> usize {
        self.grid.space() + 2 * self.column.space().max(self.row.space())
    }

    /// c_k = sqrt(2/N) sum_n x_n cos(pi (k + 1/2)(n + 1/2)/N) where the left mirror is even, the same with sines where it is
    /// odd; its own inverse. Read backwards in n the sine is (-1)^k times the cosine.
    pub fn transform(&self, x: &mut [f64], scratch: &mut [f64], left: Parity) {
        let arch = Arch::new();
        let grid = &self.grid;
        let (tiles, work) = scratch.split_at_mut(grid.space());
        let (one, rest) = work.split_at_mut(self.column.space().max(self.row.space()));
        let two = &mut rest[..one.len()];
        for (block, tiles) in tiles.chunks_exact_mut(grid.row_blocks() * TILE).enumerate() {
            for half in 0..2 {
                arch.dispatch(Task(#[inline(always)] || self.gather(x, one, block, half, left)));
                let (done, _) = self.column.run(arch, one, two);
                arch.dispatch(Task(#[inline(always)] || spread(grid, done, tiles, half)));
            }
        }
        for block in 0..grid.row_blocks() {
            self.twiddles.turn(arch, block, tiles, one);
            let (done, _) = self.row.run(arch, one, two);
            arch.dispatch(Task(#[inline(always)] || self.store(done, x, block, left)));
        }
    }

    /// Reads eight columns, from the left for half 0 and opposite ones for half 1.
    #[inline(always)]
    fn gather(&self, x: &[f64], points: &mut [f64], block: usize, half: usize, left: Parity) {
        let Grid { width, .. } = self.grid;
        let first = self.grid.first_column(block);
        let (points, _) = points.as_chunks_mut::<POINT>();
        for (j, (point, w)) in points.iter_mut().zip(&self.before).enumerate() {
            // The lowest n among the eight.
            let low = width * j + if half == 0 { first } else { width - LANES - first };
            let direct: &[f64; POINT] = run(x, 2 * low);
            let opposite: &[f64; POINT] = run(x, x.len() - POINT - 2 * low);
            let (mut evens, mut odds) = ([0.0; LANES], [0.0; LANES]);
            for l in 0..LANES {
                let at = if half == 0 { l } else { LANES - 1 - l };
                (evens[l], odds[l]) = (direct[2 * at], opposite[POINT - 1 - 2 * at]);
            }
            if left == Parity::Odd {
                std::mem::swap(&mut evens, &mut odds);
            }
            for l in 0..LANES {
                point[l] = evens[l] * w[0] - odds[l] * w[1];
                point[LANES + l] = evens[l] * w[1] + odds[l] * w[0];
            }
        }
    }

    /// Writes a block of rows: real parts to the even places, imaginary parts to the odd ones.
    #[inline(always)]
    fn store(&self, points: &[f64], x: &mut [f64], block: usize, left: Parity) {
        let Grid { height, .. } = self.grid;
        let first = block * LANES;
        let last = x.len() - 1;
        let sign = if left == Parity::Even { -1.0 } else { 1.0 };
        let (points, _) = points.as_chunks::<POINT>();
        for (k2, (point, w)) in points.iter().zip(&self.after).enumerate() {
            let k = first + height * k2;
            let (mut evens, mut odds) = ([0.0; LANES], [0.0; LANES]);
            for l in 0..LANES {
                evens[l] = point[l] * w[0] - point[LANES + l] * w[1];
                odds[l] = sign * (point[l] * w[1] + point[LANES + l] * w[0]);
            }
            for l in 0..LANES.min(height - first) {
                x[2 * (k + l)] = evens[l];
                x[last - 2 * (k + l)] = odds[l];
            }
        }
    }
}

impl fmt::Debug for LongFour {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        write!(f, "LongFour({} x {})", self.grid.height, self.grid.width)
    }
}
