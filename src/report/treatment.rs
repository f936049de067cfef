//! What was done to the samples themselves, as plain data.

use serde::Serialize;

/// Spikes of a channel that were replaced.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct DespikeReport {
    /// How many.
    pub count: usize,
    /// The first thousand of them, as sample indices of the record that was read.
    pub samples: Vec<usize>,
    /// Largest change of a sample, in the unit of the input.
    pub largest: Option<f64>,
    /// What replaced them.
    pub how: Option<String>,
}

/// The smoothing of a channel.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct SmoothReport {
    /// Strength, in steps^4.
    pub strength: f64,
    /// Where it came from.
    pub how: StrengthSource,
    /// Frequency of half gain, in Hz or 1/m; null where even the Nyquist frequency keeps more.
    pub cut_off: Option<f64>,
    /// One cycle of it, in samples.
    pub cut_off_samples: Option<f64>,
    /// Effective degrees of freedom of the smoothed record, of as many as it has samples.
    pub degrees_of_freedom: f64,
    /// Outliers lost their weight.
    pub robust: bool,
    /// Samples that had no weight in the end, those of the continuation included; null where all had.
    pub outliers: Option<usize>,
}

/// Where a strength came from.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Serialize)]
#[serde(rename_all = "snake_case")]
pub enum StrengthSource {
    /// The user.
    Given,
    /// Generalised cross-validation of the channel.
    CrossValidation,
}
