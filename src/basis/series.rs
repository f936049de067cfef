//! The value of a record's series anywhere between its mirrors, above all on the mirrors themselves.

use super::{amplitude, angle};
use crate::ends::{Ends, Parity};
use crate::numeric::compensated::Compensated;

/// Value at `x` of sum_k c_k phi_k, the series of the basis in [`crate::basis`]. `x` is in steps from the left mirror:
/// sample n stands at n + [`Ends::first_position`], the mirrors (or the ends of the period) at 0 and [`Ends::length`].
/// O(len), compensated.
///
/// # Panics
/// If `c` does not hold `len` coefficients.
pub fn value_at(ends: Ends, len: usize, c: &[f64], x: f64) -> f64 {
    sum(ends, len, c, x, |cosine, sine| (cosine, sine))
}

/// Value at `x` of the series after a quarter turn: every cosine replaced by the sine of the same argument, every sine by
/// the cosine. Conventions and panics as in [`value_at`]. Off the samples the last sine of the odd half-sample basis and
/// the periodic Nyquist cosine do not vanish when turned: leave them out where the samples' own series is wanted.
pub fn turned_value_at(ends: Ends, len: usize, c: &[f64], x: f64) -> f64 {
    sum(ends, len, c, x, |cosine, sine| (sine, cosine))
}

/// `pick` orders the pair (value of a cosine function, value of a sine function).
fn sum(ends: Ends, len: usize, c: &[f64], x: f64, pick: impl Fn(f64, f64) -> (f64, f64)) -> f64 {
    assert_eq!(c.len(), len, "a series of {len} coefficients was given {}", c.len());
    let length = ends.length(len);
    let mut sum = Compensated::default();
    for (k, &c) in c.iter().enumerate() {
        let (cosine, sine) = match ends {
            Ends::Periodic => angle::at_position(2.0 * k.div_ceil(2) as f64, x - ends.first_position(), length),
            // On the left mirror no angle need be formed.
            Ends::Mirror { .. } if length == 0.0 || x == 0.0 => (1.0, 0.0),
            Ends::Mirror { left, right, .. } => angle::at_position(half_cycles(left, right, k), x, length),
        };
        let (of_cosine, of_sine) = pick(cosine, sine);
        let is_cosine = match ends {
            Ends::Periodic => k == 0 || k % 2 == 1,
            Ends::Mirror { left, .. } => left == Parity::Even,
        };
        sum.add(c * amplitude(ends, len, k) * if is_cosine { of_cosine } else { of_sine });
    }
    sum.value()
}

fn half_cycles(left: Parity, right: Parity, k: usize) -> f64 {
    match (left, right) {
        (Parity::Even, Parity::Even) => k as f64,
        (Parity::Odd, Parity::Odd) => k as f64 + 1.0,
        _ => k as f64 + 0.5,
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::basis::direct::Definition;

    #[test]
    fn on_the_samples_the_series_is_the_inverse() {
        for ends in Ends::all() {
            for len in 1..20 {
                let c: Vec<f64> = (0..len).map(|k| (1.0 + 7.3 * k as f64).sin()).collect();
                let norm = c.iter().map(|v| v * v).sum::<f64>().sqrt();
                let basis = Definition::new(ends, len);
                for (n, (value, turned)) in basis.inverse(&c).into_iter().zip(basis.inverse_turned(&c)).enumerate() {
                    let x = n as f64 + ends.first_position();
                    // Each of len terms c_k A_k carries a few roundings of an angle below 2 pi; A_k <= sqrt 2.
                    let tolerance = 16.0 * f64::EPSILON * norm * (len as f64).sqrt();
                    assert!((value_at(ends, len, &c, x) - value).abs() < tolerance, "{ends:?} {len} {n}");
                    assert!((turned_value_at(ends, len, &c, x) - turned).abs() < tolerance, "{ends:?} {len} {n}");
                }
            }
        }
    }

    #[test]
    fn an_odd_mirror_is_a_zero_and_an_even_mirror_has_no_slope() {
        for ends in Ends::all() {
            let Ends::Mirror { left, right, .. } = ends else { continue };
            let len = 11;
            let c: Vec<f64> = (0..len).map(|k| (0.4 + 1.9 * k as f64).cos()).collect();
            for (parity, x) in [(left, 0.0), (right, ends.length(len))] {
                // A quarter turn exchanges value and slope up to factors that do not vanish.
                let vanishing = match parity {
                    Parity::Odd => value_at(ends, len, &c, x),
                    Parity::Even => turned_value_at(ends, len, &c, x),
                };
                assert!(vanishing.abs() < 1e-14, "{ends:?} {x}: {vanishing}"); // 11 terms of magnitude <= 1/2 at 1e-15
            }
        }
    }
}
