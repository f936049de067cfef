//! From the ticks of a column to stamps: unit, epoch, civil time, midnight, the order of day and month.

use super::civil;
use super::ticks::{Form, Ticks, exact};
use crate::error::{Error, Finding, Result};
use crate::place::{Place, escape};
use crate::record::{RowLines, Stamps};
use crate::unit::Unit;

/// Seconds since 1970 that an epoch plausibly shows: the years 2000 to 2099.
const EPOCH: std::ops::Range<f64> = 946_684_800.0..4_102_444_800.0;
const DAY_S: i64 = 86_400;

/// Stamps from a column's ticks. `unit` is what header or user say.
///
/// # Errors
/// `Malformed` when dates contradict each other or stamps lie too far apart to count.
pub(super) fn stamps(
    mut column: Ticks,
    name: &str,
    unit: Option<Unit>,
    lines: &RowLines,
) -> Result<(Stamps, Vec<Finding>)> {
    let mut findings = Vec::new();
    let mut resolution = 10_f64.powi(-i32::from(column.decimals.coarsest()));
    let (form, zoned) = (column.form, column.zoned);
    let ambiguous = form == Form::Date && settle_order(&mut column, name, &mut findings)?;
    if column.short_year {
        let text = format!("years of two digits in column \"{}\" are read as 1969 to 2068", escape(name));
        findings.push(Finding::new("short_year", text));
    }
    let (mut ticks, tick, scale) = match column.floats.take() {
        Some(values) => {
            let (ticks, tick) = float_ticks(&values);
            resolution = resolution.max(tick);
            (ticks, tick, None)
        }
        None => (column.ticks, 10_f64.powi(-i32::from(column.scale)), Some(column.scale)),
    };
    let start = ticks.first().copied().unwrap_or(0);
    let first = scale.map_or(start as f64 * tick, |scale| exact(start, scale));
    let (unit, epoch) = match (form, unit) {
        (Form::Number, Some(unit)) => (unit, None),
        (Form::Number, None) => {
            let size = scale.map(|scale| 10_i64.pow(u32::from(scale)));
            let whole = size.is_some_and(|size| ticks.iter().all(|tick| tick % size == 0));
            number_unit(first, whole, name, &mut findings)
        }
        _ => (Unit::parse("s"), Some(0)),
    };
    let civil = match (scale, epoch, form) {
        (_, _, Form::Clock) => None,
        (Some(scale), Some(prefix), _) if !ambiguous => {
            civil_time(start, u32::from(scale) + prefix, zoned || form == Form::Number)
        }
        _ => None,
    };
    if unit.is_time() {
        let day = DAY_S as f64 / (unit.meaning().map_or(1.0, |meaning| meaning.scale) * tick);
        unwrap_midnight(&mut ticks, day, form, lines, &mut findings);
    }
    for value in &mut ticks {
        *value = value.checked_sub(start).ok_or_else(|| {
            Error::malformed(format!("the stamps of column \"{}\" lie too far apart to count", escape(name)))
        })?;
    }
    let first_line = lines.line(0).unwrap_or(1);
    Ok((Stamps { name: name.to_owned(), unit, tick, ticks, first, resolution, civil, first_line }, findings))
}

/// Unit of numbers without one, and the decimals of an epoch's unit: by digits where they look like time since 1970,
/// seconds otherwise.
fn number_unit(first: f64, whole: bool, name: &str, findings: &mut Vec<Finding>) -> (Unit, Option<u32>) {
    for (label, decimals) in [("s", 0), ("ms", 3), ("us", 6), ("ns", 9)] {
        if EPOCH.contains(&(first / 10_f64.powi(decimals))) {
            let digits = format!("{first:.0}").len();
            let text =
                format!("column \"{}\" is read as {label} since 1970: its stamps have {digits} digits", escape(name));
            findings.push(Finding::new("epoch_unit", text));
            return (Unit::parse(label), Some(decimals as u32));
        }
    }
    // Seconds are usual and mostly broken numbers; whole ones may as well be milliseconds.
    if whole {
        let text = format!(
            "column \"{}\" states no unit and holds whole numbers: read as seconds (--time-unit)",
            escape(name)
        );
        findings.push(Finding::new("time_unit_assumed", text));
    }
    (Unit::parse("s"), None)
}

