//! Derivatives and integrals: a quarter turn of every wave each, and a power of the angular frequency.

use crate::ends::Parity;
use crate::error::{Error, Result};

use super::corner::quoted;
use super::step::{Effect, Frame, Setting};

/// One or two derivatives (positive) or integrals (negative).
#[derive(Debug)]
struct Turns(i32);

impl Setting for Turns {
    fn resolve(&self, _: &Frame<'_>) -> Result<Effect> {
        Ok(Effect { turns: self.0, ..Effect::default() })
    }
}

/// Reads the argument of `--integrate`.
pub(super) fn integrate(text: &str) -> Result<Box<dyn Setting>> {
    Ok(Box::new(Turns(-count(text)?)))
}

/// Reads the argument of `--differentiate`.
pub(super) fn differentiate(text: &str) -> Result<Box<dyn Setting>> {
    Ok(Box::new(Turns(count(text)?)))
}

/// The factor (i w)^turns at `f` cycles per sample, w = 2 pi f: its real size with sign, and whether the impulse response
/// is even (the factor is real) or odd (the factor is that size times i).
pub fn factor(f: f64, turns: i32) -> (f64, Parity) {
    let size = (std::f64::consts::TAU * f).powi(turns);
    match turns.rem_euclid(4) {
        0 => (size, Parity::Even),
        1 => (size, Parity::Odd),
        2 => (-size, Parity::Even),
        _ => (-size, Parity::Odd),
    }
}

fn count(text: &str) -> Result<i32> {
    match text.trim() {
        "1" => Ok(1),
        "2" => Ok(2),
        other => Err(Error::usage(format!("{}: neither 1 nor 2", quoted(other))).remedy("write once as 1, twice as 2")),
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn the_factor_is_the_power_of_i_w() {
        // (i w)^t written out: i w, -w^2, 1/(i w) = -i/w, -1/w^2.
        let w = std::f64::consts::TAU * 0.1;
        for (turns, size, parity) in [
            (0, 1.0, Parity::Even),
            (1, w, Parity::Odd),
            (2, -w * w, Parity::Even),
            (-1, -1.0 / w, Parity::Odd),
            (-2, -1.0 / (w * w), Parity::Even),
        ] {
            let (found, odd) = factor(0.1, turns);
            assert!((found / size - 1.0).abs() < 1e-15 && odd == parity, "{turns}");
        }
    }
}
