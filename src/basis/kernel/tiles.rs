//! Columns into tiles and back: pairs of real columns are taken apart, blocks of eight by eight turned over.

use super::grid::{Grid, TILE};
use super::lanes::{LANES, POINT};
use pulp::{Simd, WithSimd};

type Block = [[f64; LANES]; LANES];

/// Loops over plain arrays, compiled for the vector instructions at hand.
pub struct Task<F: FnMut()>(pub F);

impl<F: FnMut()> WithSimd for Task<F> {
    type Output = ();

    #[inline(always)]
    fn with_simd<S: Simd>(mut self, _: S) {
        (self.0)();
    }
}

/// `N` values of `x` from `start` on.
#[inline(always)]
pub fn run<const N: usize>(x: &[f64], start: usize) -> &[f64; N] {
    x[start..].first_chunk::<N>().unwrap_or(&[0.0; N])
}

/// Lanes in opposite order.
#[inline(always)]
pub fn reversed(lanes: &[f64; LANES]) -> [f64; LANES] {
    std::array::from_fn(
        #[inline(always)]
        |l| lanes[LANES - 1 - l],
    )
}

#[inline(always)]
fn transposed(block: &Block) -> Block {
    std::array::from_fn(
        #[inline(always)]
        |i| {
            std::array::from_fn(
                #[inline(always)]
                |j| block[j][i],
            )
        },
    )
}

/// Takes the two real columns of each pair apart and lays twice their spectra into the block's tiles, row by row.
#[inline(always)]
pub fn part(grid: &Grid, points: &[f64], tiles: &mut [f64]) {
    let height = grid.height;
    let (points, _) = points[..height * POINT].as_chunks::<POINT>();
    let (tiles, _) = tiles.as_chunks_mut::<TILE>();
    for (block, tile) in tiles.iter_mut().enumerate() {
        let mut near = [[[0.0; LANES]; LANES]; 2];
        let mut far = [[[0.0; LANES]; LANES]; 2];
        for i in 0..LANES {
            let k = (block * LANES + i) % height;
            let (z, back) = (&points[k], &points[(height - k) % height]);
            for l in 0..LANES {
                near[0][i][l] = z[l] + back[l];
                near[1][i][l] = z[LANES + l] - back[LANES + l];
                far[0][i][l] = z[LANES + l] + back[LANES + l];
                far[1][i][l] = back[l] - z[l];
            }
        }
        let (quarters, _) = tile.as_chunks_mut::<LANES>();
        lay(quarters, 0, &near);
        lay(quarters, LANES, &far);
    }
}

/// Inverse of [`part`], with real and imaginary parts exchanged; the first tile stands at `place`.0, each following one
/// `place`.1 further on.
#[inline(always)]
pub fn join(grid: &Grid, tiles: &[f64], points: &mut [f64], place: (usize, usize)) {
    let Grid { height, rows, .. } = *grid;
    let (points, _) = points[..height * POINT].as_chunks_mut::<POINT>();
    let (tiles, _) = tiles.as_chunks::<TILE>();
    for block in 0..grid.row_blocks() {
        let tile = &tiles[place.0 + block * place.1];
        let (quarters, _) = tile.as_chunks::<LANES>();
        let [near_re, near_im] = lift(quarters, 0);
        let [far_re, far_im] = lift(quarters, LANES);
        for i in 0..LANES.min(rows - block * LANES) {
            let k = block * LANES + i;
            for l in 0..LANES {
                points[k][LANES + l] = near_re[i][l] - far_im[i][l];
                points[k][l] = near_im[i][l] + far_re[i][l];
            }
            if k > 0 && 2 * k < height {
                for l in 0..LANES {
                    points[height - k][LANES + l] = near_re[i][l] + far_im[i][l];
                    points[height - k][l] = far_re[i][l] - near_im[i][l];
                }
            }
        }
    }
}

/// Lays real and imaginary parts, row by row, into a tile from its point `at` on, column by column.
#[inline(always)]
fn lay(tile: &mut [[f64; LANES]], at: usize, parts: &[Block; 2]) {
    for (part, block) in parts.iter().enumerate() {
        let turned = transposed(block);
        for l in 0..LANES {
            tile[(at + l) * 2 + part] = turned[l];
        }
    }
}

/// Inverse of [`lay`].
#[inline(always)]
fn lift(tile: &[[f64; LANES]], at: usize) -> [Block; 2] {
    std::array::from_fn(
        #[inline(always)]
        |part| {
            transposed(&std::array::from_fn(
                #[inline(always)]
                |l| tile[(at + l) * 2 + part],
            ))
        },
    )
}

/// Lays complex columns into the first or second half of a block's tiles.
#[inline(always)]
pub fn spread(grid: &Grid, points: &[f64], tiles: &mut [f64], half: usize) {
    let (points, _) = points[..grid.height * POINT].as_chunks::<POINT>();
    let (tiles, _) = tiles.as_chunks_mut::<TILE>();
    for (block, tile) in tiles.iter_mut().enumerate() {
        let mut parts = [[[0.0; LANES]; LANES]; 2];
        for i in 0..LANES {
            let point = &points[grid.row(block, i)];
            parts[0][i].copy_from_slice(&point[..LANES]);
            parts[1][i].copy_from_slice(&point[LANES..]);
        }
        lay(tile.as_chunks_mut::<LANES>().0, half * LANES, &parts);
    }
}
