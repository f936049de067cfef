//! The baseline: a polynomial split off first, so that only the remainder meets the extension.

mod estimate;
mod tangent;
mod trend;

use std::fmt;
use std::str::FromStr;

use crate::ends::{Ends, Parity};
use crate::error::{Error, Result};
use crate::numeric::polynomial::Polynomial;
use crate::numeric::{noise, sum};

pub use estimate::{EndEstimate, EndEstimates, Scale};
pub use tangent::Tangent;

/// What is split off before the transform.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Hash)]
pub enum BaselineKind {
    /// Nothing.
    None,
    /// The mean.
    Mean,
    /// A constant: the level at one end. `None` stands for the odd end of mixed ends.
    Level(Option<Side>),
    /// The straight line through the end values.
    Line,
    /// The quadratic with the end slopes.
    Slopes,
    /// The same with end slopes of cubic fits as wide as they agree: for derivatives and integrals of the record itself.
    Tangents,
    /// The least-squares polynomial of that degree, 0 to 3.
    Trend(u8),
}

/// One end of the record.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Hash, serde::Serialize)]
#[serde(rename_all = "snake_case")]
pub enum Side {
    /// Where the record starts.
    Left,
    /// Where it stops.
    Right,
}

impl BaselineKind {
    /// Every spelling that `from_str` takes, for help texts.
    pub const SPELLINGS: &'static str =
        "none, mean, level, level:left, level:right, line, slopes, tangents, trend, trend:0 to trend:3";
}

impl FromStr for BaselineKind {
    type Err = Error;

    fn from_str(text: &str) -> Result<Self> {
        match text {
            "none" => Ok(Self::None),
            "mean" => Ok(Self::Mean),
            "level" => Ok(Self::Level(None)),
            "level:left" => Ok(Self::Level(Some(Side::Left))),
            "level:right" => Ok(Self::Level(Some(Side::Right))),
            "line" => Ok(Self::Line),
            "slopes" => Ok(Self::Slopes),
            "tangents" => Ok(Self::Tangents),
            "trend" | "trend:1" => Ok(Self::Trend(1)),
            "trend:0" => Ok(Self::Trend(0)),
            "trend:2" => Ok(Self::Trend(2)),
            "trend:3" => Ok(Self::Trend(3)),
            other => {
                Err(Error::usage(format!("not a baseline: {other:?}"))
                    .remedy(format!("use one of {}", Self::SPELLINGS)))
            }
        }
    }
}

impl fmt::Display for BaselineKind {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        match self {
            Self::None => f.write_str("none"),
            Self::Mean => f.write_str("mean"),
            Self::Level(None) => f.write_str("level"),
            Self::Level(Some(Side::Left)) => f.write_str("level:left"),
            Self::Level(Some(Side::Right)) => f.write_str("level:right"),
            Self::Line => f.write_str("line"),
            Self::Slopes => f.write_str("slopes"),
            Self::Tangents => f.write_str("tangents"),
            Self::Trend(degree) => write!(f, "trend:{degree}"),
        }
    }
}

/// A polynomial in x, the distance from the left mirror in steps (`Ends::first_position` is sample 0).
#[derive(Debug, Clone, PartialEq)]
pub struct Baseline {
    kind: BaselineKind,
    polynomial: Polynomial,
}

impl Baseline {
    /// Fits a baseline to a record's samples for the given ends. `scale` tells how wide the fits at the ends may be.
    ///
    /// # Errors
    /// `Usage` for `level` without a side when the ends are not mixed.
    pub fn fit(kind: BaselineKind, samples: &[f64], ends: Ends, scale: Scale) -> Result<Baseline> {
        let length = ends.length(samples.len());
        let first = ends.first_position();
        let estimates = || EndEstimates::of(samples, ends, scale);
        let polynomial = match kind {
            BaselineKind::None => Polynomial::zero(length),
            BaselineKind::Mean => Polynomial::zero(length).plus_constant(sum::mean(samples)),
            BaselineKind::Level(side) => {
                let side = side.or_else(|| odd_end(ends)).ok_or_else(|| {
                    Error::usage(format!("baseline level needs a side with {} ends", ends.name()))
                        .remedy("write level:left or level:right")
                })?;
                let end = estimates().at(side);
                Polynomial::zero(length).plus_constant(end.level)
            }
            BaselineKind::Line => {
                let found = estimates();
                Self::line(found.left.value, found.right.value, length)
            }
            BaselineKind::Slopes => {
                let found = estimates();
                Self::slopes(found.left.slope, found.right.slope, length)
            }
            BaselineKind::Tangents => {
                let [left, right] = Tangent::both(samples, ends, noise::sigma(samples));
                Self::slopes(left.slope, right.slope, length)
            }
            BaselineKind::Trend(degree) => trend::fit(samples, first, length, degree),
        };
        Ok(Baseline { kind, polynomial })
    }

