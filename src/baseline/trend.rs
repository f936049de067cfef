//! Least-squares polynomials of degree 0 to 3 through a whole record.

use crate::numeric::least_squares;
use crate::numeric::polynomial::Polynomial;

/// The least-squares polynomial of `degree` (lower where there are too few samples) in x = first + n, re-expanded about
/// the middle of 0..length as all baselines are.
pub fn fit(samples: &[f64], first: f64, length: f64, degree: u8) -> Polynomial {
    let n = samples.len() as f64;
    let points = samples.iter().enumerate().map(|(index, &value)| (first + index as f64, value));
    recentred(&least_squares::polynomial(points, first - 0.5, first + n - 0.5, degree), length)
}

/// The same polynomial in the variable that all baselines of this length share.
fn recentred(p: &Polynomial, length: f64) -> Polynomial {
    let target = Polynomial::zero(length);
    let (shift, stretch) = ((target.centre() - p.centre()) / p.half_width(), target.half_width() / p.half_width());
    // u_old = shift + stretch u_new: expand by Horner.
    let mut coefficients = vec![0.0];
    for &c in p.coefficients().iter().rev() {
        let mut next = vec![0.0; coefficients.len() + 1];
        for (j, &old) in coefficients.iter().enumerate() {
            next[j] += old * shift;
            next[j + 1] += old * stretch;
        }
        next[0] += c;
        coefficients = next;
    }
    coefficients.truncate(p.coefficients().len());
    Polynomial::new(target.centre(), target.half_width(), coefficients)
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_cubic_is_found_again() {
        let truth = |x: f64| 1.0 - 0.02 * x + 3e-4 * x * x - 1e-6 * x * x * x;
        let samples: Vec<f64> = (0..500).map(|n| truth(n as f64 + 0.5)).collect();
        let fitted = fit(&samples, 0.5, 500.0, 3);
        for x in [0.0, 10.5, 499.5, 500.0] {
            // Values up to 60; two rounds leave a few ulps.
            assert!((fitted.at(x) - truth(x)).abs() < 1e-12, "{x}: {}", fitted.at(x) - truth(x));
        }
    }

    #[test]
    fn two_samples_carry_at_most_a_line() {
        let fitted = fit(&[1.0, 3.0], 0.5, 2.0, 3);
        assert!((fitted.at(0.5) - 1.0).abs() < 1e-14 && (fitted.at(1.5) - 3.0).abs() < 1e-14);
    }
}