/// Makes day and month of dates agree; true when their order stays open.
fn settle_order(column: &mut Ticks, name: &str, findings: &mut Vec<Finding>) -> Result<bool> {
    let name = escape(name);
    if column.day_first && column.month_first {
        let what = format!("some dates of column \"{name}\" have the day first, others the month");
        return Err(Error::malformed(what).remedy("export them as year-month-day"));
    }
    if !column.open || column.day_first {
        return Ok(false);
    }
    let day = DAY_S * 10_i64.pow(u32::from(column.scale.min(9)));
    let exchanged = |tick: i64| Some(civil::exchanged(tick.div_euclid(day))? * day + tick.rem_euclid(day));
    if column.month_first {
        // Dates after the 12th were certain; the others were read with the day first.
        column.ticks.iter_mut().for_each(|tick| *tick = exchanged(*tick).unwrap_or(*tick));
        return Ok(false);
    }
    let span = |ticks: &mut dyn Iterator<Item = i64>| {
        let (low, high) = ticks.fold((i64::MAX, i64::MIN), |(low, high), tick| (low.min(tick), high.max(tick)));
        high.saturating_sub(low)
    };
    let as_read = span(&mut column.ticks.iter().copied());
    let other = span(&mut column.ticks.iter().map(|&tick| exchanged(tick).unwrap_or(i64::MAX)));
    if other < as_read {
        column.ticks.iter_mut().for_each(|tick| *tick = exchanged(*tick).unwrap_or(*tick));
    }
    let order = if other < as_read { "month" } else { "day" };
    let text = format!(
        "the dates of column \"{name}\" are ambiguous: read with the {order} first, and only differences are used"
    );
    findings.push(Finding::new("date_order", text));
    Ok(true)
}

/// Civil time of `tick` x 10^-`decimals` s since 1970.
fn civil_time(tick: i64, decimals: u32, zoned: bool) -> Option<String> {
    let size = 10_i128.checked_pow(decimals)?;
    let seconds = i64::try_from(i128::from(tick).div_euclid(size)).ok()?;
    let fraction = if decimals == 0 {
        String::new()
    } else {
        format!("{:0width$}", i128::from(tick).rem_euclid(size), width = decimals as usize)
    };
    civil::print(seconds, &fraction, zoned)
}

/// Adds a day where a clock starts again at midnight: a clock time that falls by more than half a day, or a number that
/// falls from just under a day's length to just above zero.
fn unwrap_midnight(ticks: &mut [i64], day: f64, form: Form, lines: &RowLines, findings: &mut Vec<Finding>) {
    // A day must be a whole number of ticks that leaves room; a date never restarts.
    if form == Form::Date || !(1.0..1e17).contains(&day) {
        return;
    }
    let step = day.round() as i64;
    let restarts = |before: i64, now: i64| match form {
        Form::Clock => now < before.saturating_sub(step / 2),
        _ => before <= step && before > step - step / 1000 && (0..=step / 1000).contains(&now),
    };
    let (mut added, mut before, mut first_row, mut count) = (0_i64, None, 0, 0);
    for (row, tick) in ticks.iter_mut().enumerate() {
        if before.is_some_and(|before| restarts(before, *tick)) {
            added = added.saturating_add(step);
            first_row = if count == 0 { row } else { first_row };
            count += 1;
        }
        before = Some(*tick);
        *tick = tick.saturating_add(added);
    }
    if count > 0 {
        let text = format!("the clock starts again at midnight ({count} times): 86,400 s are added each time");
        let place = Place { line: lines.line(first_row as u64), ..Place::default() };
        findings.push(Finding::new("midnight", text).at(place));
    }
}

