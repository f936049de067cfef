//! The memory and the time that a run over a record will take, said beforehand.

use serde::Serialize;

/// Memory and time of a run that judges its extensions.
#[derive(Debug, Clone, Copy, PartialEq, Serialize)]
pub struct Estimate {
    /// Three times the channel in work, 8 bytes a sample for every channel, and a constant.
    pub bytes: u64,
    /// Seconds on one core of an everyday machine, to a factor of about three.
    pub seconds: f64,
}

/// Code, tables, plans and buffers: a round figure above what an empty run takes.
const CONSTANT: u64 = 32 << 20;

/// Seconds of the transforms for each sample and doubling of the length, of reading and writing for each sample, and of the
/// verdict for each channel: measured once, rounded up.
const TRANSFORM_S: f64 = 2e-8;
const COPY_S: f64 = 4e-7;
const JUDGE_S: f64 = 0.05;

impl Estimate {
    /// For `channels` channels of `samples` samples.
    pub fn of(channels: usize, samples: u64) -> Estimate {
        let row = samples.saturating_mul(8);
        let bytes = row.saturating_mul(3).saturating_add(row.saturating_mul(channels as u64)).saturating_add(CONSTANT);
        let each = samples as f64;
        let work = each * each.max(2.0).log2() * TRANSFORM_S + each * COPY_S + JUDGE_S;
        Estimate { bytes, seconds: channels as f64 * work }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_million_samples_of_three_channels() {
        assert!((1.0..10.0).contains(&Estimate::of(3, 1_000_000).seconds));
        assert_eq!(Estimate::of(3, 1_000_000).bytes, 24_000_000 + 24_000_000 + 33_554_432);
        assert_eq!(Estimate::of(usize::MAX, u64::MAX).bytes, u64::MAX);
    }
}
