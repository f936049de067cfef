//! What one channel must meet, and how long to look for the smallest way to meet it.

/// A request as one channel resolves it, in its unit.
#[derive(Debug, Clone, Copy, PartialEq)]
pub enum Limit {
    /// Largest error.
    Max(f64),
    /// Root mean squared error.
    Rms(f64),
    /// None.
    Lossless,
    /// Coefficients kept, of so many samples.
    Keep(u64),
}

/// How long to look for the smallest archive.
#[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord, Default)]
pub enum Effort {
    /// One mode.
    Quick,
    /// All modes, tried on stretches.
    #[default]
    Usual,
    /// All modes, tried in full, with free boundaries and more predictions.
    Long,
}
