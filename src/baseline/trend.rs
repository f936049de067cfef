//! Least-squares polynomials of degree 0 to 3 through a whole record.

use crate::numeric::polynomial::Polynomial;

/// The least-squares polynomial of `degree` (lower where there are too few samples) in x = first + n.
///
/// Fitted in Legendre polynomials of the record's own interval, whose Gram matrix is nearly diagonal, and once more to
/// the residual: the second round removes the rounding of the first.
pub fn fit(samples: &[f64], first: f64, length: f64, degree: u8) -> Polynomial {
    let n = samples.len();
    let terms = usize::from(degree.min(3)).min(n - 1) + 1;
    let centre = first + (n as f64 - 1.0) / 2.0;
    let half_width = (n as f64 / 2.0).max(0.5);
    let mut total = [0.0; 4];
    for _round in 0..2 {
        let mut gram = [[0.0; 4]; 4];
        let mut right = [0.0; 4];
        for (index, &value) in samples.iter().enumerate() {
            let u = (first + index as f64 - centre) / half_width;
            let p = legendre(u);
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
    let in_u = Polynomial::new(centre, half_width, vec![a - c / 2.0, b - 1.5 * d, 1.5 * c, 2.5 * d]);
    recentred(&in_u, length)
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
