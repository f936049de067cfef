//! A number with its unit as people write it: `0.25m`, `-3 mm`, `20ug`.

use std::fmt;

use crate::error::{Error, Result};
use crate::numeric::leading_number;
use crate::unit::Unit;

use super::corner::quoted;

/// A finite number with a unit.
#[derive(Debug, Clone, PartialEq)]
pub struct Quantity {
    value: f64,
    unit: Unit,
}

impl Quantity {
    /// Reads a number followed by a unit.
    ///
    /// # Errors
    /// `Usage` without a finite number or without a unit.
    pub fn parse(text: &str) -> Result<Quantity> {
        let Some((value, unit)) = leading_number::split(text) else {
            return Err(Error::usage(format!("{}: no number with a unit", quoted(text.trim()))));
        };
        // A dash and the like stand for no unit.
        let unit = Some(unit).filter(|unit| !unit.chars().any(char::is_control)).map(Unit::parse);
        match unit.filter(|unit| !unit.to_string().is_empty()) {
            Some(unit) => Ok(Quantity { value, unit }),
            None => Err(Error::usage(format!("{}: a number without a unit", quoted(text.trim())))),
        }
    }

    /// The number in another unit of the same dimension; `None` where there is no way between them.
    pub fn in_unit(&self, unit: &Unit) -> Option<f64> {
        if self.unit.label() == unit.label() {
            return Some(self.value);
        }
        let (own, wanted) = (self.unit.meaning()?, unit.meaning()?);
        ((own.length, own.time) == (wanted.length, wanted.time)).then(|| self.value * (own.scale / wanted.scale))
    }
}

impl fmt::Display for Quantity {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        write!(f, "{}{}", self.value, self.unit)
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_quantity_is_a_number_and_a_unit() {
        let metre = Unit::parse("m");
        for (text, metres) in [("0.25m", 0.25), ("-3 mm", -3e-3), ("2e3um", 2e-3), ("1in", 0.0254)] {
            let found = Quantity::parse(text).expect(text).in_unit(&metre).expect(text);
            assert!((found / metres - 1.0).abs() < 1e-15, "{text}: {found}");
        }
        assert_eq!(Quantity::parse("3V").expect("opaque").in_unit(&Unit::parse("V")), Some(3.0));
        assert_eq!(Quantity::parse("3V").expect("opaque").in_unit(&metre), None);
        assert_eq!(Quantity::parse("3s").expect("a time").in_unit(&metre), None);
        for text in ["", "m", "3", "infm", "nan m", "3\u{1}m", "µ"] {
            assert!(Quantity::parse(text).is_err(), "{text}");
        }
    }
}
