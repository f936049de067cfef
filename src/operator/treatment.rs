//! What a run does to the samples themselves, before and after the passes: spikes out, smoothing, another rate.

use crate::error::{Error, Result};

use super::corner::figure;
use super::resampling::Resampling;
use super::weighting::Weighting;

/// The treatments of a run, one of each kind at most.
#[derive(Debug, Clone, Copy, Default, PartialEq)]
pub struct Treatments {
    /// Spikes are found and replaced first.
    pub despike: bool,
    /// The frequency weighting, whose exposure figures are reported.
    pub weighting: Option<&'static Weighting>,
    /// Penalised smoothing after the filters.
    pub smoothing: Option<Smoothing>,
    /// Another sampling rate, last.
    pub resampling: Option<Resampling>,
}

/// Penalised smoothing (Garcia 2010): the least sum of squared residuals plus the strength times that of the second
/// (for a derivative third) differences.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Smoothing {
    /// How strongly.
    pub strength: Strength,
    /// Outliers lose their weight (bisquare).
    pub robust: bool,
    /// Order of the differences that are penalised: 2, and 3 where a derivative is formed.
    pub order: i32,
}

/// The strength of smoothing.
#[derive(Debug, Clone, Copy, PartialEq)]
pub enum Strength {
    /// By generalised cross-validation, channel by channel.
    Auto,
    /// In steps^(2 order).
    Given(f64),
}

impl std::fmt::Display for Smoothing {
    /// `auto`, `100`, `auto, robust`.
    fn fmt(&self, f: &mut std::fmt::Formatter<'_>) -> std::fmt::Result {
        match self.strength {
            Strength::Auto => f.write_str("auto")?,
            Strength::Given(strength) => f.write_str(&figure(strength))?,
        }
        if self.robust { f.write_str(", robust") } else { Ok(()) }
    }
}

impl Treatments {
    /// Both together.
    ///
    /// # Errors
    /// `Usage` for two of one kind.
    pub(super) fn joined(self, other: Treatments) -> Result<Treatments> {
        let twice = |option: &str| Error::usage(format!("{option} is given more than once")).remedy("give it once");
        if self.weighting.is_some() && other.weighting.is_some() {
            return Err(twice("--weighting"));
        }
        if self.smoothing.is_some() && other.smoothing.is_some() {
            return Err(twice("--smooth"));
        }
        if self.resampling.is_some() && other.resampling.is_some() {
            return Err(twice("--resample or --decimate").remedy("give one of them once"));
        }
        Ok(Treatments {
            despike: self.despike || other.despike,
            weighting: self.weighting.or(other.weighting),
            smoothing: self.smoothing.or(other.smoothing),
            resampling: self.resampling.or(other.resampling),
        })
    }
}
