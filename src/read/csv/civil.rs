//! Dates and clock times as loggers print them, to integer fractions of a second.

use jiff::Span;
use jiff::civil::Date;

/// A date, a clock time, or both, as printed.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) struct Civil {
    /// Days since 1970-01-01 with the day before the month where their order is open; `None` for a clock time alone.
    pub(super) days: Option<i64>,
    /// What the text tells about the order of day and month.
    pub(super) order: Order,
    /// Whole seconds since midnight, with the offset from UTC subtracted.
    pub(super) seconds: i64,
    /// Digits after the decimal mark, as an integer of `decimals` digits.
    pub(super) fraction: i64,
    /// Number of those digits, at most 9; further ones are dropped.
    pub(super) decimals: u8,
    /// True when an offset from UTC (or `Z`) is printed.
    pub(super) zoned: bool,
    /// True when the year has two digits.
    pub(super) short_year: bool,
}

/// Order of day and month in a date.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) enum Order {
    /// Year first, or dots: no question.
    Sure,
    /// `01/03/2026` could be either.
    Open,
    /// `31/03/2026`: the day comes first.
    DayFirst,
    /// `03/31/2026`: the month comes first.
    MonthFirst,
}

/// The whole of `text` as a date (`2026-03-01`, `2026/03/01`, `01.03.2026`, `01/03/2026`), a clock time (`10:00:00.25`), or
/// both with `T` or blanks between them; AM/PM and an offset may follow (ISO 8601, RFC 3339 and what loggers make of them).
pub(super) fn parse(text: &[u8]) -> Option<Civil> {
    if !text.first()?.is_ascii_digit() || text.len() > 48 {
        return None;
    }
    let mut civil =
        Civil { days: None, order: Order::Sure, seconds: 0, fraction: 0, decimals: 0, zoned: false, short_year: false };
    let mut rest = text;
    if let Some((days, order, short_year, after)) = date(text) {
        civil.days = Some(days);
        civil.order = order;
        civil.short_year = short_year;
        rest = match after.first() {
            None => return Some(civil),
            Some(b'T' | b't') => &after[1..],
            Some(b' ') => after.trim_ascii_start(),
            _ => return None,
        };
    }
    let after = clock(rest, &mut civil)?;
    zone(after, &mut civil)?;
    Some(civil)
}

/// The civil date with day and month exchanged, in days since 1970-01-01; `None` where that is no date.
pub(super) fn exchanged(days: i64) -> Option<i64> {
    let date = date_of(days)?;
    days_of(date.year(), date.day(), date.month())
}

/// Year, month and day.
pub(super) fn parts(days: i64) -> Option<(i16, i8, i8)> {
    let date = date_of(days)?;
    Some((date.year(), date.month(), date.day()))
}

/// `2026-03-01T10:00:00.25` for `seconds` since 1970 and a printed fraction.
pub(super) fn print(seconds: i64, fraction: &str, zoned: bool) -> Option<String> {
    let date = date_of(seconds.div_euclid(86_400))?;
    let clock = seconds.rem_euclid(86_400);
    let (hour, minute, second) = (clock / 3600, clock / 60 % 60, clock % 60);
    let mark = if fraction.is_empty() { "" } else { "." };
    let zone = if zoned { "Z" } else { "" };
    Some(format!("{date}T{hour:02}:{minute:02}:{second:02}{mark}{fraction}{zone}"))
}

fn days_of(year: i16, month: i8, day: i8) -> Option<i64> {
    let date = Date::new(year, month, day).ok()?;
    // Days from the proleptic Gregorian calendar: 719,162 days lie between 0001-01-01 and 1970-01-01.
    let before = i64::from(date.year()) - 1;
    Some(
        before * 365 + before.div_euclid(4) - before.div_euclid(100)
            + before.div_euclid(400)
            + i64::from(date.day_of_year())
            - 1
            - 719_162,
    )
}

