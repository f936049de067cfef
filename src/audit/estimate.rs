//! The memory and the time that a run over a record will take, said beforehand.

use serde::Serialize;

use crate::numeric::smooth::is_smooth;

/// What a run takes.
#[derive(Debug, Clone, Copy, PartialEq, Serialize)]
pub struct Estimate {
    /// Memory in bytes for operators whose response dies away within half the record: they are worked on in blocks.
    pub bytes: u64,
    /// Time in seconds for these: a figure to plan with, within a factor of three on a server of today.
    pub seconds: f64,
    /// Memory in bytes for all other operators, which need the transform of the whole length.
    pub whole_bytes: u64,
    /// Time in seconds for these.
    pub whole_seconds: f64,
}

/// How a channel is transformed.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Way {
    /// In blocks, or whole at a length of small prime factors.
    Easy,
    /// Whole, at a length with a prime factor above 13.
    Awkward,
}

/// Code, tables, plans and buffers: a round figure above what an empty run takes.
const CONSTANT: u64 = 32 << 20;
/// The channel in work, its output, and room for either to be copied, in channels.
const EASY_CHANNELS: u64 = 3;
/// The spectra of a long convolution stand beside the channel.
const AWKWARD_CHANNELS: u64 = 12;
/// Starting and finishing, in seconds.
const START: f64 = 0.01;
/// Nanoseconds a byte of the file: reading, fingerprints, writing.
const FILE_NS: f64 = 8.0;
/// Nanoseconds a sample: judging and transforming there and back.
const EASY_NS: f64 = 40.0;
const AWKWARD_NS: f64 = 250.0;

impl Estimate {
    /// For `channels` channels of `samples` samples from a file of `file_bytes`.
    pub fn of(channels: usize, samples: u64, file_bytes: u64) -> Estimate {
        let smooth = usize::try_from(samples).is_ok_and(is_smooth);
        let whole = if smooth { Way::Easy } else { Way::Awkward };
        let time = |nanoseconds: f64| {
            START + 1e-9 * (FILE_NS * file_bytes as f64 + nanoseconds * samples as f64 * channels as f64)
        };
        Estimate {
            bytes: memory(channels, samples, Way::Easy),
            seconds: time(EASY_NS),
            whole_bytes: memory(channels, samples, whole),
            whole_seconds: time(if whole == Way::Easy { EASY_NS } else { AWKWARD_NS }),
        }
    }

    /// As one line for people.
    pub fn sentence(&self) -> String {
        let (bytes, seconds) = (mebibytes(self.bytes), plain_time(self.seconds));
        let line = format!("a run will take about {bytes} and {seconds}");
        if self.whole_bytes == self.bytes {
            return line;
        }
        let (bytes, seconds) = (mebibytes(self.whole_bytes), plain_time(self.whole_seconds));
        format!("{line}; up to {bytes} and {seconds} where a response does not die away, such as an integral's")
    }
}

/// Memory in bytes that a run holds at most: every channel, and what the one in work needs beside it.
pub fn memory(channels: usize, samples: u64, way: Way) -> u64 {
    let beside = match way {
        Way::Easy => EASY_CHANNELS,
        Way::Awkward => AWKWARD_CHANNELS,
    };
    let row = samples.saturating_mul(8);
    row.saturating_mul(beside).saturating_add(row.saturating_mul(channels as u64)).saturating_add(CONSTANT)
}

/// A size for people.
pub fn mebibytes(bytes: u64) -> String {
    format!("{} MiB", bytes.div_ceil(1 << 20))
}

/// One digit is all that such a figure is worth.
fn plain_time(seconds: f64) -> String {
    match seconds {
        s if s < 1.0 => "less than a second".to_owned(),
        s if s < 10.0 => format!("{} s", s.ceil()),
        s if s < 600.0 => format!("{} s", (s / 10.0).ceil() * 10.0),
        s => format!("{} min", (s / 60.0).ceil()),
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_million_samples_of_three_channels() {
        let smooth = Estimate::of(3, 1_000_000, 40_000_000);
        assert_eq!((smooth.bytes, smooth.whole_bytes), (24_000_000 + 24_000_000 + 33_554_432, smooth.bytes));
        assert_eq!(smooth.sentence(), "a run will take about 78 MiB and less than a second");
        let prime = Estimate::of(3, 1_000_003, 40_000_000);
        assert_eq!(prime.whole_bytes, 15 * 8_000_024 + 33_554_432);
        let said = "78 MiB and less than a second; up to 147 MiB and 2 s where a response does not die away, such as an integral's";
        assert_eq!(prime.sentence(), format!("a run will take about {said}"));
        assert_eq!(Estimate::of(usize::MAX, u64::MAX, u64::MAX).bytes, u64::MAX);
    }
}
