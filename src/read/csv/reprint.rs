//! Stamps of rows that were never there, printed as the file prints its own.

use std::io::Read;

use super::civil::{self, Order};
use super::field::fields;
use super::number;
use crate::error::Result;
use crate::read::reopen;
use crate::record::{ColumnRole, Source, TableLayout};

/// Bytes of the data block in which the first row ends.
const FIRST_ROW: u64 = 64 << 10;
const DAY_S: i128 = 86_400;

/// The first stamp of a table as printed: what others are printed like.
#[derive(Debug, Clone)]
pub struct StampText {
    text: String,
    decimal: u8,
    /// True when the date, which comes first in `text`, stands in a column of its own.
    joined: bool,
}

impl StampText {
    /// That of the table's first row; `None` for a table without stamps.
    ///
    /// # Errors
    /// `Io` when the file cannot be read again.
    pub fn of(source: &Source, layout: &TableLayout) -> Result<Option<StampText>> {
        let column = |wanted: ColumnRole| layout.columns.iter().position(|role| *role == wanted);
        let Some(stamps) = column(ColumnRole::Stamps) else { return Ok(None) };
        let mut text = reopen(source, layout)?;
        std::io::copy(&mut text.by_ref().take(layout.data_start), &mut std::io::sink())?;
        let mut row = Vec::new();
        text.take(FIRST_ROW).read_to_end(&mut row)?;
        let newline = if layout.newline == "\r" { b'\r' } else { b'\n' };
        let rows = row.split(|&byte| byte == newline);
        let first = rows.map(<[u8]>::trim_ascii).find(|row| !row.is_empty()).unwrap_or_default();
        let cells = fields(first, layout.delimiter);
        let cell = |column: usize| cells.get(column).map(|cell| cell.string());
        let (stamp, date) = (cell(stamps), column(ColumnRole::Dates).and_then(cell));
        Ok(stamp.map(|stamp| StampText {
            decimal: layout.decimal,
            joined: date.is_some(),
            text: date.map_or(stamp.clone(), |date| format!("{date} {stamp}")),
        }))
    }

    /// What the columns of dates and of stamps hold, `offset` after the first stamp; both the same where there is only one. As
    /// `after`.
    pub fn halves_after(&self, offset: f64, unit_seconds: f64, tick: f64) -> Option<(String, String)> {
        let text = self.after(offset, unit_seconds, tick)?;
        match text.split_once(' ').filter(|_| self.joined) {
            Some((date, clock)) => Some((date.to_owned(), clock.to_owned())),
            None => Some((text.clone(), text)),
        }
    }

    /// The stamp `offset` after the first, `unit_seconds` being the size of its unit and `tick` the last decimal of the column
    /// in that unit. `None` where the file leaves open how it would look.
    pub fn after(&self, offset: f64, unit_seconds: f64, tick: f64) -> Option<String> {
        let decimals = (-tick.log10()).round().clamp(0.0, 18.0) as u8;
        match number::scan(self.text.as_bytes(), self.decimal) {
            Some(printed) if printed.len == self.text.len() => self.number_after(offset, decimals),
            _ => self.civil_after(offset * unit_seconds, decimals),
        }
    }

    fn number_after(&self, offset: f64, decimals: u8) -> Option<String> {
        let plain = self.text.replace(char::from(self.decimal), ".");
        let (whole, fraction) = plain.split_once('.').unwrap_or((&plain, ""));
        let digits = |text: &str| text.bytes().all(|byte| byte.is_ascii_digit());
        if !digits(whole.trim_start_matches(['-', '+'])) || !digits(fraction) {
            return None; // with an exponent
        }
        let decimals = usize::from(decimals).max(fraction.len());
        let first: i128 = format!("{whole}{fraction:0<decimals$}").trim_start_matches('+').parse().ok()?;
        let ticks = first + (offset * 10_f64.powi(decimals as i32)).round() as i128;
        let sign = if ticks < 0 { "-" } else { "" };
        let all = format!("{:0>width$}", ticks.unsigned_abs(), width = decimals + 1);
        let (whole, fraction) = all.split_at(all.len() - decimals);
        let mark = if decimals == 0 { String::new() } else { char::from(self.decimal).to_string() };
        Some(format!("{sign}{whole}{mark}{fraction}"))
    }

