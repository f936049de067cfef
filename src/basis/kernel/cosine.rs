//! DCT-II, DCT-III and their sine counterparts of long records, in two passes over memory.
//!
//! The even samples forwards, then the odd ones backwards, are a sequence v whose spectrum V gives the cosine sums C:
//! exp(-i pi k/2N) V_k = C_k - i C_(N-k) (Makhoul 1980, IEEE Trans. Acoustics, Speech and Signal Processing 28, 27).
//! v is laid out as a grid. Its columns are real: column j and the opposite one go through one complex transform, and half
//! the rows suffice (Bailey 1990, J. Supercomputing 4, 23, for the grid; the pairing of opposite columns makes the reordering read
//! and write whole runs, since sample 2n and sample 2n + 1 lie opposite each other in v).

use super::grid::{Grid, TILE};
use super::lanes::{LANES, LaneTransform, POINT};
use super::rows::Rows;
use super::tiles::{Task, join, part, run};
use super::turn::Twiddles;
use crate::ends::Parity;
use pulp::Arch;
use std::f64::consts::{FRAC_1_SQRT_2, SQRT_2};
use std::fmt;

/// Orthonormal transforms of N = height x width points.
pub struct LongCosine {
    grid: Grid,
    column: LaneTransform,
    row: LaneTransform,
    rows: Rows,
    twiddles: Twiddles,
}

impl LongCosine {
    /// A plan for columns of `height` points and rows of `width` points, at least 16.
    pub fn new(height: usize, width: usize) -> Self {
        let grid = Grid::half(height, width);
        let len = height * width;
        // 1/2 undoes the parting of the pairs.
        let scale = 0.5 * (2.0 / len as f64).sqrt();
        Self {
            grid,
            column: LaneTransform::new(height),
            row: LaneTransform::new(width),
            rows: Rows::new(grid),
            twiddles: Twiddles::new(grid, 4 * len as u64, scale, (1, 0), (4, 0)),
        }
    }

    /// Numbers of scratch that a transform needs.
    pub fn scratch_len(&self) -> usize {
        self.grid.space() + 2 * self.column.space().max(self.row.space())
    }

    /// c_k = A_k sum_n x_n cos(pi k (n + 1/2)/N), or with odd mirrors A_k sum_n x_n sin(pi (k + 1)(n + 1/2)/N).
    pub fn forward(&self, x: &mut [f64], scratch: &mut [f64], mirrors: Parity) {
        let arch = Arch::new();
        let grid = &self.grid;
        let (tiles, work) = scratch.split_at_mut(grid.space());
        let (one, rest) = work.split_at_mut(self.column.space().max(self.row.space()));
        let two = &mut rest[..one.len()];
        for (block, tiles) in tiles.chunks_exact_mut(grid.row_blocks() * TILE).enumerate() {
            arch.dispatch(Task(
                #[inline(always)]
                || self.gather(x, one, block, mirrors),
            ));
            let (done, _) = self.column.run(arch, one, two);
            arch.dispatch(Task(
                #[inline(always)]
                || part(grid, done, tiles),
            ));
        }
        for block in 0..grid.row_blocks() {
            self.twiddles.turn(arch, block, tiles, one);
            let (done, _) = self.row.run(arch, one, two);
            arch.dispatch(Task(
                #[inline(always)]
                || self.rows.store(done, x, block, mirrors),
            ));
        }
        x[flat(x.len(), mirrors)] *= FRAC_1_SQRT_2;
    }

    /// The inverse of [`LongCosine::forward`].
    pub fn inverse(&self, c: &mut [f64], scratch: &mut [f64], mirrors: Parity) {
        let arch = Arch::new();
        let grid = &self.grid;
        let (tiles, work) = scratch.split_at_mut(grid.space());
        let (one, rest) = work.split_at_mut(self.column.space().max(self.row.space()));
        let two = &mut rest[..one.len()];
        c[flat(c.len(), mirrors)] *= SQRT_2;
        for (block, tiles) in tiles.chunks_exact_mut(grid.pair_blocks() * TILE).enumerate() {
            arch.dispatch(Task(
                #[inline(always)]
                || self.rows.load(c, one, block, mirrors),
            ));
            let (done, _) = self.row.run(arch, one, two);
            self.twiddles.turn_back(arch, block, done, tiles, (0, 1));
        }
        for block in 0..grid.pair_blocks() {
            arch.dispatch(Task(
                #[inline(always)]
                || join(grid, tiles, one, (block, grid.pair_blocks())),
            ));
            let (done, _) = self.column.run(arch, one, two);
            arch.dispatch(Task(
                #[inline(always)]
                || self.scatter(done, c, block, mirrors),
            ));
        }
    }

