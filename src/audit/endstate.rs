//! Whether a record starts and ends at rest: what decides which end conditions an integration may assume.

use serde::Serialize;

use crate::numeric::sum::{mean, sum_of};

/// The ends of a channel compared with its whole.
#[derive(Debug, Clone, Copy, PartialEq, Serialize)]
pub struct EndState {
    /// RMS about the mean over the first max(16, 2 %) samples, over that of all samples.
    pub first_ratio: f64,
    /// The same over the last samples.
    pub last_ratio: f64,
    /// What the larger of the two says.
    pub motion: Motion,
}

/// What a channel does at its ends.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Serialize)]
#[serde(rename_all = "snake_case")]
pub enum Motion {
    /// Both ratios below 0.15: at-rest records measured 0.05 to 0.07.
    AtRest,
    /// In between: end conditions need an explicit choice.
    Between,
    /// Above 0.3: steady records measured 0.57 to 1.9.
    Moving,
}

impl EndState {
    /// Of finite samples; `None` for fewer than 32 of them or a constant channel.
    pub fn of(samples: &[f64]) -> Option<EndState> {
        let window = (samples.len() / 50).max(16);
        if samples.len() < 2 * window {
            return None;
        }
        let centre = mean(samples);
        let rms = |part: &[f64]| (sum_of(part, |v| (v - centre).powi(2)) / part.len() as f64).sqrt();
        let whole = rms(samples);
        let (first, last) = (rms(&samples[..window]) / whole, rms(&samples[samples.len() - window..]) / whole);
        if !(first.is_finite() && last.is_finite()) {
            return None;
        }
        let larger = first.max(last);
        let motion = match larger {
            r if r < 0.15 => Motion::AtRest,
            r if r > 0.3 => Motion::Moving,
            _ => Motion::Between,
        };
        Some(EndState { first_ratio: first, last_ratio: last, motion })
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_burst_rests_and_a_tone_moves() {
        let tone = |n: i32| (f64::from(n) * 0.3).sin();
        let burst = |n: i32| tone(n) * (-(f64::from(n - 1000) / 150.0).powi(2)).exp();
        let motion = |f: &dyn Fn(i32) -> f64| EndState::of(&(0..2000).map(f).collect::<Vec<_>>()).map(|e| e.motion);
        assert_eq!(motion(&burst), Some(Motion::AtRest));
        assert_eq!(motion(&tone), Some(Motion::Moving));
        assert_eq!(motion(&|n| burst(n) + 0.06 * tone(n)), Some(Motion::Between)); // 0.06 of 0.21: about 0.2
        assert_eq!(motion(&|_| 3.0), None);
    }
}
