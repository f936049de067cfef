//! The edge error that is tolerable, as the user writes it.

use std::fmt;
use std::str::FromStr;

use crate::error::{Error, Result};
use crate::numeric::leading_number;
use crate::place::escape;
use crate::unit::Unit;
use crate::verdict::Tolerance;

/// A share of the output's standard deviation (`10%`), or a value with its unit (`0.02m/s`).
#[derive(Debug, Clone, PartialEq)]
pub enum ToleranceRequest {
    /// Share of the output's standard deviation.
    Share(f64),
    /// Value and unit.
    Value(f64, Unit),
}

impl Default for ToleranceRequest {
    /// A tenth of the output's standard deviation.
    fn default() -> Self {
        Self::Share(0.1)
    }
}

impl FromStr for ToleranceRequest {
    type Err = Error;

    fn from_str(text: &str) -> Result<Self> {
        let wrong = || {
            Error::usage(format!("not a tolerance: \"{}\"", escape(text)))
                .remedy("write a share of the output's standard deviation as 10%, or a value with its unit as 0.02m/s")
        };
        let (value, unit) = leading_number::split(text).ok_or_else(wrong)?;
        if value <= 0.0 || unit.is_empty() {
            return Err(wrong());
        }
        Ok(if unit == "%" { Self::Share(value / 100.0) } else { Self::Value(value, Unit::parse(unit)) })
    }
}

impl fmt::Display for ToleranceRequest {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        match self {
            Self::Share(share) => write!(f, "{}%", share * 100.0),
            Self::Value(value, unit) => write!(f, "{value}{unit}"),
        }
    }
}

impl ToleranceRequest {
    /// In the unit of the output; `option` is named in errors.
    ///
    /// # Errors
    /// `Usage` when the units cannot be converted.
    pub fn resolve(&self, option: &str, output: &Unit) -> Result<Tolerance> {
        let (value, unit) = match self {
            Self::Share(share) => return Ok(Tolerance::Share(*share)),
            Self::Value(value, unit) => (*value, unit),
        };
        if unit.label() == output.label() {
            return Ok(Tolerance::Absolute(value));
        }
        match (unit.meaning(), output.meaning()) {
            (Some(own), Some(wanted)) if (own.length, own.time) == (wanted.length, wanted.time) => {
                Ok(Tolerance::Absolute(value * own.scale / wanted.scale))
            }
            _ => Err(Error::usage(format!("{option} {self}: the output is in \"{output}\""))
                .remedy(format!("give {option} in that unit or in %"))),
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn tolerances_carry_a_unit() {
        let parse = |text: &str| text.parse::<ToleranceRequest>();
        assert_eq!(parse("10%"), Ok(ToleranceRequest::Share(0.1)));
        let mm = parse("2 mm/s").expect("a tolerance");
        let Ok(Tolerance::Absolute(value)) = mm.resolve("--tolerance", &Unit::parse("m/s")) else { panic!("absolute") };
        assert!((value - 0.002).abs() < 1e-15);
        assert!(mm.resolve("--tolerance", &Unit::parse("V")).is_err());
        for text in ["", "10", "-5%", "nan%", "x", "%", "1e400%", "1e400m/s", "5 5%"] {
            assert!(parse(text).is_err(), "{text}");
        }
    }
}
