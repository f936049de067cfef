//! The memory that a run over a record will take, said beforehand.

use serde::Serialize;

/// Memory of a run, in bytes.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Serialize)]
pub struct Estimate {
    /// Three times the channel in work, 8 bytes a sample for every channel, and a constant.
    pub bytes: u64,
}

/// Code, tables, plans and buffers: a round figure above what an empty run takes.
const CONSTANT: u64 = 32 << 20;

impl Estimate {
    /// For `channels` channels of `samples` samples.
    pub fn of(channels: usize, samples: u64) -> Estimate {
        let row = samples.saturating_mul(8);
        let bytes = row.saturating_mul(3).saturating_add(row.saturating_mul(channels as u64)).saturating_add(CONSTANT);
        Estimate { bytes }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_million_samples_of_three_channels() {
        assert_eq!(Estimate::of(3, 1_000_000).bytes, 24_000_000 + 24_000_000 + 33_554_432);
        assert_eq!(Estimate::of(usize::MAX, u64::MAX).bytes, u64::MAX);
    }
}
