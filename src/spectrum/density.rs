//! A power spectral density: values at evenly spaced frequencies, each with its degrees of freedom and its bandwidth.

use crate::numeric::sum;

/// A one-sided density; normalisation as in [`crate::spectrum`].
#[derive(Debug, Clone)]
pub struct Density {
    /// Distance of two lines, in Hz or 1/m. Line k stands at k times that.
    pub spacing: f64,
    /// Samples per second or metre.
    pub rate: f64,
    /// The density at every line, in unit^2 per Hz or 1/m.
    pub values: Vec<f64>,
    /// Degrees of freedom of every line.
    pub freedom: Vec<f64>,
    /// Effective noise bandwidth at every line, in Hz or 1/m: the power of a tone on the line over the density it shows.
    pub bandwidth: Vec<f64>,
    /// How lines hang together.
    pub correlation: Correlation,
    /// Mean square of the samples as the estimate weights them: the sum over the lines equals it but for rounding. `None`
    /// for an estimate without such an identity.
    pub weighted_mean_square: Option<f64>,
    /// Mean square of the samples, all alike.
    pub mean_square: f64,
}

/// Correlation of the estimates at two lines of a flat density.
#[derive(Debug, Clone)]
pub enum Correlation {
    /// By the distance of the lines, in lines; 0 beyond.
    ByDistance(Vec<f64>),
    /// Of so many sine tapers at every line: 1 - distance/K, which sums to K over all distances.
    Tapers(Vec<u32>),
}

impl Density {
    /// The frequency of a line, in Hz or 1/m.
    pub fn frequency(&self, line: usize) -> f64 {
        line as f64 * self.spacing
    }

    /// Number of lines.
    #[expect(clippy::len_without_is_empty, reason = "a density has the line at zero at least")]
    pub fn len(&self) -> usize {
        self.values.len()
    }

    /// Sum over the lines times their spacing: the mean square that the density holds.
    pub fn sum(&self) -> f64 {
        sum::sum(&self.values) * self.spacing
    }

    /// Correlation of two lines `distance` apart, about `line`.
    pub fn correlation(&self, line: usize, distance: usize) -> f64 {
        match &self.correlation {
            Correlation::ByDistance(values) => values.get(distance).copied().unwrap_or(0.0),
            Correlation::Tapers(counts) => {
                let count = f64::from(counts.get(line).copied().unwrap_or(1).max(1));
                (1.0 - distance as f64 / count).max(0.0)
            }
        }
    }

    /// The part of a line's spacing inside `low..high`, by which it counts; both in Hz or 1/m.
    pub fn share(&self, line: usize, low: f64, high: f64) -> f64 {
        let nyquist = self.rate / 2.0;
        let centre = self.frequency(line);
        let at_end = line == 0 || centre >= nyquist * (1.0 - 1e-12);
        let from = (centre - self.spacing / 2.0).max(0.0);
        let to = (centre + self.spacing / 2.0).min(nyquist);
        let inside = (high.min(to) - low.max(from)).max(0.0) / self.spacing;
        // The two outermost lines have half a spacing to themselves and hold their power on it.
        if at_end { 2.0 * inside } else { inside }
    }
}