fn date_of(days: i64) -> Option<Date> {
    Date::constant(1970, 1, 1).checked_add(Span::new().try_days(days).ok()?).ok()
}

/// Digits at the start of `text`, at most `most` of them: value, count.
fn digits(text: &[u8], most: usize) -> (i64, usize) {
    let count = text.iter().take(most).take_while(|byte| byte.is_ascii_digit()).count();
    (text[..count].iter().fold(0, |value, byte| value * 10 + i64::from(byte - b'0')), count)
}

/// Days since 1970, the order of day and month, whether the year has two digits, and what follows.
fn date(text: &[u8]) -> Option<(i64, Order, bool, &[u8])> {
    let (a, a_len) = digits(text, 4);
    let mark = *text.get(a_len)?;
    if !matches!(mark, b'-' | b'/' | b'.') {
        return None;
    }
    let tail = &text[a_len + 1..];
    let (b, b_len) = digits(tail, 2);
    if b_len == 0 || tail.get(b_len) != Some(&mark) {
        return None;
    }
    let tail = &tail[b_len + 1..];
    let (c, c_len) = digits(tail, 4);
    let after = &tail[c_len..];
    if after.first().is_some_and(u8::is_ascii_digit) {
        return None;
    }
    // Two digits each, or a clock time behind them: `1.2.34` alone may be anything.
    let short_year = c_len == 2 && a_len <= 2 && (a_len == 2 && b_len == 2 || !after.is_empty());
    // POSIX, strptime %y: 69 to 99 are of the last century.
    let year = if short_year { c + if c < 69 { 2000 } else { 1900 } } else { c };
    match (a_len, c_len) {
        (4, 1..=2) => return Some((days_of(a as i16, b as i8, c as i8)?, Order::Sure, false, after)),
        (1..=2, 4) => {}
        (1..=2, 2) if short_year => {}
        _ => return None,
    }
    let (day_first, order) = match (a, b) {
        _ if mark == b'.' => (true, Order::Sure),
        (13.., _) => (true, Order::DayFirst),
        (_, 13..) => (false, Order::MonthFirst),
        _ => (true, Order::Open),
    };
    let (day, month) = if day_first { (a, b) } else { (b, a) };
    Some((days_of(year as i16, month as i8, day as i8)?, order, short_year, after))
}

/// `10:00`, `10:00:00`, `10:00:00.25`, with AM or PM.
fn clock<'a>(text: &'a [u8], civil: &mut Civil) -> Option<&'a [u8]> {
    let (mut hour, len) = digits(text, 2);
    if len == 0 || text.get(len) != Some(&b':') {
        return None;
    }
    let text = &text[len + 1..];
    let (minute, len) = digits(text, 2);
    if len != 2 {
        return None;
    }
    let mut text = &text[len..];
    let mut second = 0;
    if text.first() == Some(&b':') {
        let (value, len) = digits(&text[1..], 2);
        if len != 2 {
            return None;
        }
        second = value;
        text = &text[1 + len..];
        let thousandths = text.first() == Some(&b':') && text.len() == 4; // `10:00:00:250`
        if thousandths || matches!(text.first(), Some(b'.' | b',')) {
            let (fraction, kept) = digits(&text[1..], 9);
            let all = text[1..].iter().take_while(|byte| byte.is_ascii_digit()).count();
            if all == 0 || thousandths && all != 3 {
                return None;
            }
            civil.fraction = fraction;
            civil.decimals = kept as u8;
            text = &text[1 + all..];
        }
    } else if civil.days.is_none() {
        return None; // `10:00` alone could be minutes and seconds
    }
    let half = text.trim_ascii_start();
    if let [b'A' | b'a' | b'P' | b'p', b'M' | b'm', rest @ ..] = half {
        if !(1..=12).contains(&hour) {
            return None;
        }
        hour = hour % 12 + if matches!(half[0], b'P' | b'p') { 12 } else { 0 };
        text = rest;
    }
    if hour > 24 || minute > 59 || second > 60 {
        return None;
    }
    civil.seconds = hour * 3600 + minute * 60 + second;
    Some(text)
}

