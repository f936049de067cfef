//! What was done to single samples of a record before it became uniform and complete.

use serde::Serialize;

/// Consecutive samples of one channel that are not as they were read.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Serialize)]
pub struct Repair {
    /// First of them, from 0.
    pub first: usize,
    /// Last of them.
    pub last: usize,
    /// What they were made from.
    pub how: Mending,
}

/// How samples were made.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Serialize)]
#[serde(rename_all = "snake_case")]
pub enum Mending {
    /// The cubic spline through the samples on both sides.
    CubicSpline,
    /// The smoothest line that the noisy samples on both sides allow.
    Smoother,
    /// The autoregressive model of the channel.
    AutoregressiveModel,
    /// A spike, replaced by one of the above.
    Despiked,
}

impl Repair {
    /// Number of samples.
    pub fn count(&self) -> usize {
        self.last + 1 - self.first
    }

    /// The part of it that lies in `len` samples from sample `first` on, counted from there.
    pub fn cut(&self, first: usize, len: usize) -> Option<Repair> {
        let (from, last) = (self.first.max(first), self.last.min((first + len).checked_sub(1)?));
        (from <= last).then(|| Repair { first: from - first, last: last - first, how: self.how })
    }
}

impl Mending {
    /// In words.
    pub fn label(self) -> &'static str {
        match self {
            Mending::CubicSpline => "cubic spline",
            Mending::Smoother => "smoother",
            Mending::AutoregressiveModel => "autoregressive model",
            Mending::Despiked => "despiked",
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_cut_keeps_what_lies_in_it() {
        let repair = Repair { first: 10, last: 14, how: Mending::Smoother };
        assert_eq!(repair.count(), 5);
        assert_eq!(repair.cut(12, 2).map(|r| (r.first, r.last)), Some((0, 1)));
        assert_eq!(repair.cut(0, 11).map(|r| (r.first, r.last)), Some((10, 10)));
        assert_eq!((repair.cut(15, 9), repair.cut(0, 10), repair.cut(0, 0)), (None, None, None));
    }
}
