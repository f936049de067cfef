//! Rates as fractions: the plainest one that an interval allows.

use serde::Serialize;

/// A positive fraction in lowest terms.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Serialize)]
pub struct Rational {
    /// Numerator, at least 1.
    pub numerator: u64,
    /// Denominator, at least 1.
    pub denominator: u64,
}

/// Largest numerator or denominator that counts as plain: beyond it a fraction says no more than a decimal does.
const PLAIN: u64 = 1_000_000_000_000;

impl Rational {
    /// numerator / denominator in lowest terms; `None` unless both are positive.
    pub fn new(numerator: u64, denominator: u64) -> Option<Rational> {
        if numerator == 0 || denominator == 0 {
            return None;
        }
        let divisor = greatest_common_divisor(numerator, denominator);
        Some(Rational { numerator: numerator / divisor, denominator: denominator / divisor })
    }

    /// The plainest fraction in the closed interval: the roundest integer where it holds one (1000 before 999), the
    /// reciprocal of the roundest integer where it holds one of those, otherwise the fraction of smallest denominator.
    /// `None` when the interval is empty, not positive or too narrow for a plain fraction.
    pub fn plainest(low: f64, high: f64) -> Option<Rational> {
        if !(low > 0.0 && low <= high && high.is_finite()) {
            return None;
        }
        if let Some(whole) = roundest_integer(low, high) {
            return Rational::new(whole, 1);
        }
        if let Some(whole) = roundest_integer(1.0 / high, 1.0 / low) {
            let found = Rational::new(1, whole)?;
            // The two divisions above round: the fraction must itself be inside.
            if found.value() >= low && found.value() <= high {
                return Some(found);
            }
        }
        smallest_denominator(low, high)
    }

    /// The value.
    pub fn value(self) -> f64 {
        self.numerator as f64 / self.denominator as f64
    }

    /// One over it.
    pub fn reciprocal(self) -> Rational {
        Rational { numerator: self.denominator, denominator: self.numerator }
    }

    /// The product with another fraction; `None` when it does not fit.
    pub fn times(self, other: Rational) -> Option<Rational> {
        let (a, b) =
            (Rational::new(self.numerator, other.denominator)?, Rational::new(other.numerator, self.denominator)?);
        Rational::new(a.numerator.checked_mul(b.numerator)?, a.denominator.checked_mul(b.denominator)?)
    }

    /// The fraction of smallest denominator that is this very number, where it is a plain one such as 0.001 or 3600.
    pub fn exactly(value: f64) -> Option<Rational> {
        // Half an ulp either way: the decimal 0.001 is not a binary fraction.
        let slack = value * f64::EPSILON / 2.0;
        Rational::plainest(value - slack, value + slack)
    }
}

impl std::fmt::Display for Rational {
    fn fmt(&self, f: &mut std::fmt::Formatter<'_>) -> std::fmt::Result {
        match self.denominator {
            1 => write!(f, "{}", self.numerator),
            below => write!(f, "{}/{below}", self.numerator),
        }
    }
}

/// Greatest common divisor by Euclid's algorithm; 0 with 0 is 0.
pub fn greatest_common_divisor(mut a: u64, mut b: u64) -> u64 {
    while b != 0 {
        (a, b) = (b, a % b);
    }
    a
}

/// The multiple of the largest of 1, 2, 5, 10, 20, 50 … that lies in the interval; the one nearest its middle.
fn roundest_integer(low: f64, high: f64) -> Option<u64> {
    if high < 1.0 || high > PLAIN as f64 || low.ceil() > high.floor() {
        return None;
    }
    let middle = (low + high) / 2.0;
    let mut decade = 1e12;
    while decade >= 1.0 {
        for factor in [5.0, 2.0, 1.0] {
            let grain: f64 = decade * factor;
            let nearest = (middle / grain).round() * grain;
            let fits = |v: f64| v >= low.max(1.0) && v <= high;
            if let Some(found) = [nearest, nearest - grain, nearest + grain].into_iter().find(|&v| fits(v)) {
                return Some(found as u64);
            }
        }
        decade /= 10.0;
    }
    None
}

/// The fraction of smallest denominator in the closed interval, by continued fractions of both ends (the Stern-Brocot
/// descent, all steps of one direction taken at once).
fn smallest_denominator(low: f64, high: f64) -> Option<Rational> {
    let (mut low, mut high) = (low, high);
    // Convergents p/q of the shared head of both continued fractions.
    let (mut p0, mut q0, mut p1, mut q1) = (0u64, 1u64, 1u64, 0u64);
    for _ in 0..64 {
        let whole = low.floor();
        let closed = whole == low;
        let last = if closed { whole } else { whole + 1.0 };
        let digit = if last <= high { last } else { whole };
        if digit > PLAIN as f64 {
            return None;
        }
        let digit_int = digit as u64;
        let p = digit_int.checked_mul(p1)?.checked_add(p0)?;
        let q = digit_int.checked_mul(q1)?.checked_add(q0)?;
        if p > PLAIN || q > PLAIN {
            return None;
        }
        if last <= high {
            return Rational::new(p, q);
        }
        (p0, q0, p1, q1) = (p1, q1, p, q);
        (low, high) = (1.0 / (high - whole), 1.0 / (low - whole));
    }
    None
}

#[cfg(test)]
mod tests {
    use super::*;

    fn plainest(low: f64, high: f64) -> String {
        Rational::plainest(low, high).map_or("none".to_owned(), |r| r.to_string())
    }

    #[test]
    fn the_plainest_rate_is_taken() {
        assert_eq!(plainest(998.4, 1003.0), "1000");
        assert_eq!(plainest(70.0, 130.0), "100");
        assert_eq!(plainest(1023.7, 1024.2), "1024");
        assert_eq!(plainest(33.3332, 33.3334), "100/3");
        assert_eq!(plainest(3.1408, 3.1429), "22/7"); // 22/7 = 3.142857, no denominator below 7 comes near
        assert_eq!(plainest(1.0 / 3601.0, 1.0 / 3599.0), "1/3600");
        assert_eq!(plainest(52.73, 52.74), "791/15"); // 15 x 52.73 = 790.95, 15 x 52.74 = 791.1; by hand none below
        assert_eq!(plainest(-1.0, 2.0), "none");
        assert_eq!(plainest(2.0, 1.0), "none");
        assert_eq!(plainest(f64::NAN, 1.0), "none");
    }

    #[test]
    fn no_smaller_denominator_lies_inside() {
        let mut state = 7u64;
        for _ in 0..300 {
            state = state.wrapping_mul(6364136223846793005).wrapping_add(1442695040888963407);
            let low = 0.37 + (state >> 40) as f64 / (1u64 << 24) as f64;
            let high = low + 1e-4;
            let Some(found) = smallest_denominator(low, high) else { panic!("{low}") };
            assert!(found.value() >= low && found.value() <= high);
            // By definition: no denominator below it has an integer numerator in the interval.
            for q in 1..found.denominator {
                assert!((low * q as f64).ceil() > (high * q as f64).floor(), "{low} {found} {q}");
            }
        }
    }

    #[test]
    fn decimals_are_fractions() {
        assert_eq!(Rational::exactly(0.001), Rational::new(1, 1000));
        assert_eq!(Rational::exactly(3600.0), Rational::new(3600, 1));
        assert_eq!(Rational::exactly(0.0254), Rational::new(127, 5000));
        assert_eq!(Rational::new(6, 4).and_then(|r| r.times(r)), Rational::new(9, 4));
        assert_eq!(Rational::new(u64::MAX, 1).and_then(|r| r.times(r)), None);
    }
}
