//! End values, slopes and levels of a record, at the mirrors, with their standard errors.

use serde::Serialize;

use crate::baseline::Side;
use crate::ends::Ends;
use crate::numeric::{noise, sum};

/// How wide fits at an end may be.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Scale {
    /// The shortest corner wavelength of the chain in samples: features shorter than this do not reach the output.
    pub shortest_wavelength: f64,
    /// The edge zone in samples, the widest stretch a slope is fitted to.
    pub zone: usize,
}

impl Scale {
    /// Without a corner an eighth of the record is assumed; reports say so.
    pub fn assumed(len: usize) -> Scale {
        Scale { shortest_wavelength: len as f64 / 8.0, zone: (len / 4).max(4) }
    }
}

/// What the record does at one mirror. Slopes are per step, positive towards increasing x at both ends.
#[derive(Debug, Clone, Copy, PartialEq, Serialize)]
pub struct EndEstimate {
    /// Value at the mirror: the widest line fit that still agrees with all narrower ones within two standard errors.
    pub value: f64,
    /// Standard error of the value.
    pub value_error: f64,
    /// Slope of a line fit over half a shortest wavelength.
    pub slope: f64,
    /// Standard error of the slope.
    pub slope_error: f64,
    /// Mean over an eighth of a shortest wavelength.
    pub level: f64,
}

/// Both ends, and the noise that the standard errors rest on.
#[derive(Debug, Clone, Copy, PartialEq, Serialize)]
pub struct EndEstimates {
    /// At x = 0.
    pub left: EndEstimate,
    /// At x = L.
    pub right: EndEstimate,
    /// White noise sigma from third differences.
    pub noise: f64,
}

impl EndEstimates {
    /// Estimates for a record of at least one sample.
    pub fn of(samples: &[f64], ends: Ends, scale: Scale) -> EndEstimates {
        Self::with_noise(samples, ends, scale, noise::sigma(samples))
    }

    /// The same with a noise sigma that is already known.
    pub fn with_noise(samples: &[f64], ends: Ends, scale: Scale, noise: f64) -> EndEstimates {
        let first = ends.first_position();
        let last_to_mirror = ends.length(samples.len()) - (first + samples.len() as f64 - 1.0);
        let left = one_end(|n| samples[n], samples.len(), first, scale, noise);
        let mut right = one_end(|n| samples[samples.len() - 1 - n], samples.len(), last_to_mirror, scale, noise);
        right.slope = -right.slope; // measured inwards, reported towards increasing x
        EndEstimates { left, right, noise }
    }

    /// The estimate of one side.
    pub fn at(&self, side: Side) -> EndEstimate {
        match side {
            Side::Left => self.left,
            Side::Right => self.right,
        }
    }
}

/// `at(n)` is the n-th sample from the end, whose position is `first + n` steps inside the mirror.
fn one_end(at: impl Fn(usize) -> f64, len: usize, first: f64, scale: Scale, noise: f64) -> EndEstimate {
    let half_wave = scale.shortest_wavelength / 2.0;
    let slope_width = (half_wave.round() as usize).min(scale.zone).clamp(2, len.max(2));
    let level_width = ((scale.shortest_wavelength / 8.0).round() as usize).clamp(1, len);
    let level = sum::mean(&(0..level_width).map(&at).collect::<Vec<_>>());
    if len < 2 {
        return EndEstimate { value: at(0), value_error: noise, slope: 0.0, slope_error: noise, level };
    }
    let slope_fit = Fit::line(&at, slope_width.min(len), first);
    let (value, value_error) = widest_agreeing_value(&at, len, first, half_wave, noise);
    EndEstimate { value, value_error, slope: slope_fit.slope, slope_error: noise * slope_fit.slope_gain, level }
}

/// Line fits over w = 2, 4, 8 ... samples, taken to the mirror: w grows while all intervals value +- 2 s.e. still share
/// a point, so that noise is averaged as far as the record is straight there.
fn widest_agreeing_value(at: &impl Fn(usize) -> f64, len: usize, first: f64, widest: f64, noise: f64) -> (f64, f64) {
    let (mut low, mut high) = (f64::NEG_INFINITY, f64::INFINITY);
    let mut best = (0.0, 0.0);
    let mut width = 2;
    loop {
        let fit = Fit::line(at, width, first);
        let error = noise * fit.value_gain;
        low = low.max(fit.value - 2.0 * error);
        high = high.min(fit.value + 2.0 * error);
        if low > high && width > 2 {
            break;
        }
        best = (fit.value, error);
        width *= 2;
        if width > len || width as f64 > widest {
            break;
        }
    }
    best
}

/// A straight line through `width` samples, evaluated at the mirror (x = 0 of this end).
struct Fit {
    value: f64,
    slope: f64,
    /// Standard error of the value for noise 1.
    value_gain: f64,
    /// Standard error of the slope for noise 1.
    slope_gain: f64,
}

impl Fit {
    fn line(at: &impl Fn(usize) -> f64, width: usize, first: f64) -> Fit {
        let w = width as f64;
        let middle = (w - 1.0) / 2.0;
        let base = at(0);
        // Differences from the first sample keep a large offset out of the products.
        let (mut total, mut moment) = (0.0, 0.0);
        for n in 0..width {
            let value = at(n) - base;
            total += value;
            moment += (n as f64 - middle) * value;
        }
        let spread = w * (w * w - 1.0) / 12.0;
        let slope = moment / spread;
        let reach = first + middle; // from the mirror to the middle of the fit
        Fit {
            value: base + (total / w - slope * reach),
            slope,
            value_gain: (1.0 / w + reach * reach / spread).sqrt(),
            slope_gain: 1.0 / spread.sqrt(),
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::ends::Seat;

    #[test]
    fn a_line_gives_its_values_at_the_mirrors() {
        let samples: Vec<f64> = (0..100).map(|n| 2.0 + 0.5 * (n as f64 + 0.5)).collect();
        let scale = Scale { shortest_wavelength: 16.0, zone: 16 };
        let found = EndEstimates::of(&samples, Ends::EVEN, scale);
        assert!((found.left.value - 2.0).abs() < 1e-12 && (found.right.value - 52.0).abs() < 1e-12);
        assert!((found.left.slope - 0.5).abs() < 1e-12 && (found.right.slope - 0.5).abs() < 1e-12);
        // On the whole-sample seat the even mirrors are the end samples themselves.
        let whole = EndEstimates::of(&samples, Ends::EVEN.seated(Seat::Whole), scale);
        assert!((whole.left.value - 2.25).abs() < 1e-12 && (whole.right.value - 51.75).abs() < 1e-12);
    }

    #[test]
    fn standard_errors_are_those_of_a_straight_line_fit() {
        // For p = 1 and many samples: value 2 sigma/sqrt(m), slope sqrt(12) sigma/m^1.5 (textbook regression).
        let fit = Fit::line(&|_| 0.0, 1000, 0.5);
        assert!((fit.value_gain * 1000f64.sqrt() - 2.0).abs() < 2e-3);
        assert!((fit.slope_gain * 1000f64.powf(1.5) - 12f64.sqrt()).abs() < 1e-5);
    }

    #[test]
    fn noise_widens_the_fit_and_a_bend_stops_it() {
        // A step after 8 samples: wider fits disagree at once when there is no noise.
        let samples: Vec<f64> = (0..64).map(|n| if n < 8 { 1.0 } else { 9.0 }).collect();
        let scale = Scale { shortest_wavelength: 64.0, zone: 16 };
        assert_eq!(EndEstimates::with_noise(&samples, Ends::EVEN, scale, 1e-6).left.value, 1.0);
    }
}
