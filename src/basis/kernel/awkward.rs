//! DCT-II, DCT-III and their sine counterparts of long records whose length has a large prime factor.
//!
//! N = P x width with the prime P: the reordered samples (see the module of the smooth lengths) are laid out as a grid whose
//! columns hold P points each. The columns go one after the other through the real transform of a prime length, their
//! half spectra lie side by side in scratch, and the rows between them, eight at a time, are the rest of the work.

use super::cosine::{flat, sign};
use super::grid::Grid;
use super::lanes::{LANES, LaneTransform, POINT};
use super::prime::PrimeTransform;
use super::roots::{Roots, product};
use super::rows::Rows;
use super::tiles::Task;
use crate::ends::Parity;
use pulp::Arch;
use std::f64::consts::{FRAC_1_SQRT_2, SQRT_2};
use std::fmt;

/// Orthonormal transforms of N = prime x width points.
pub struct AwkwardCosine {
    grid: Grid,
    column: PrimeTransform,
    row: LaneTransform,
    rows: Rows,
    /// Powers of exp(-2 pi i / 4N).
    roots: Roots,
    scale: f64,
}

impl AwkwardCosine {
    /// A plan for columns of `prime` points and rows of `width` points, or none where the prime has none.
    pub fn new(prime: usize, width: usize) -> Option<Self> {
        let grid = Grid::half(prime, width);
        Some(Self {
            grid,
            column: PrimeTransform::new(prime)?,
            row: LaneTransform::new(width),
            rows: Rows::new(grid),
            roots: Roots::new(4 * (prime * width) as u64),
            scale: (2.0 / (prime * width) as f64).sqrt(),
        })
    }

    /// Numbers of scratch that a transform needs.
    pub fn scratch_len(&self) -> usize {
        self.spectra_len() + self.column.scratch_len().max(2 * self.row.space())
    }

    fn spectra_len(&self) -> usize {
        2 * self.column.spectrum_len() * self.grid.width
    }

    /// c_k = A_k sum_n x_n cos(pi k (n + 1/2)/N), or with odd mirrors A_k sum_n x_n sin(pi (k + 1)(n + 1/2)/N).
    pub fn forward(&self, x: &mut [f64], scratch: &mut [f64], mirrors: Parity) {
        let arch = Arch::new();
        let Grid { width, .. } = self.grid;
        let len = x.len();
        let (spectra, work) = scratch.split_at_mut(self.spectra_len());
        let half = self.column.spectrum_len();
        for (j2, spectrum) in spectra.chunks_exact_mut(2 * half).enumerate() {
            let (re, im) = spectrum.split_at_mut(half);
            let value = |j1: usize| match place(width * j1 + j2, len) {
                (at, Parity::Even) => x[at],
                (at, Parity::Odd) => sign(mirrors) * x[at],
            };
            self.column.forward(value, re, im, work);
        }
        let (one, two) = work.split_at_mut(self.row.space());
        for block in 0..self.grid.row_blocks() {
            arch.dispatch(Task(
                #[inline(always)]
                || self.turn(spectra, one, block),
            ));
            let (done, _) = self.row.run(arch, one, two);
            arch.dispatch(Task(
                #[inline(always)]
                || self.rows.store(done, x, block, mirrors),
            ));
        }
        x[flat(len, mirrors)] *= FRAC_1_SQRT_2;
    }

    /// The inverse of [`AwkwardCosine::forward`].
    pub fn inverse(&self, c: &mut [f64], scratch: &mut [f64], mirrors: Parity) {
        let arch = Arch::new();
        let Grid { width, .. } = self.grid;
        let len = c.len();
        let (spectra, work) = scratch.split_at_mut(self.spectra_len());
        let half = self.column.spectrum_len();
        c[flat(len, mirrors)] *= SQRT_2;
        let (one, two) = work.split_at_mut(self.row.space());
        for block in 0..self.grid.row_blocks() {
            arch.dispatch(Task(
                #[inline(always)]
                || self.rows.load(c, one, block, mirrors),
            ));
            let (done, _) = self.row.run(arch, one, two);
            arch.dispatch(Task(
                #[inline(always)]
                || self.turn_back(done, spectra, block),
            ));
        }
        for (j2, spectrum) in spectra.chunks_exact(2 * half).enumerate() {
            let (re, im) = spectrum.split_at(half);
            let put = |j1: usize, value: f64| match place(width * j1 + j2, len) {
                (at, Parity::Even) => c[at] = value,
                (at, Parity::Odd) => c[at] = sign(mirrors) * value,
            };
            self.column.inverse(re, im, put, work);
        }
    }

    /// Reads a block of rows from the spectra of all columns and multiplies by the twiddles.
    #[inline(always)]
    fn turn(&self, spectra: &[f64], points: &mut [f64], block: usize) {
        let half = self.column.spectrum_len();
        let (points, _) = points.as_chunks_mut::<POINT>();
        for (j2, (point, spectrum)) in points.iter_mut().zip(spectra.chunks_exact(2 * half)).enumerate() {
            for l in 0..LANES {
                let k = (block * LANES + l).min(half - 1);
                let value = product([spectrum[k], spectrum[half + k]], self.twiddle(k, j2));
                (point[l], point[LANES + l]) = (value[0], value[1]);
            }
        }
    }

    /// Inverse of [`AwkwardCosine::turn`]; the points come with real and imaginary parts exchanged.
    #[inline(always)]
    fn turn_back(&self, points: &[f64], spectra: &mut [f64], block: usize) {
        let half = self.column.spectrum_len();
        let (points, _) = points.as_chunks::<POINT>();
        for (j2, (point, spectrum)) in points.iter().zip(spectra.chunks_exact_mut(2 * half)).enumerate() {
            for l in 0..LANES.min(half - block * LANES) {
                let k = block * LANES + l;
                let [c, s] = self.twiddle(k, j2);
                let value = product([0.5 * point[LANES + l], 0.5 * point[l]], [c, -s]);
                (spectrum[k], spectrum[half + k]) = (value[0], value[1]);
            }
        }
    }

    /// exp(-2 pi i (k1 j2 + k1/4) / N) with the scale of the forward transform.
    #[inline(always)]
    fn twiddle(&self, k1: usize, j2: usize) -> [f64; 2] {
        let [c, s] = self.roots.at((4 * j2 as u64 + 1) * k1 as u64);
        [self.scale * c, self.scale * s]
    }
}

/// Where point n of the reordered samples stands, and on an even or an odd place.
#[inline(always)]
fn place(n: usize, len: usize) -> (usize, Parity) {
    if 2 * n < len { (2 * n, Parity::Even) } else { (2 * (len - n) - 1, Parity::Odd) }
}

impl fmt::Debug for AwkwardCosine {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        write!(f, "AwkwardCosine({} x {})", self.grid.height, self.grid.width)
    }
}