/// Nothing, `Z`, `+01:00`, `+0100` or `+01`.
fn zone(text: &[u8], civil: &mut Civil) -> Option<()> {
    let text = text.trim_ascii_start();
    match text {
        [] => return Some(()),
        [b'Z' | b'z'] => {}
        b"UTC" | b"GMT" => {}
        [sign @ (b'+' | b'-'), tail @ ..] => {
            let (hours, len) = digits(tail, 2);
            let tail = tail[len..].strip_prefix(b":").unwrap_or(&tail[len..]);
            let (minutes, minute_len) = digits(tail, 2);
            if len != 2 || !matches!(minute_len, 0 | 2) || tail.len() != minute_len || hours > 23 || minutes > 59 {
                return None;
            }
            let offset = hours * 3600 + minutes * 60;
            civil.seconds -= if *sign == b'-' { -offset } else { offset };
        }
        _ => return None,
    }
    civil.zoned = true;
    Some(())
}

#[cfg(test)]
mod tests {
    use super::*;

    fn seconds(text: &str) -> Option<(i64, i64, u8)> {
        parse(text.as_bytes()).map(|c| (c.days.unwrap_or(0) * 86_400 + c.seconds, c.fraction, c.decimals))
    }

    #[test]
    fn dates_are_seconds_since_1970() {
        // 1,000,000,000 s is 2001-09-09T01:46:40Z (common knowledge of POSIX time); RFC 3339 section 5.8 for the others.
        assert_eq!(seconds("2001-09-09T01:46:40Z"), Some((1_000_000_000, 0, 0)));
        assert_eq!(seconds("2001-09-09 03:46:40.250+02:00"), Some((1_000_000_000, 250, 3)));
        assert_eq!(seconds("09.09.2001 01:46:40,5"), Some((1_000_000_000, 5, 1)));
        assert_eq!(seconds("9/9/2001 1:46:40 AM"), Some((1_000_000_000, 0, 0)));
        assert_eq!(seconds("2001/9/9 13:46:40"), Some((1_000_043_200, 0, 0)));
        for text in ["09.09.01 01:46:40", "9.9.01 01:46:40", "9/9/01 1:46:40 AM", "09-09-01 01:46:40"] {
            assert_eq!(seconds(text), Some((1_000_000_000, 0, 0)), "{text}");
        }
        assert_eq!(seconds("01.01.70"), Some((0, 0, 0)));
        assert_eq!(seconds("1985-04-12T23:20:50.52Z"), Some((482_196_050, 52, 2)));
        assert_eq!(seconds("1996-12-19T16:39:57-08:00"), seconds("1996-12-20T00:39:57Z"));
        assert_eq!(seconds("10:00:00.123456789123"), Some((36_000, 123_456_789, 9)));
        for text in [
            "10",
            "10:00",
            "2026-13-01",
            "2026-02-30",
            "31/31/2026",
            "25:00:00",
            "1.2.3",
            "1.2.34",
            "12.34.56",
            "10:00:00x",
            "2026-03-01T",
        ] {
            assert_eq!(seconds(text), None, "{text}");
        }
    }

    #[test]
    fn the_order_of_day_and_month_is_told_or_open() {
        for (text, order) in [
            ("01/03/2026", Order::Open),
            ("31/03/2026", Order::DayFirst),
            ("03/31/2026", Order::MonthFirst),
            ("01.03.2026", Order::Sure),
            ("2026/01/03", Order::Sure),
        ] {
            assert_eq!(parse(text.as_bytes()).map(|c| c.order), Some(order), "{text}");
        }
        let day = |text: &str| parse(text.as_bytes()).and_then(|c| c.days);
        assert_eq!(day("01/03/2026").and_then(exchanged), day("2026-01-03"));
        assert_eq!(print(1_000_000_000, "25", true).as_deref(), Some("2001-09-09T01:46:40.25Z"));
    }
}
