//! Evenly spread stretches of a long sequence, for statistics that need not see every sample.

use std::ops::Range;

/// Sequences up to this length are taken whole.
const WHOLE: usize = 1 << 16;
/// How many stretches stand for a longer one.
const COUNT: usize = 64;

/// Stretches of `len` samples that hold all of them, or about 65,000 of them spread evenly: the first stretch starts at
/// the start, the last one stops at the end.
pub fn evenly_spread(len: usize) -> Vec<Range<usize>> {
    if len <= WHOLE {
        return vec![0..len; 1];
    }
    let width = WHOLE / COUNT;
    (0..COUNT)
        .map(|k| (len - width) / (COUNT - 1) * k + ((len - width) % (COUNT - 1)) * k / (COUNT - 1))
        .map(|at| at..at + width)
        .collect()
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn stretches_run_from_end_to_end_without_overlap() {
        assert_eq!(evenly_spread(0), vec![0..0]);
        assert_eq!(evenly_spread(65_536), vec![0..65_536]);
        for len in [65_537, 100_000, 1_000_003] {
            let found = evenly_spread(len);
            assert_eq!((found[0].start, found[63].end, found.len()), (0, len, 64));
            assert!(found.windows(2).all(|w| w[0].end <= w[1].start && w[0].len() == 1024), "{len}");
        }
    }
}
