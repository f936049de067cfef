//! The twiddles between columns and rows, multiplied in while the rows are read from the tiles or written back.

use super::butterfly::{get, mul, mul_conjugate, put};
use super::grid::{Grid, TILE};
use super::lanes::{LANES, POINT};
use super::roots::{Roots, product};
use pulp::{Arch, Simd, WithSimd};

/// scale w^(row.0 k1 + row.1) w^((step.0 k1 + step.1) j2) for row k1 and column j2, with w = exp(-2 pi i / order).
#[derive(Debug)]
pub struct Twiddles {
    grid: Grid,
    scale: f64,
    row: (u64, u64),
    step: (u64, u64),
    roots: Roots,
}

impl Twiddles {
    /// All exponents must stay below `order`.
    pub fn new(grid: Grid, order: u64, scale: f64, row: (u64, u64), step: (u64, u64)) -> Self {
        Self { grid, scale, row, step, roots: Roots::new(order) }
    }

    /// Reads a block of rows from all tiles, laid out pair block by pair block, and multiplies by the twiddles.
    pub fn turn(&self, arch: Arch, block: usize, tiles: &[f64], points: &mut [f64]) {
        arch.dispatch(Turn { plan: self, block, tiles, points });
    }

    /// Multiplies a block of rows by the conjugate twiddles and writes its tiles, the first at `place`.0 and each following
    /// one `place`.1 further on; the points come with real and imaginary parts exchanged.
    pub fn turn_back(&self, arch: Arch, block: usize, points: &[f64], tiles: &mut [f64], place: (usize, usize)) {
        arch.dispatch(TurnBack { plan: self, block, tiles, place, points });
    }

    /// For a block of rows: the twiddles of the first few columns, then the row's own with the scale, without and with the
    /// twiddle of the last column.
    #[inline(always)]
    fn fine(&self, block: usize) -> ([[f64; POINT]; LANES], [f64; POINT], [f64; POINT]) {
        let mut fine = [[0.0; POINT]; LANES];
        let (mut start, mut end) = ([0.0; POINT], [0.0; POINT]);
        for l in 0..LANES {
            let row = self.grid.row(block, l) as u64;
            let step = self.step.0 * row + self.step.1;
            let [c, s] = self.roots.at(self.row.0 * row + self.row.1);
            let turn = [self.scale * c, self.scale * s];
            (start[l], start[LANES + l]) = (turn[0], turn[1]);
            let [c, s] = product(turn, self.roots.at(step * (self.grid.width as u64 - 1)));
            (end[l], end[LANES + l]) = (c, s);
            for (j, fine) in fine.iter_mut().enumerate().take(self.grid.width) {
                let [c, s] = self.roots.at(step * j as u64);
                (fine[l], fine[LANES + l]) = (c, s);
            }
        }
        (fine, start, end)
    }

    /// The twiddles of one column for a block of rows.
    #[inline(always)]
    fn coarse(&self, block: usize, column: usize) -> [f64; POINT] {
        let mut coarse = [0.0; POINT];
        for l in 0..LANES {
            let row = self.grid.row(block, l) as u64;
            let [c, s] = self.roots.at((self.step.0 * row + self.step.1) * column as u64);
            (coarse[l], coarse[LANES + l]) = (c, s);
        }
        coarse
    }
}

/// One block of rows, read.
struct Turn<'a> {
    plan: &'a Twiddles,
    block: usize,
    tiles: &'a [f64],
    points: &'a mut [f64],
}

impl WithSimd for Turn<'_> {
    type Output = ();

    #[inline(always)]
    fn with_simd<S: Simd>(self, simd: S) {
        let grid = &self.plan.grid;
        let tiles = self.tiles.as_chunks::<TILE>().0;
        let (points, _) = self.points.as_chunks_mut::<POINT>();
        let (fine, start, end) = self.plan.fine(self.block);
        for pairs in 0..grid.pair_blocks() {
            let first = grid.first_column(pairs);
            let coarse = self.plan.coarse(self.block, first);
            let (tile, _) = tiles[pairs * grid.row_blocks() + self.block].as_chunks::<POINT>();
            for h in 0..const { LANES / S::F64_LANES } {
                let coarse = get(simd, &coarse, h);
                let near = mul(simd, get(simd, &start, h), coarse);
                let far = mul_conjugate(simd, get(simd, &end, h), coarse);
                for l in 0..LANES {
                    let fine = get(simd, &fine[l], h);
                    let value = mul(simd, get(simd, &tile[l], h), mul(simd, near, fine));
                    put(simd, &mut points[first + l], h, value);
                    let value = mul(simd, get(simd, &tile[LANES + l], h), mul_conjugate(simd, far, fine));
                    put(simd, &mut points[grid.width - 1 - first - l], h, value);
                }
            }
        }
    }
}

/// One block of rows, written.
struct TurnBack<'a> {
    plan: &'a Twiddles,
    block: usize,
    tiles: &'a mut [f64],
    place: (usize, usize),
    points: &'a [f64],
}

impl WithSimd for TurnBack<'_> {
    type Output = ();

    #[inline(always)]
    fn with_simd<S: Simd>(self, simd: S) {
        let grid = &self.plan.grid;
        let tiles = self.tiles.as_chunks_mut::<TILE>().0;
        let (points, _) = self.points.as_chunks::<POINT>();
        let (fine, start, end) = self.plan.fine(self.block);
        for (pairs, tile) in tiles.iter_mut().skip(self.place.0).step_by(self.place.1).enumerate() {
            let first = grid.first_column(pairs);
            let coarse = self.plan.coarse(self.block, first);
            let (tile, _) = tile.as_chunks_mut::<POINT>();
            for h in 0..const { LANES / S::F64_LANES } {
                let coarse = get(simd, &coarse, h);
                let near = mul(simd, get(simd, &start, h), coarse);
                let far = mul_conjugate(simd, get(simd, &end, h), coarse);
                for l in 0..LANES {
                    let fine = get(simd, &fine[l], h);
                    let [im, re] = get(simd, &points[first + l], h);
                    put(simd, &mut tile[l], h, mul_conjugate(simd, [re, im], mul(simd, near, fine)));
                    let [im, re] = get(simd, &points[grid.width - 1 - first - l], h);
                    put(simd, &mut tile[LANES + l], h, mul_conjugate(simd, [re, im], mul_conjugate(simd, far, fine)));
                }
            }
        }
    }
}
