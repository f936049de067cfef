//! The slope at each end of a record from cubic fits, as wide as the record's own bends allow.

use crate::ends::Ends;
use crate::numeric::least_squares;

/// The slope at a mirror, per step, positive towards increasing x at both ends.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Tangent {
    /// The slope.
    pub slope: f64,
    /// Its standard error from the noise.
    pub error: f64,
}

/// Samples of the narrowest fit: two more than a cubic passes through.
const NARROWEST: usize = 6;

/// Samples of the widest fit: it is exact enough by then, and long records stay quick.
const WIDEST: usize = 1 << 14;

impl Tangent {
    /// At the left and the right mirror of `ends`, for white noise `noise` a sample.
    ///
    /// Cubics through m = 6, 9, 13, ... samples: m grows, at most to half of the record, while all intervals slope +- 2
    /// standard errors share a point. For many samples the standard error of a cubic's end slope is sqrt(1200) noise/m^1.5.
    pub fn both(samples: &[f64], ends: Ends, noise: f64) -> [Tangent; 2] {
        let len = samples.len();
        let first = ends.first_position();
        let last_to_mirror = ends.length(len) - (first + len as f64 - 1.0);
        let left = one(|n| samples[n], len, first, noise);
        let right = one(|n| samples[len - 1 - n], len, last_to_mirror, noise);
        [left, Tangent { slope: -right.slope, ..right }]
    }
}

/// `at(n)` is the n-th sample from the end, which stands `first + n` steps inside the mirror.
fn one(at: impl Fn(usize) -> f64, len: usize, first: f64, noise: f64) -> Tangent {
    if len < 2 {
        return Tangent { slope: 0.0, error: noise };
    }
    let (mut low, mut high) = (f64::NEG_INFINITY, f64::INFINITY);
    let mut best = Tangent { slope: 0.0, error: noise };
    let mut width = NARROWEST.min(len);
    loop {
        // Differences from the first sample keep a large offset out of the products.
        let places = (0..width).map(|n| first + n as f64);
        let points = (0..width).map(|n| (first + n as f64, at(n) - at(0)));
        let (from, to) = (first - 0.5, first + width as f64 - 0.5);
        let slope = least_squares::polynomial(points, from, to, 3).derivative().at(0.0);
        let error = noise * least_squares::slope_gain(places, from, to, 3, 0.0);
        low = low.max(slope - 2.0 * error);
        high = high.min(slope + 2.0 * error);
        if low > high && width > NARROWEST {
            return best;
        }
        best = Tangent { slope, error };
        let wider = width + width / 2;
        if wider > (len / 2).min(WIDEST) {
            return best;
        }
        width = wider;
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_cubic_shows_its_slopes() {
        let value = |x: f64| 1e6 + 0.5 * x - 0.01 * x * x + 1e-4 * x * x * x;
        let slope = |x: f64| 0.5 - 0.02 * x + 3e-4 * x * x;
        let samples: Vec<f64> = (0..80).map(|n| value(f64::from(n) + 0.5)).collect();
        let [left, right] = Tangent::both(&samples, Ends::EVEN, 0.0);
        // Values near 1e6 carry 1e-10; a six-point cubic's slope at its end takes some ten of that.
        assert!((left.slope - slope(0.0)).abs() < 3e-9, "{}", left.slope);
        assert!((right.slope - slope(80.0)).abs() < 3e-9, "{}", right.slope);
    }

    #[test]
    fn the_error_is_that_of_a_cubic_fit_as_wide_as_it_agrees() {
        let flat = vec![0.0; 4000];
        let [left, _] = Tangent::both(&flat, Ends::EVEN, 1.0);
        // The widest of 6, 9, 13, 19, 28, 42, 63, 94, 141, 211, 316, 474, 711, 1066, 1599 below half of the record.
        let wanted = 1200f64.sqrt() / 1599f64.powf(1.5);
        assert!((left.error / wanted - 1.0).abs() < 0.01, "{} {wanted}", left.error);
        assert_eq!(Tangent::both(&[3.0], Ends::EVEN, 0.5)[0].error, 0.5);
    }
}
