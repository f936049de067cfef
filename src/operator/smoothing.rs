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
    let amount = if amount == "auto" {
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
            Amount::Auto => Strength::Auto,
            Amount::Strength(strength) => Strength::Given(*strength),
            Amount::Corner(corner) => {
                let cycles = corner.resolve(&frame.option, frame.axis)?;
                findings.extend(corner.note(&frame.option, frame.axis, frame.len));
                Strength::Given(strength_of(cycles))
            }
        };
        let smoothing = Some(Smoothing { strength, robust: self.robust });
        Ok(Effect { treatments: Treatments { smoothing, ..Treatments::default() }, findings, ..Effect::default() })
    }
}

/// The part of a chain that smooths with a strength.
pub(super) fn part(strength: f64) -> Part {
    let corners = cut_off(strength).map(|cycles| CornerPoint { text: "half gain".to_owned(), cycles });
    Part {
        kind: "smoothing",
        key: "smooth",
        value: super::corner::figure(strength),
        stage: Stage::Smooth,
        corners: corners.into_iter().collect(),
        gain: Arc::new(Penalised { strength }),
    }
}

/// The strength whose gain is one half at `cycles` per sample.
pub fn strength_of(cycles: f64) -> f64 {
    difference(cycles).powi(2).recip()
}

/// The frequency at which a strength leaves one half, in cycles per sample; `None` where it leaves more everywhere.
pub fn cut_off(strength: f64) -> Option<f64> {
    // 2 - 2 cos w = strength^(-1/2), and 2 - 2 cos w = 4 sin^2(w/2).
    let half_sine = strength.powf(-0.25) / 2.0;
    (half_sine < 1.0).then(|| 2.0 * half_sine.asin() / TAU)
}

/// 2 - 2 cos w, without cancellation: what a second difference makes of a wave.
fn difference(cycles: f64) -> f64 {
    let half = (TAU * cycles / 2.0).sin();
    4.0 * half * half
}

/// 1/(1 + s (2 - 2 cos w)^2): the gain of the penalised fit between even mirrors (Garcia 2010, eqs 6 to 9, from memory).
#[derive(Debug)]
struct Penalised {
    strength: f64,
}

impl Gain for Penalised {
    fn at(&self, f: f64) -> f64 {
        1.0 / (1.0 + self.strength * difference(f).powi(2))
    }
    fn series(&self) -> Series {
        // (2 - 2 cos w)^2 = w^4 - w^6/6 + ...
        Series { s4: -self.strength, ..Series::ONE }
    }
    fn extent_samples(&self) -> f64 {
        // The reach of the squared Butterworth response of order 2, 1.54 over the corner.
        cut_off(self.strength).map_or(4.0, |cycles| (1.7 / cycles).max(4.0))
    }
    fn highest(&self) -> f64 {
        cut_off(self.strength).unwrap_or(0.5)
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn strength_and_cut_off_are_inverse() {
        for cycles in [1e-6, 0.01, 0.1, 0.3, 0.49] {
            let strength = strength_of(cycles);
            let found = cut_off(strength).expect("a corner");
            assert!((found / cycles - 1.0).abs() < 1e-9, "{cycles}: {found}"); // asin near 1 doubles the rounding
            assert!((Penalised { strength }.at(cycles) - 0.5).abs() < 1e-14);
        }
        // Even a wave at the Nyquist frequency keeps more than half: 1/(1 + 16 s) > 1/2.
        assert_eq!(cut_off(0.06), None);
    }

    #[test]
    fn amounts_are_read_and_faults_named() {
        for text in ["auto", "auto:robust", "10", "1e4:robust", "40Hz", "0.8mm:robust"] {
            assert!(smooth(text).is_ok(), "{text}");
        }
        for text in ["", "-1", "0", "nan", "inf", "1e99", "robust", "auto:", "fast", "10:weak"] {
            assert!(smooth(text).is_err_and(|e| e.advice().is_some()), "{text}");
        }
    }
}