    /// Reads a block of column pairs of v: the columns as real parts, the opposite ones as imaginary parts.
    #[inline(always)]
    fn gather(&self, x: &[f64], points: &mut [f64], block: usize, mirrors: Parity) {
        let Grid { height, width, .. } = self.grid;
        let sign = sign(mirrors);
        let first = self.grid.first_column(block);
        let (points, _) = points.as_chunks_mut::<POINT>();
        for j in 0..height / 2 {
            let opposite = height - 1 - j;
            let line = &x[2 * width * j..][..2 * width];
            let near: &[f64; POINT] = run(line, 2 * first);
            let far: &[f64; POINT] = run(line, 2 * (width - LANES - first));
            for l in 0..LANES {
                points[j][l] = near[2 * l];
                points[j][LANES + l] = far[POINT - 2 - 2 * l];
                points[opposite][l] = sign * far[POINT - 1 - 2 * l];
                points[opposite][LANES + l] = sign * near[2 * l + 1];
            }
        }
        if !height.is_multiple_of(2) {
            let j = height / 2;
            let line = &x[2 * width * j..];
            let odd = |column: usize| if 2 * column < line.len() { 1.0 } else { sign };
            // The middle line turns: 2 j2 while that is inside, then backwards over the odd samples.
            let place = |column: usize| {
                if 2 * column < line.len() { 2 * column } else { 2 * (line.len() - column) - 1 }
            };
            for l in 0..LANES {
                let column = first + l;
                let mirrored = width - 1 - column;
                points[j][l] = odd(column) * line[place(column)];
                points[j][LANES + l] = odd(mirrored) * line[place(mirrored)];
            }
        }
    }

    /// Inverse of [`LongCosine::gather`]; the points come with real and imaginary parts exchanged.
    #[inline(always)]
    fn scatter(&self, points: &[f64], x: &mut [f64], block: usize, mirrors: Parity) {
        let Grid { height, width, .. } = self.grid;
        let sign = sign(mirrors);
        let first = self.grid.first_column(block);
        let (points, _) = points.as_chunks::<POINT>();
        for j in 0..height / 2 {
            let opposite = height - 1 - j;
            let line = &mut x[2 * width * j..][..2 * width];
            let mut near = [0.0; POINT];
            let mut far = [0.0; POINT];
            for l in 0..LANES {
                near[2 * l] = points[j][LANES + l];
                near[2 * l + 1] = sign * points[opposite][l];
                far[POINT - 2 - 2 * l] = points[j][l];
                far[POINT - 1 - 2 * l] = sign * points[opposite][LANES + l];
            }
            line[2 * first..][..POINT].copy_from_slice(&near);
            line[2 * (width - LANES - first)..][..POINT].copy_from_slice(&far);
        }
        if !height.is_multiple_of(2) {
            let j = height / 2;
            let line = &mut x[2 * width * j..];
            let len = line.len();
            let mut put = |column: usize, value: f64| {
                if 2 * column < len {
                    line[2 * column] = value;
                } else {
                    line[2 * (len - column) - 1] = sign * value;
                }
            };
            for l in 0..LANES {
                put(first + l, points[j][LANES + l]);
                put(width - 1 - first - l, points[j][l]);
            }
        }
    }
}

impl fmt::Debug for LongCosine {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        write!(f, "LongCosine({} x {})", self.grid.height, self.grid.width)
    }
}

/// The place of the function that is 1 in magnitude on every sample.
pub fn flat(len: usize, mirrors: Parity) -> usize {
    match mirrors {
        Parity::Even => 0,
        Parity::Odd => len - 1,
    }
}

/// The factor of the odd samples.
pub fn sign(mirrors: Parity) -> f64 {
    match mirrors {
        Parity::Even => 1.0,
        Parity::Odd => -1.0,
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::basis::angle;
    use crate::numeric::compensated::Compensated;

    /// cos(pi k (n + 1/2)/N) or sin(pi (k + 1)(n + 1/2)/N), normalised.
    fn function(mirrors: Parity, len: usize, k: usize, n: usize) -> f64 {
        let waves = if mirrors == Parity::Even { k } else { k + 1 };
        let (c, s) = angle::of_turns((waves * (2 * n + 1)) as u64, 4 * len as u64);
        let scale = if k == flat(len, mirrors) { 1.0 } else { 2.0 };
        (scale / len as f64).sqrt() * if mirrors == Parity::Even { c } else { s }
    }

    #[test]
    fn grids_of_every_shape_meet_the_definition_and_come_back() {
        // Even and odd sides, whole and partial blocks, every small transform, and 17, 19 and 31 by the general kernel.
        let shapes =
            [(16, 16), (17, 16), (16, 17), (15, 22), (26, 33), (49, 31), (64, 19), (121, 125), (3, 169), (8, 24)];
        for (height, width) in shapes {
            let len = height * width;
            let plan = LongCosine::new(height, width);
            let x: Vec<f64> = (0..len).map(|n| ((n * n + 5) % 97) as f64 / 97.0 - 0.3).collect();
            let norm = x.iter().map(|v| v * v).sum::<f64>().sqrt();
            let mut scratch = vec![f64::NAN; plan.scratch_len()];
            // The mean error of one transform is below an eps for each of its log2(N) stages; any entry is allowed as much.
            let bound = 0.5 * f64::EPSILON * (len as f64).log2() * norm;
            for mirrors in [Parity::Even, Parity::Odd] {
                let mut c = x.clone();
                plan.forward(&mut c, &mut scratch, mirrors);
                for k in (0..len).step_by(len / 61).chain([len - 1]) {
                    let want = (0..len).map(|n| x[n] * function(mirrors, len, k, n)).collect::<Compensated>().value();
                    assert!((c[k] - want).abs() < bound, "{height} x {width} {mirrors:?} {k}: {} {want}", c[k]);
                }
                scratch.fill(f64::NAN);
                plan.inverse(&mut c, &mut scratch, mirrors);
                let far = x.iter().zip(&c).map(|(a, b)| (a - b) * (a - b)).sum::<f64>().sqrt();
                assert!(far < bound, "{height} x {width} {mirrors:?}: back {far:e}, bound {bound:e}");
            }
        }
    }
}