    fn civil_after(&self, offset_s: f64, decimals: u8) -> Option<String> {
        let civil = civil::parse(self.text.as_bytes())?;
        let groups = groups(&self.text);
        let dated = if civil.days.is_some() { 3 } else { 0 };
        let value = |index: usize| groups.get(index).and_then(|group| self.text[group.clone()].parse::<i128>().ok());
        let afternoon = self.text.to_ascii_uppercase().contains("PM");
        let halves = afternoon || self.text.to_ascii_uppercase().contains("AM");
        let hour = value(dated).unwrap_or(0);
        let hour = if halves { hour % 12 + if afternoon { 12 } else { 0 } } else { hour };
        let whole = hour * 3600 + value(dated + 1).unwrap_or(0) * 60 + value(dated + 2).unwrap_or(0);
        // A fraction follows the seconds at once; further digits belong to the zone.
        let has_fraction = groups.len() > dated + 3
            && matches!(self.text.as_bytes()[groups[dated + 3].start - 1], b'.' | b',' | b':')
            && groups[dated + 3].start == groups[dated + 2].end + 1;
        let width = if has_fraction { groups[dated + 3].len() } else { usize::from(decimals.min(9)) };
        let size = 10_i128.checked_pow(width as u32)?;
        let printed = if has_fraction { value(dated + 3)? } else { 0 };
        let days = i128::from(civil.days.unwrap_or(0));
        let ticks = ((days * DAY_S + whole) * size + printed) + (offset_s * size as f64).round() as i128;
        let (seconds, fraction) = (ticks.div_euclid(size), ticks.rem_euclid(size));
        let (day, clock) = (seconds.div_euclid(DAY_S), seconds.rem_euclid(DAY_S));
        let mut new: Vec<i128> = Vec::new();
        if dated > 0 {
            if day != days && civil.order == Order::Open {
                return None;
            }
            let (year, month, date) = civil::parts(i64::try_from(day).ok()?)?;
            let (year, month, date) = (i128::from(year), i128::from(month), i128::from(date));
            new.extend(match (groups[0].len(), civil.order) {
                (4, _) => [year, month, date],
                (_, Order::MonthFirst) => [month, date, year],
                _ => [date, month, year],
            });
        }
        let hour = clock / 3600;
        new.push(if halves { (hour + 11) % 12 + 1 } else { hour });
        new.extend([clock / 60 % 60, clock % 60]);
        let mut out = String::new();
        let mut copied = 0;
        for (index, (group, number)) in groups.iter().zip(new).enumerate() {
            out.push_str(&self.text[copied..group.start]);
            let number = if group.len() == 2 { number % 100 } else { number };
            out.push_str(&format!("{number:0>width$}", width = group.len()));
            copied = group.end;
            let seconds = index == dated + 2;
            if seconds && has_fraction {
                let mark = &self.text[group.end..groups[index + 1].start];
                out.push_str(&format!("{mark}{fraction:0>width$}"));
                copied = groups[index + 1].end;
            } else if seconds && fraction > 0 {
                out.push_str(&format!(".{fraction:0>width$}"));
            }
        }
        let mut rest = self.text[copied..].to_owned();
        if halves && (hour >= 12) != afternoon {
            let (old, new) = if afternoon { (["PM", "pm"], ["AM", "am"]) } else { (["AM", "am"], ["PM", "pm"]) };
            for (old, new) in old.into_iter().zip(new) {
                rest = rest.replace(old, new);
            }
        }
        Some(out + &rest)
    }
}

/// Runs of digits.
fn groups(text: &str) -> Vec<std::ops::Range<usize>> {
    let mut found: Vec<std::ops::Range<usize>> = Vec::new();
    for (at, byte) in text.bytes().enumerate().filter(|(_, byte)| byte.is_ascii_digit()) {
        let _ = byte;
        match found.last_mut() {
            Some(last) if last.end == at => last.end = at + 1,
            _ => found.push(at..at + 1),
        }
    }
    found
}

#[cfg(test)]
mod tests {
    use super::*;

    fn after(text: &str, decimal: u8, offset: f64, unit_seconds: f64, tick: f64) -> Option<String> {
        StampText { text: text.to_owned(), decimal, joined: false }.after(offset, unit_seconds, tick)
    }

    #[test]
    fn stamps_look_like_the_first() {
        for (text, offset, tick, wanted) in [
            ("0.000", 0.035, 1e-3, "0.035"),
            ("0", 0.5, 1e-1, "0.5"),
            ("-0.250", 0.2, 1e-3, "-0.050"),
            ("1772359200123456789", 1000.0, 1.0, "1772359200123457789"),
            ("10:00:00", 3.0, 1.0, "10:00:03"),
            ("23:59:59.750", 0.5, 1e-3, "00:00:00.250"),
            ("2026-02-28T23:59:59.5Z", 1.0, 1e-1, "2026-03-01T00:00:00.5Z"),
            ("2026-03-01 10:00:00+05:30", 61.0, 1.0, "2026-03-01 10:01:01+05:30"),
            ("31.12.2026 23:59:59,25", 1.0, 1e-2, "01.01.2027 00:00:00,25"),
            ("9/9/2001 11:59:59 AM", 1.0, 1.0, "9/9/2001 12:00:00 PM"),
            ("03/31/2026 10:00:00:250", 0.5, 1e-3, "03/31/2026 10:00:00:750"),
            ("10:00:00", 0.25, 1e-2, "10:00:00.25"),
        ] {
            assert_eq!(after(text, b'.', offset, 1.0, tick).as_deref(), Some(wanted), "{text}");
        }
        assert_eq!(after("0,000", b',', 12.5, 1e-3, 1e-3).as_deref(), Some("12,500"));
        assert_eq!(after("1.5e-3", b'.', 1.0, 1.0, 1e-4), None);
        // Whether the third of January or the first of March follows by a day is open.
        assert_eq!(after("01/03/2026 23:59:59", b'.', 2.0, 1.0, 1.0), None);
    }
}
