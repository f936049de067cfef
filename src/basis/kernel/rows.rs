//! Rows of the spectrum of the reordered samples as cosine or sine sums, and back.

use super::grid::Grid;
use super::lanes::{LANES, POINT};
use super::roots::root;
use super::tiles::{reversed, run};
use crate::ends::Parity;

/// Where the cosine sums of a grid's rows stand: row k1 holds k = k1 + height k2, and N - k in its imaginary part.
#[derive(Debug)]
pub struct Rows {
    grid: Grid,
    /// exp(-i pi k2 / (2 width)), the part of the cosine twiddle that belongs to k2.
    twiddles: Vec<[f64; 2]>,
}

impl Rows {
    pub fn new(grid: Grid) -> Self {
        Self { grid, twiddles: (0..grid.width as u64).map(|k| root(k, 4 * grid.width as u64)).collect() }
    }

    /// Whether eight direct and eight opposite sums of a block stand in one run each.
    fn whole(&self, block: usize) -> bool {
        block > 0 && (block + 1) * LANES <= self.grid.height.div_ceil(2)
    }

    /// Writes a block of rows as cosine sums: real parts at k, imaginary parts, negated, at N - k.
    #[inline(always)]
    pub fn store(&self, points: &[f64], x: &mut [f64], block: usize, mirrors: Parity) {
        let Grid { height, rows, .. } = self.grid;
        let len = height * self.grid.width;
        let first = block * LANES;
        let whole = self.whole(block);
        let (points, _) = points.as_chunks::<POINT>();
        for (k2, (point, w)) in points.iter().zip(&self.twiddles).enumerate() {
            let k = first + height * k2;
            let mut cosines = [0.0; LANES];
            let mut opposite = [0.0; LANES];
            for l in 0..LANES {
                cosines[l] = point[l] * w[0] - point[LANES + l] * w[1];
                opposite[LANES - 1 - l] = -(point[l] * w[1] + point[LANES + l] * w[0]);
            }
            if whole {
                match mirrors {
                    Parity::Even => {
                        x[k..][..LANES].copy_from_slice(&cosines);
                        x[len + 1 - k - LANES..][..LANES].copy_from_slice(&opposite);
                    }
                    Parity::Odd => {
                        x[len - k - LANES..][..LANES].copy_from_slice(&reversed(&cosines));
                        x[k - 1..][..LANES].copy_from_slice(&reversed(&opposite));
                    }
                }
                continue;
            }
            let place = |k: usize| match mirrors {
                Parity::Even => k,
                Parity::Odd => len - 1 - k,
            };
            for l in 0..LANES.min(rows - first) {
                x[place(k + l)] = cosines[l];
                // Rows 0 and height/2 hold their opposites themselves.
                if first + l > 0 && 2 * (first + l) < height {
                    x[place(len - k - l)] = opposite[LANES - 1 - l];
                }
            }
        }
    }

    /// Inverse of [`Rows::store`], with real and imaginary parts exchanged.
    #[inline(always)]
    pub fn load(&self, c: &[f64], points: &mut [f64], block: usize, mirrors: Parity) {
        let Grid { height, .. } = self.grid;
        let len = height * self.grid.width;
        let first = block * LANES;
        let whole = self.whole(block);
        let (points, _) = points.as_chunks_mut::<POINT>();
        for (k2, (point, w)) in points.iter_mut().zip(&self.twiddles).enumerate() {
            let k = first + height * k2;
            let mut cosines = [0.0; LANES];
            let mut opposite = [0.0; LANES];
            if whole {
                match mirrors {
                    Parity::Even => {
                        cosines.copy_from_slice(&c[k..][..LANES]);
                        opposite.copy_from_slice(&c[len + 1 - k - LANES..][..LANES]);
                    }
                    Parity::Odd => {
                        cosines = reversed(run(c, len - k - LANES));
                        opposite = reversed(run(c, k - 1));
                    }
                }
            } else {
                let value = |k: usize| match mirrors {
                    _ if k >= len => 0.0,
                    Parity::Even => c[k],
                    Parity::Odd => c[len - 1 - k],
                };
                for l in 0..LANES {
                    cosines[l] = value(k + l);
                    opposite[LANES - 1 - l] = value(len.saturating_sub(k + l));
                }
            }
            for l in 0..LANES {
                let (re, im) = (cosines[l], -opposite[LANES - 1 - l]);
                point[LANES + l] = re * w[0] + im * w[1];
                point[l] = im * w[0] - re * w[1];
            }
        }
    }
}