/// Floats as multiples of the last binary digit of the largest: exact there, rounded below by at most half of it.
fn float_ticks(values: &[f64]) -> (Vec<i64>, f64) {
    let largest = values.iter().fold(0.0_f64, |largest, value| largest.max(value.abs()));
    if !(largest.is_finite() && largest > 0.0) {
        return (values.iter().map(|_| 0).collect(), 1.0);
    }
    let power = (largest.log2().floor() as i32 - 52).clamp(-1022, 960);
    let tick = 2_f64.powi(power);
    (values.iter().map(|value| (value / tick).round() as i64).collect(), tick)
}

#[cfg(test)]
mod tests {
    use super::*;

    fn read(form: Form, texts: &[&str], unit: Option<&str>) -> (Stamps, Vec<&'static str>) {
        let mut column = Ticks::new(form, b'.');
        for text in texts {
            let read = if form == Form::Number {
                column.push_number(text.as_bytes()).is_some()
            } else {
                column.push_civil(text.as_bytes()).is_some()
            };
            assert!(read, "{text}");
        }
        let lines = RowLines::consecutive(2, texts.len() as u64);
        let (stamps, findings) = stamps(column, "t", unit.map(Unit::parse), &lines).expect("sound stamps");
        (stamps, findings.into_iter().map(|finding| finding.code).collect())
    }

    #[test]
    fn an_epoch_is_known_by_its_digits() {
        for (text, unit, civil) in [
            ("1772359200", "s", "2026-03-01T10:00:00Z"),
            ("1772359200.25", "s", "2026-03-01T10:00:00.25Z"),
            ("1772359200123", "ms", "2026-03-01T10:00:00.123Z"),
            ("1772359200123456", "us", "2026-03-01T10:00:00.123456Z"),
            ("1772359200123456789", "ns", "2026-03-01T10:00:00.123456789Z"),
        ] {
            let (stamps, findings) = read(Form::Number, &[text], None);
            assert_eq!((stamps.unit.label(), stamps.civil.as_deref()), (unit, Some(civil)), "{text}");
            assert_eq!(findings, ["epoch_unit"]);
        }
    }

    #[test]
    fn midnight_is_unwrapped() {
        let (stamps, findings) = read(Form::Clock, &["23:59:59.5", "00:00:00.0", "00:00:00.5"], None);
        assert_eq!((stamps.ticks, stamps.tick, findings), (vec![0, 5, 10], 0.1, vec!["midnight"]));
        let (stamps, findings) = read(Form::Number, &["86399500", "0", "500"], Some("ms"));
        assert_eq!((stamps.ticks, findings), (vec![0, 500, 1000], vec!["midnight"]));
        let (stamps, findings) = read(Form::Number, &["50.0", "0.5"], Some("s"));
        assert_eq!((stamps.ticks, findings), (vec![0, -495], vec![]));
    }

    #[test]
    fn ambiguous_dates_give_differences_only() {
        let (stamps, findings) = read(Form::Date, &["01/03/2026 10:00:00", "01/03/2026 10:00:01"], None);
        assert_eq!((stamps.ticks, stamps.civil, findings), (vec![0, 1], None, vec!["date_order"]));
        let (stamps, _) = read(Form::Date, &["01/03/2026 23:59:59", "01/04/2026 00:00:00"], None);
        assert_eq!(stamps.ticks, [0, 1]);
        let (stamps, _) = read(Form::Date, &["02/03/2026 23:59:59", "03/03/2026 00:00:00"], None);
        assert_eq!(stamps.ticks, [0, 1]);
        let (stamps, findings) = read(Form::Date, &["03/12/2026 23:59:59", "03/13/2026 00:00:00"], None);
        assert_eq!((stamps.ticks, findings), (vec![0, 1], vec![]));
    }

    #[test]
    fn floats_keep_their_last_digit() {
        let texts = ["0.10000000000000000555", "1000.1000000000000227"];
        let (stamps, _) = read(Form::Number, &texts, Some("s"));
        assert_eq!(stamps.ticks[1] as f64 * stamps.tick, 1000.0, "{stamps:?}");
    }
}
