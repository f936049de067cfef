//! Cosines and sines whose argument is reduced exactly before it is rounded.

use std::f64::consts::{FRAC_PI_4, TAU};

/// Cosine and sine of `numerator / denominator` turns, each within about one rounding: the fraction is reduced to an
/// eighth of a turn in integers. `denominator` must lie in 1..2^60.
pub fn of_turns(numerator: u64, denominator: u64) -> (f64, f64) {
    let eighths = 8 * (numerator % denominator);
    let octant = eighths / denominator;
    let rest = eighths % denominator;
    // Odd octants are measured back from their end, so that the angle never passes pi/4.
    let part = if octant.is_multiple_of(2) { rest } else { denominator - rest };
    let (s, c) = (FRAC_PI_4 * (part as f64 / denominator as f64)).sin_cos();
    match octant {
        0 => (c, s),
        1 => (s, c),
        2 => (-s, c),
        3 => (-c, s),
        4 => (-c, -s),
        5 => (-s, -c),
        6 => (s, -c),
        _ => (c, -s),
    }
}

/// Cosine and sine of pi `half_cycles` `x` / `length`, for a `half_cycles` that is exact and any position `x`.
pub fn at_position(half_cycles: f64, x: f64, length: f64) -> (f64, f64) {
    // The product is kept in two parts: rounded once it would lose log10(product) digits of the phase.
    let high = half_cycles * x;
    let low = half_cycles.mul_add(x, -high);
    let period = 2.0 * length;
    let turns = (high % period + low) / period;
    let (s, c) = (TAU * turns).sin_cos();
    (c, s)
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn quarter_turns_are_exact() {
        for (numerator, expected) in [(0, (1.0, 0.0)), (3, (0.0, 1.0)), (6, (-1.0, 0.0)), (9, (0.0, -1.0))] {
            assert_eq!(of_turns(numerator + 12 * 1_000_000_007, 12), expected);
        }
    }

    #[test]
    fn every_octant_agrees_with_the_plain_cosine() {
        for i in 0..1000_u64 {
            let (c, s) = of_turns(i, 1000);
            let angle = TAU * i as f64 / 1000.0;
            // The plain argument carries two roundings of an angle up to 2 pi.
            assert!((c - angle.cos()).abs() < 8.0 * f64::EPSILON && (s - angle.sin()).abs() < 8.0 * f64::EPSILON);
        }
    }

    #[test]
    fn a_phase_past_the_last_digit_of_the_product_is_kept() {
        // (2^27 + 1)(2^27 + 3/2) = 2^54 + 5 2^26 + 3/2 has more than 53 bits; modulo 2^28 it is 2^26 + 3/2, so that the
        // angle is pi/2 + 3 pi/2^28.
        let length = 2_f64.powi(27);
        let (c, s) = at_position(length + 1.0, length + 1.5, length);
        let beyond = 3.0 * std::f64::consts::PI / 2_f64.powi(28);
        // One rounding of an angle below 2 pi.
        assert!((c + beyond.sin()).abs() < 4.0 * f64::EPSILON && (s - beyond.cos()).abs() < 4.0 * f64::EPSILON);
    }
}
