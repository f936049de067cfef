//! Cyclic convolution of long real sequences with a fixed kernel, in three passes over memory.

use super::grid::{Grid, TILE};
use super::lanes::{LANES, LaneTransform, POINT};
use super::tiles::{Task, join, part, run};
use super::turn::Twiddles;
use pulp::Arch;

/// Convolutions of M = height x width points. Kernels are kept as spectra in the order of the tiles' rows.
pub struct Convolution {
    grid: Grid,
    column: LaneTransform,
    row: LaneTransform,
    twiddles: Twiddles,
    scale: f64,
}

impl Convolution {
    /// A plan for columns of `height` points and rows of `width` points, at least 16.
    pub fn new(height: usize, width: usize) -> Self {
        let grid = Grid::half(height, width);
        let len = height * width;
        // Twice in a convolution: 1/M, and 1/2 to undo the parting of the pairs.
        let scale = (0.5 / len as f64).sqrt();
        Self {
            grid,
            column: LaneTransform::new(height),
            row: LaneTransform::new(width),
            twiddles: Twiddles::new(grid, len as u64, scale, (0, 0), (1, 0)),
            scale,
        }
    }

    /// Points of a sequence.
    pub fn len(&self) -> usize {
        self.grid.height * self.grid.width
    }

    /// Numbers of scratch that a convolution needs.
    pub fn scratch_len(&self) -> usize {
        self.grid.space() + 2 * self.column.space().max(self.row.space())
    }

    /// The spectrum of a kernel.
    pub fn kernel(&self, values: &[f64]) -> Vec<f64> {
        let arch = Arch::new();
        let mut scratch = vec![0.0; self.scratch_len()];
        let (tiles, one, two) = self.lend(&mut scratch);
        self.columns(arch, values, tiles, one, two);
        let mut spectrum = Vec::with_capacity(self.grid.row_blocks() * self.row.space());
        let scale = 0.5 / self.scale;
        for block in 0..self.grid.row_blocks() {
            self.twiddles.turn(arch, block, tiles, one);
            let (done, _) = self.row.run(arch, one, two);
            spectrum.extend(done.iter().map(|v| scale * v));
        }
        spectrum
    }

    /// Replaces x by its cyclic convolution with the kernel of that spectrum.
    pub fn apply(&self, x: &mut [f64], spectrum: &[f64], scratch: &mut [f64]) {
        let arch = Arch::new();
        let grid = &self.grid;
        let (tiles, one, two) = self.lend(scratch);
        self.columns(arch, x, tiles, one, two);
        for (block, kernel) in spectrum.chunks_exact(self.row.space()).enumerate() {
            self.twiddles.turn(arch, block, tiles, one);
            let (done, free) = self.row.run(arch, one, two);
            arch.dispatch(Task(
                #[inline(always)]
                || multiply(done, kernel),
            ));
            let (done, _) = self.row.run(arch, done, free);
            self.twiddles.turn_back(arch, block, done, tiles, (block, grid.row_blocks()));
        }
        for block in 0..grid.pair_blocks() {
            let tiles = &tiles[block * grid.row_blocks() * TILE..][..grid.row_blocks() * TILE];
            arch.dispatch(Task(
                #[inline(always)]
                || join(grid, tiles, one, (0, 1)),
            ));
            let (done, _) = self.column.run(arch, one, two);
            arch.dispatch(Task(
                #[inline(always)]
                || self.scatter(done, x, block),
            ));
        }
    }

    fn lend<'a>(&self, scratch: &'a mut [f64]) -> (&'a mut [f64], &'a mut [f64], &'a mut [f64]) {
        let (tiles, work) = scratch.split_at_mut(self.grid.space());
        let space = self.column.space().max(self.row.space());
        let (one, rest) = work.split_at_mut(space);
        (tiles, one, &mut rest[..space])
    }

    fn columns(&self, arch: Arch, x: &[f64], tiles: &mut [f64], one: &mut [f64], two: &mut [f64]) {
        for (block, tiles) in tiles.chunks_exact_mut(self.grid.row_blocks() * TILE).enumerate() {
            arch.dispatch(Task(
                #[inline(always)]
                || self.gather(x, one, block),
            ));
            let (done, _) = self.column.run(arch, one, two);
            arch.dispatch(Task(
                #[inline(always)]
                || part(&self.grid, done, tiles),
            ));
        }
    }

    #[inline(always)]
    fn gather(&self, x: &[f64], points: &mut [f64], block: usize) {
        let width = self.grid.width;
        let first = self.grid.first_column(block);
        let (points, _) = points.as_chunks_mut::<POINT>();
        for (point, line) in points.iter_mut().zip(x.chunks_exact(width)) {
            let near: &[f64; LANES] = run(line, first);
            let far: &[f64; LANES] = run(line, width - LANES - first);
            for l in 0..LANES {
                point[l] = near[l];
                point[LANES + l] = far[LANES - 1 - l];
            }
        }
    }

    /// The points come with real and imaginary parts exchanged.
    #[inline(always)]
    fn scatter(&self, points: &[f64], x: &mut [f64], block: usize) {
        let width = self.grid.width;
        let first = self.grid.first_column(block);
        let (points, _) = points.as_chunks::<POINT>();
        for (point, line) in points.iter().zip(x.chunks_exact_mut(width)) {
            line[first..][..LANES].copy_from_slice(&point[LANES..]);
            for l in 0..LANES {
                line[width - 1 - first - l] = point[l];
            }
        }
    }
}

/// Multiplies points by a kernel and exchanges real and imaginary parts, which makes the next transform an inverse one.
#[inline(always)]
fn multiply(points: &mut [f64], kernel: &[f64]) {
    let (points, _) = points.as_chunks_mut::<POINT>();
    let (kernel, _) = kernel.as_chunks::<POINT>();
    for (point, kernel) in points.iter_mut().zip(kernel) {
        for l in 0..LANES {
            let (re, im) = (point[l], point[LANES + l]);
            point[l] = re * kernel[LANES + l] + im * kernel[l];
            point[LANES + l] = re * kernel[l] - im * kernel[LANES + l];
        }
    }
}
