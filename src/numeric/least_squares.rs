//! Least-squares polynomials of degree 0 to 3 through points on an interval.

use crate::numeric::polynomial::Polynomial;

/// The least-squares polynomial of `degree` (at most 3; lower where there are too few points) through `points` (x, value),
/// in the scaled variable of the interval `low..high`, which should just hold them.
///
/// Fitted in Legendre polynomials of the interval, whose Gram matrix is nearly diagonal for even points, and once more to
/// the residual: the second round removes the rounding of the first. Without points it is zero.
pub fn polynomial(points: impl Iterator<Item = (f64, f64)> + Clone, low: f64, high: f64, degree: u8) -> Polynomial {
    let terms = usize::from(degree.min(3)).min(points.clone().take(4).count().saturating_sub(1)) + 1;
    let centre = (low + high) / 2.0;
    let half_width = if high > low { (high - low) / 2.0 } else { 0.5 };
    let mut total = [0.0; 4];
    for _round in 0..2 {
        let mut gram = [[0.0; 4]; 4];
        let mut right = [0.0; 4];
        for (x, value) in points.clone() {
            let p = legendre((x - centre) / half_width);
            let rest = value - dot(&total, &p);
            for i in 0..terms {
                right[i] += p[i] * rest;
                for j in 0..=i {
                    gram[i][j] += p[i] * p[j];
                }
            }
        }
        let correction = solve(gram, right, terms);
        for (sum, c) in total.iter_mut().zip(correction) {
            *sum += c;
        }
    }
    let [a, b, c, d] = total;
    // Legendre: 1, u, (3u^2 - 1)/2, (5u^3 - 3u)/2.
    Polynomial::new(centre, half_width, vec![a - c / 2.0, b - 1.5 * d, 1.5 * c, 2.5 * d])
}

/// Standard error, for noise 1 a point, of the slope at `x` of the polynomial that `polynomial` would fit through points at
/// `places`.
pub fn slope_gain(places: impl Iterator<Item = f64> + Clone, low: f64, high: f64, degree: u8, x: f64) -> f64 {
    let terms = usize::from(degree.min(3)).min(places.clone().take(4).count().saturating_sub(1)) + 1;
    let centre = (low + high) / 2.0;
    let half_width = if high > low { (high - low) / 2.0 } else { 0.5 };
    let mut gram = [[0.0; 4]; 4];
    for place in places {
        let p = legendre((place - centre) / half_width);
        for i in 0..terms {
            for j in 0..=i {
                gram[i][j] += p[i] * p[j];
            }
        }
    }
    let u = (x - centre) / half_width;
    let mut slopes = [0.0, 1.0, 3.0 * u, 7.5 * u * u - 1.5].map(|slope| slope / half_width);
    slopes.iter_mut().skip(terms).for_each(|slope| *slope = 0.0);
    dot(&slopes, &solve(gram, slopes, terms)).max(0.0).sqrt()
}

fn legendre(u: f64) -> [f64; 4] {
    [1.0, u, 0.5 * (3.0 * u * u - 1.0), 0.5 * u * (5.0 * u * u - 3.0)]
}

fn dot(a: &[f64; 4], b: &[f64; 4]) -> f64 {
    a.iter().zip(b).map(|(x, y)| x * y).sum()
}

/// Solves the leading `terms` x `terms` system of a symmetric positive matrix (lower triangle given) by Cholesky.
fn solve(mut m: [[f64; 4]; 4], mut right: [f64; 4], terms: usize) -> [f64; 4] {
    for i in 0..terms {
        for j in 0..=i {
            let sum: f64 = (0..j).map(|k| m[i][k] * m[j][k]).sum();
            m[i][j] = if i == j { (m[i][i] - sum).max(f64::MIN_POSITIVE).sqrt() } else { (m[i][j] - sum) / m[j][j] };
        }
    }
    for i in 0..terms {
        let sum: f64 = (0..i).map(|k| m[i][k] * right[k]).sum();
        right[i] = (right[i] - sum) / m[i][i];
    }
    for i in (0..terms).rev() {
        let sum: f64 = (i + 1..terms).map(|k| m[k][i] * right[k]).sum();
        right[i] = (right[i] - sum) / m[i][i];
    }
    for value in right.iter_mut().skip(terms) {
        *value = 0.0;
    }
    right
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_parabola_is_found_from_two_windows() {
        let truth = |x: f64| 2.0 - 0.3 * x + 0.01 * x * x;
        let points = (0..100).filter(|n| *n < 20 || *n > 85).map(|n| (f64::from(n), truth(f64::from(n))));
        let fitted = polynomial(points, 0.0, 99.0, 2);
        for x in [0.0, 50.0, 99.0] {
            // Values up to 70; the second round leaves a few ulps, the gap between the windows a factor of some ten.
            assert!((fitted.at(x) - truth(x)).abs() < 1e-11, "{x}: {}", fitted.at(x) - truth(x));
        }
        assert!(polynomial(std::iter::empty(), 0.0, 1.0, 3).at(0.3) == 0.0);
    }
}
