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
        let grid = Grid::full(height, width);
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
                arch.dispatch(Task(
                    #[inline(always)]
                    || self.gather(x, one, block, half, left),
                ));
                let (done, _) = self.column.run(arch, one, two);
                arch.dispatch(Task(
                    #[inline(always)]
                    || spread(grid, done, tiles, half),
                ));
            }
        }
        for block in 0..grid.row_blocks() {
            self.twiddles.turn(arch, block, tiles, one);
            let (done, _) = self.row.run(arch, one, two);
            arch.dispatch(Task(
                #[inline(always)]
                || self.store(done, x, block, left),
            ));
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

    /// Writes a block of rows: real parts of point k to place 2k, imaginary parts of the point as far from the end to
    /// place 2k + 1; that one is in the same block, width - 1 - k2 along the opposite row.
    #[inline(always)]
    fn store(&self, points: &[f64], x: &mut [f64], block: usize, left: Parity) {
        const HALF: usize = LANES / 2;
        let Grid { height, width, .. } = self.grid;
        let first = block * HALF;
        let sign = if left == Parity::Even { -1.0 } else { 1.0 };
        let (points, _) = points.as_chunks::<POINT>();
        for (k2, (point, w)) in points[..width].iter().zip(&self.after).enumerate() {
            let (back, turn) = (&points[width - 1 - k2], &self.after[width - 1 - k2]);
            let (mut evens, mut odds) = ([0.0; LANES], [0.0; LANES]);
            for l in 0..LANES {
                evens[l] = point[l] * w[0] - point[LANES + l] * w[1];
                odds[l] = sign * (back[l] * turn[1] + back[LANES + l] * turn[0]);
            }
            let (mut near, mut far) = ([0.0; LANES], [0.0; LANES]);
            for l in 0..HALF {
                (near[2 * l], near[2 * l + 1]) = (evens[l], odds[HALF + l]);
                (far[LANES - 2 - 2 * l], far[LANES - 1 - 2 * l]) = (evens[HALF + l], odds[l]);
            }
            let line = &mut x[2 * height * k2..][..2 * height];
            line[2 * first..][..LANES].copy_from_slice(&near);
            line[2 * (height - HALF - first)..][..LANES].copy_from_slice(&far);
        }
    }
}

impl fmt::Debug for LongFour {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        write!(f, "LongFour({} x {})", self.grid.height, self.grid.width)
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::basis::angle;
    use crate::numeric::compensated::Compensated;

    #[test]
    fn grids_of_every_shape_meet_the_definition_and_come_back() {
        // Even and odd sides, whole and partial blocks, and 17 and 19 by the general kernel.
        for (height, width) in [(16, 16), (17, 16), (16, 17), (18, 22), (21, 33), (39, 49), (12, 24)] {
            let plan = LongFour::new(height, width);
            let len = 2 * height * width;
            let x: Vec<f64> = (0..len).map(|n| ((n * n + 5) % 97) as f64 / 97.0 - 0.5).collect();
            let norm = x.iter().map(|v| v * v).sum::<f64>().sqrt();
            let mut scratch = vec![f64::NAN; plan.scratch_len()];
            // As for the cosines: below an eps in the mean for each of log2(N) stages.
            let bound = 0.5 * f64::EPSILON * (len as f64).log2() * norm;
            for left in [Parity::Even, Parity::Odd] {
                let mut c = x.clone();
                plan.transform(&mut c, &mut scratch, left);
                for k in (0..len).step_by(len / 61).chain([len - 1]) {
                    let term = |n: usize| {
                        let (c, s) = angle::of_turns(((2 * k + 1) * (2 * n + 1)) as u64, 8 * len as u64);
                        x[n] * (2.0 / len as f64).sqrt() * if left == Parity::Even { c } else { s }
                    };
                    let want = (0..len).map(term).collect::<Compensated>().value();
                    assert!((c[k] - want).abs() < bound, "{height} x {width} {left:?} {k}: {} {want}", c[k]);
                }
                scratch.fill(f64::NAN);
                plan.transform(&mut c, &mut scratch, left);
                let far = x.iter().zip(&c).map(|(a, b)| (a - b) * (a - b)).sum::<f64>().sqrt();
                assert!(far < bound, "{height} x {width} {left:?}: back {far:e}, bound {bound:e}");
            }
        }
    }
}
