//! How a long transform is cut: N points as a grid of short columns and short rows, and where its tiles lie.

use super::lanes::{LANES, POINT};

/// Values in a tile: eight points of a row's first half and the eight opposite ones, for eight rows at once.
pub const TILE: usize = 2 * LANES * POINT;

/// N = height x width: number n = width j1 + j2 stands in column j2, and column j2 is taken together with its opposite
/// width - 1 - j2. Blocks of eight such pairs are cut into tiles of eight rows of the transformed grid.
#[derive(Debug, Clone, Copy)]
pub struct Grid {
    /// Points of a column.
    pub height: usize,
    /// Points of a row.
    pub width: usize,
    /// Rows that are transformed.
    pub rows: usize,
    pub order: Order,
}

/// Which rows share a block.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Order {
    /// Eight neighbours.
    Neighbours,
    /// Four neighbours and the four rows as far from the last row as these are from the first.
    Opposites,
}

impl Grid {
    /// The grid of real columns, where half the rows suffice.
    pub fn half(height: usize, width: usize) -> Self {
        Self { height, width, rows: height / 2 + 1, order: Order::Neighbours }
    }

    /// The grid of complex columns.
    pub fn full(height: usize, width: usize) -> Self {
        Self { height, width, rows: height, order: Order::Opposites }
    }

    /// Blocks of eight pairs of columns; the last one reaches back over its neighbour rather than past the middle.
    pub fn pair_blocks(&self) -> usize {
        self.width.div_ceil(2).div_ceil(LANES)
    }

    /// First column of a block of pairs.
    pub fn first_column(&self, block: usize) -> usize {
        (block * LANES).min(self.width.div_ceil(2).saturating_sub(LANES))
    }

    /// Blocks of eight rows; the last one may reach past the end or, in opposite order, past the middle.
    pub fn row_blocks(&self) -> usize {
        match self.order {
            Order::Neighbours => self.rows.div_ceil(LANES),
            Order::Opposites => self.rows.div_ceil(2).div_ceil(LANES / 2),
        }
    }

    /// The row in a lane of a block, the last row for a lane past the end.
    #[inline(always)]
    pub fn row(&self, block: usize, lane: usize) -> usize {
        match self.order {
            Order::Neighbours => (block * LANES + lane).min(self.height - 1),
            Order::Opposites if lane < LANES / 2 => block * (LANES / 2) + lane,
            Order::Opposites => self.height - 1 - (block * (LANES / 2) + lane - LANES / 2),
        }
    }

    /// Values of all tiles.
    pub fn space(&self) -> usize {
        self.pair_blocks() * self.row_blocks() * TILE
    }
}

/// The factor of `len` nearest to its root from below, if a grid of that height fills the lanes.
pub fn height(len: usize) -> Option<usize> {
    let height = (1..=len.isqrt()).rev().find(|d| len.is_multiple_of(*d))?;
    (height >= 2 * LANES).then_some(height)
}

/// The prime factors of `n` in ascending order, each once.
pub fn primes(mut n: usize) -> Vec<usize> {
    let mut found = Vec::new();
    let mut d = 2;
    while d * d <= n {
        if n.is_multiple_of(d) {
            found.push(d);
            while n.is_multiple_of(d) {
                n /= d;
            }
        }
        d += 1;
    }
    if n > 1 {
        found.push(n);
    }
    found
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn heights_divide_and_fill_the_lanes() {
        for (len, want) in [(65_536, Some(256)), (1_234_567, Some(127)), (1_000_003, None), (15 * 1009, None)] {
            assert_eq!(height(len), want, "{len}");
        }
    }

    #[test]
    fn factors_multiply_back() {
        assert_eq!(primes(2 * 2 * 3 * 380_623), [2, 3, 380_623]);
    }
}
