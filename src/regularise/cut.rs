//! `--from` and `--to`: the stretch of a record that is worked on.

use crate::error::{Error, Result};
use crate::numeric::leading_number;
use crate::place::Place;
use crate::unit::Unit;

use super::RegulariseOptions;
use super::table::Table;

/// A stamp with its unit, such as `2.5s` or `30mm`: as the time or position column shows it. Civil stamps, and records
/// without stamps, count from the first row.
#[derive(Debug, Clone, PartialEq)]
pub struct Bound {
    /// The number.
    pub value: f64,
    /// Its unit, of time or length.
    pub unit: Unit,
}

impl Bound {
    /// From text such as `2.5s`, `-1e-3 s`, `30mm`.
    ///
    /// # Errors
    /// `Usage` without a number or without a unit of time or length.
    pub fn parse(text: &str) -> Result<Bound> {
        let wrong =
            || Error::usage(format!("not a place on the axis: {text:?}")).remedy("write it with its unit: 2.5s, 30mm");
        let (value, unit) = leading_number::split(text).ok_or_else(wrong)?;
        let unit = Unit::parse(unit);
        if !(unit.is_time() || unit.is_length()) {
            return Err(wrong());
        }
        Ok(Bound { value, unit })
    }

    /// The number in another unit of the same dimension.
    ///
    /// # Errors
    /// `Usage` for a unit of another dimension.
    pub fn in_unit(&self, unit: &Unit) -> Result<f64> {
        let wrong = || {
            Error::usage(format!("{} {} is no place on an axis in {unit}", self.value, self.unit))
                .remedy(format!("give --from and --to in {unit}"))
        };
        let (own, axis) = (self.unit.meaning().ok_or_else(wrong)?, unit.meaning().ok_or_else(wrong)?);
        if (own.length, own.time) != (axis.length, axis.time) {
            return Err(wrong());
        }
        Ok(self.value * (own.scale / axis.scale))
    }
}

/// Keeps the rows whose stamps lie from `from` to `to`, both included. Rounding of the bounds by a millionth of the
/// print resolution does not matter.
pub fn cut(table: &mut Table, options: &RegulariseOptions) -> Result<()> {
    if options.from.is_none() && options.to.is_none() {
        return Ok(());
    }
    let rows = table.len();
    let (first, last) = match (&table.raw.stamps, &table.raw.stated_rate) {
        (Some(stamps), _) => {
            let base = if stamps.civil.is_some() { 0.0 } else { stamps.first };
            let slack = 1e-6 * stamps.resolution.max(stamps.tick);
            let stamp = |row: usize| base + stamps.ticks[row] as f64 * stamps.tick;
            let from = options.from.as_ref().map(|bound| bound.in_unit(&stamps.unit)).transpose()?;
            let to = options.to.as_ref().map(|bound| bound.in_unit(&stamps.unit)).transpose()?;
            let first = from.map_or(Some(0), |from| (0..rows).find(|&row| stamp(row) >= from - slack));
            let last = to.map_or(Some(rows - 1), |to| (0..rows).rev().find(|&row| stamp(row) <= to + slack));
            (first, last.map(|row| row + 1))
        }
        (None, Some(rate)) => {
            let base = Unit::parse(if rate.unit.is_length() { "m" } else { "s" });
            let place = |bound: &Bound| Ok::<f64, Error>(bound.in_unit(&base)? * rate.rate_base);
            let from = options.from.as_ref().map(place).transpose()?;
            let to = options.to.as_ref().map(place).transpose()?;
            let first = from.map_or(0.0, |from| (from - 1e-6).ceil().max(0.0));
            let last = to.map_or(rows as f64, |to| (to + 1e-6).floor() + 1.0);
            (Some(first as usize), Some((last.max(0.0) as usize).min(rows)))
        }
        (None, None) => return Ok(()), // without a rate nothing goes on: the axis says so
    };
    match (first, last) {
        (Some(first), Some(last)) if first < last && last <= rows => table.cut(first, last),
        _ => {
            let remedy = "--from and --to must leave rows between them";
            return Err(Error::unsupported("nothing lies in the cut")
                .at(Place::file(&table.raw.source.path))
                .remedy(remedy));
        }
    }
    Ok(())
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn bounds_need_their_unit() {
        let parsed = |text: &str| Bound::parse(text).map(|b| (b.value, b.unit.label().to_owned())).ok();
        assert_eq!(parsed("2.5s"), Some((2.5, "s".to_owned())));
        assert_eq!(parsed("2e3 ms"), Some((2000.0, "ms".to_owned())));
        assert_eq!(parsed("-1e-3s"), Some((-1e-3, "s".to_owned())));
        assert_eq!(parsed("30mm"), Some((30.0, "mm".to_owned())));
        assert_eq!(parsed("5.m"), Some((5.0, "m".to_owned())));
        for wrong in ["", "s", "2.5", "2.5 g", "inf s", "2.5µ", "µ"] {
            assert_eq!(parsed(wrong), None, "{wrong}");
        }
    }
}