    /// The line through value `left` at x = 0 and `right` at x = length: with odd ends, reflection in the end points.
    pub fn line(left: f64, right: f64, length: f64) -> Polynomial {
        let constant = Polynomial::zero(length).plus_constant(left);
        if length > 0.0 { constant.plus_slope((right - left) / length) } else { constant }
    }

    /// The quadratic s0 x + (s1 - s0) x^2 / (2 length) with slope s0 at x = 0 and s1 at x = length (per step).
    pub fn slopes(left: f64, right: f64, length: f64) -> Polynomial {
        if length <= 0.0 {
            return Polynomial::zero(length);
        }
        Polynomial::from_powers(length, &[0.0, left, (right - left) / (2.0 * length)])
    }

    /// A baseline whose polynomial is known exactly, such as one through end values that theory gives.
    pub fn exact(kind: BaselineKind, polynomial: Polynomial) -> Baseline {
        Baseline { kind, polynomial }
    }

    /// What was asked for.
    pub fn kind(&self) -> BaselineKind {
        self.kind
    }

    /// The polynomial in x steps from the left mirror.
    pub fn polynomial(&self) -> &Polynomial {
        &self.polynomial
    }
}

/// The odd end of mixed ends.
fn odd_end(ends: Ends) -> Option<Side> {
    match ends {
        Ends::Mirror { left: Parity::Even, right: Parity::Odd, .. } => Some(Side::Right),
        Ends::Mirror { left: Parity::Odd, right: Parity::Even, .. } => Some(Side::Left),
        _ => None,
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    const SCALE: Scale = Scale { shortest_wavelength: 32.0, zone: 64 };

    fn residual(kind: BaselineKind, ends: Ends, samples: &[f64]) -> f64 {
        let baseline = Baseline::fit(kind, samples, ends, SCALE).expect("a fit");
        let first = ends.first_position();
        samples
            .iter()
            .enumerate()
            .map(|(n, v)| (v - baseline.polynomial().at(n as f64 + first)).abs())
            .fold(0.0, f64::max)
    }

    #[test]
    fn every_spelling_round_trips() {
        for text in
            ["none", "mean", "level", "level:left", "level:right", "line", "slopes", "tangents", "trend:0", "trend:3"]
        {
            assert_eq!(text.parse::<BaselineKind>().expect("known").to_string(), text);
        }
        assert!("trend:4".parse::<BaselineKind>().is_err());
    }

    #[test]
    fn a_line_is_taken_whole_by_line_trend_and_slopes() {
        let line: Vec<f64> = (0..300).map(|n| 3.0 + 0.25 * n as f64).collect();
        for ends in Ends::all() {
            // Values up to 78 with a few roundings in each Horner step.
            assert!(residual(BaselineKind::Line, ends, &line) < 1e-12, "{}", ends.name());
            assert!(residual(BaselineKind::Trend(1), ends, &line) < 1e-12);
            // `slopes` takes the slope and leaves the constant.
            let left_over = residual(BaselineKind::Slopes, ends, &line) - 3.0;
            assert!(left_over.abs() < 0.26, "{left_over}");
        }
    }

    #[test]
    fn level_stands_at_the_odd_end() {
        let step: Vec<f64> = (0..200).map(|n| if n < 100 { 1.0 } else { 5.0 }).collect();
        let at = |ends| Baseline::fit(BaselineKind::Level(None), &step, ends, SCALE).map(|b| b.polynomial().at(0.0));
        assert_eq!(at(Ends::EVEN_ODD), Ok(5.0));
        assert_eq!(at(Ends::ODD_EVEN), Ok(1.0));
        assert!(at(Ends::EVEN).is_err());
    }

    #[test]
    fn one_sample_is_enough_for_every_kind() {
        for ends in Ends::all() {
            for kind in [BaselineKind::Mean, BaselineKind::Line, BaselineKind::Slopes, BaselineKind::Trend(3)] {
                assert!(residual(kind, ends, &[2.0]).is_finite());
            }
        }
    }
}
