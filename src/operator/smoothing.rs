//! Penalised smoothing as a gain: what the strength leaves of each frequency.

use std::f64::consts::TAU;
use std::sync::Arc;

use crate::error::{Error, Finding, Result};

use super::corner::{Corner, quoted};
use super::gain::{Gain, Series};
use super::step::{CornerPoint, Effect, Frame, Part, Setting, Stage};
use super::treatment::{Smoothing, Strength, Treatments};

#[derive(Debug)]
struct Smooth {
    amount: Amount,
    robust: bool,
}

#[derive(Debug)]
enum Amount {
    /// No smoothing, where a derivative would have it by default.
    None,
    Auto,
    Strength(f64),
    /// Half gain at a corner.
    Corner(Corner),
}

/// Reads the argument of `--smooth`: `auto`, a strength, or the corner of half gain, each with `:robust` where wanted.
pub(super) fn smooth(text: &str) -> Result<Box<dyn Setting>> {
    let text = text.trim();
    let (amount, robust) = match text.strip_suffix(":robust") {
        Some(amount) => (amount.trim(), true),
        None => (text, false),
    };
    let amount = if text == "none" {
        Amount::None
    } else if amount == "auto" {
        Amount::Auto
    } else if let Ok(strength) = amount.parse::<f64>() {
        if !(strength > 0.0 && strength <= LARGEST) {
            return Err(Error::usage(format!("{}: no strength above zero", quoted(amount))).remedy(EXAMPLE));
        }
        Amount::Strength(strength)
    } else {
        let corner = Corner::parse(amount).map_err(|_| {
            Error::usage(format!("{}: neither auto, a strength nor a corner", quoted(amount))).remedy(EXAMPLE)
        })?;
        Amount::Corner(corner)
    };
    Ok(Box::new(Smooth { amount, robust }))
}

const EXAMPLE: &str =
    "write auto, a strength such as 100, or the corner of half gain such as 40Hz; add :robust against outliers";

/// A strength that flattens all that a record of 1e9 samples can hold: beyond it arithmetic only loses digits.
const LARGEST: f64 = 1e36;

impl Setting for Smooth {
    fn resolve(&self, frame: &Frame<'_>) -> Result<Effect> {
        let mut findings: Vec<Finding> = Vec::new();
        let strength = match &self.amount {
            Amount::None => return Ok(Effect::default()),
            Amount::Auto => Strength::Auto,
            Amount::Strength(strength) => Strength::Given(*strength),
            Amount::Corner(corner) => {
                let cycles = corner.resolve(&frame.option, frame.axis)?;
                findings.extend(corner.note(&frame.option, frame.axis, frame.len));
                Strength::Given(strength_of(cycles, frame.order))
            }
        };
        let smoothing = Some(Smoothing { strength, robust: self.robust, order: frame.order });
        Ok(Effect { treatments: Treatments { smoothing, ..Treatments::default() }, findings, ..Effect::default() })
    }
}

/// The part of a chain that smooths with a strength, penalising differences of an order.
pub(super) fn part(strength: f64, order: i32) -> Part {
    let corners = cut_off(strength, order).map(|cycles| CornerPoint { text: "half gain".to_owned(), cycles });
    Part {
        kind: "smoothing",
        key: "smooth",
        value: super::corner::figure(strength),
        stage: Stage::Smooth,
        corners: corners.into_iter().collect(),
        gain: Arc::new(Penalised { strength, order }),
    }
}

/// The strength whose gain is one half at `cycles` per sample, for a penalty on differences of `order`.
pub fn strength_of(cycles: f64, order: i32) -> f64 {
    difference(cycles).powi(order).recip()
}

/// The frequency at which a strength leaves one half, in cycles per sample; `None` where it leaves more everywhere.
pub fn cut_off(strength: f64, order: i32) -> Option<f64> {
    // 2 - 2 cos w = strength^(-1/order), and 2 - 2 cos w = 4 sin^2(w/2).
    let half_sine = strength.powf(-0.5 / f64::from(order)) / 2.0;
    (half_sine < 1.0).then(|| 2.0 * half_sine.asin() / TAU)
}

/// 2 - 2 cos w, without cancellation: what a second difference makes of a wave.
fn difference(cycles: f64) -> f64 {
    let half = (TAU * cycles / 2.0).sin();
    4.0 * half * half
}

/// 1/(1 + s (2 - 2 cos w)^m): the gain of the penalised fit between even mirrors (Garcia 2010, eqs 6 to 9, from memory).
#[derive(Debug)]
struct Penalised {
    strength: f64,
    order: i32,
}

impl Gain for Penalised {
    fn at(&self, f: f64) -> f64 {
        1.0 / (1.0 + self.strength * difference(f).powi(self.order))
    }
    fn series(&self) -> Series {
        // (2 - 2 cos w)^2 = w^4 - w^6/6 + ...; higher orders begin with w^6.
        Series { s4: if self.order == 2 { -self.strength } else { 0.0 }, ..Series::ONE }
    }
    fn extent_samples(&self) -> f64 {
        // The reach of the squared Butterworth response of order 2 or 3, 1.54 or 2.03 over the corner.
        let corners = if self.order == 2 { 1.7 } else { 2.2 };
        cut_off(self.strength, self.order).map_or(4.0, |cycles| (corners / cycles).max(4.0))
    }
    fn highest(&self) -> f64 {
        cut_off(self.strength, self.order).unwrap_or(0.5)
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn strength_and_cut_off_are_inverse() {
        for cycles in [1e-6, 0.01, 0.1, 0.3, 0.49] {
            for order in [2, 3] {
                let strength = strength_of(cycles, order);
                let found = cut_off(strength, order).expect("a corner");
                assert!((found / cycles - 1.0).abs() < 1e-9, "{cycles}: {found}"); // asin near 1 doubles the rounding
                assert!((Penalised { strength, order }.at(cycles) - 0.5).abs() < 1e-14);
            }
        }
        // Even a wave at the Nyquist frequency keeps more than half: 1/(1 + 16 s) > 1/2.
        assert_eq!(cut_off(0.06, 2), None);
    }

    #[test]
    fn amounts_are_read_and_faults_named() {
        for text in ["none", "auto", "auto:robust", "10", "1e4:robust", "40Hz", "0.8mm:robust"] {
            assert!(smooth(text).is_ok(), "{text}");
        }
        for text in ["", "-1", "0", "nan", "inf", "1e99", "robust", "none:robust", "auto:", "fast", "10:weak"] {
            assert!(smooth(text).is_err_and(|e| e.advice().is_some()), "{text}");
        }
    }
}
