//! Which rows of the file the samples of a record came from, so that a writer can copy the columns it does not change.

/// The source row of every sample.
#[derive(Debug, Clone, PartialEq, Eq)]
pub enum RowMap {
    /// Sample n came from row `first + n * every`.
    Even {
        /// Row of sample 0, from 0.
        first: usize,
        /// Rows from one sample to the next.
        every: usize,
        /// Number of samples.
        count: usize,
    },
    /// The row of each sample; `None` where it was filled in.
    Listed(Vec<Option<usize>>),
    /// No sample stands on a row of the file: all were interpolated onto another grid.
    Regridded {
        /// Number of samples.
        count: usize,
    },
}

impl RowMap {
    /// Number of samples.
    pub fn len(&self) -> usize {
        match self {
            RowMap::Even { count, .. } | RowMap::Regridded { count } => *count,
            RowMap::Listed(rows) => rows.len(),
        }
    }

    /// True without samples.
    pub fn is_empty(&self) -> bool {
        self.len() == 0
    }

    /// The row that sample `n` came from, from 0; `None` where it came from none or there is no such sample.
    pub fn row(&self, n: usize) -> Option<usize> {
        match self {
            RowMap::Even { first, every, count } => (n < *count).then(|| first + n * every),
            RowMap::Listed(rows) => rows.get(n).copied().flatten(),
            RowMap::Regridded { .. } => None,
        }
    }

    /// The rows of `count` samples from sample `first` on.
    #[must_use]
    pub fn cut(&self, first: usize, count: usize) -> RowMap {
        let count = count.min(self.len().saturating_sub(first));
        match self {
            RowMap::Even { first: row, every, .. } => RowMap::Even { first: row + first * every, every: *every, count },
            RowMap::Listed(rows) => RowMap::Listed(rows[first.min(rows.len())..].iter().take(count).copied().collect()),
            RowMap::Regridded { .. } => RowMap::Regridded { count },
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_cut_keeps_the_rows() {
        let even = RowMap::Even { first: 3, every: 10, count: 5 };
        assert_eq!(even.cut(2, 9), RowMap::Even { first: 23, every: 10, count: 3 });
        assert_eq!(even.cut(2, 9).row(1), Some(33));
        assert_eq!(even.row(5), None);
        let listed = RowMap::Listed(vec![Some(0), None, Some(1)]);
        assert_eq!(listed.cut(1, 2), RowMap::Listed(vec![None, Some(1)]));
        assert_eq!(listed.cut(7, 2).len(), 0);
    }
}
