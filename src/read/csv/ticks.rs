//! A column of stamps while it is read: integer ticks of a power of ten, or floats where the text has too many digits.

use super::civil::{self, Civil, Order};
use super::decimals::Decimals;
use super::number::{self, Printed};

/// What the stamps of a column are.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) enum Form {
    /// Numbers.
    Number,
    /// Dates, perhaps with a clock time.
    Date,
    /// Clock times alone.
    Clock,
}

/// Stamps of consecutive rows.
///
/// Parts read from consecutive blocks and joined by `append` equal the column read at once, whatever the blocks.
#[derive(Debug, Clone)]
pub(super) struct Ticks {
    pub(super) form: Form,
    decimal: u8,
    /// Stamps x 10^`scale`, until a stamp does not fit.
    pub(super) ticks: Vec<i64>,
    /// Decimals that `ticks` count in, at most 18.
    pub(super) scale: u8,
    /// All stamps as floats once one did not fit; `ticks` is then empty.
    pub(super) floats: Option<Vec<f64>>,
    /// How finely the stamps are printed.
    pub(super) decimals: Decimals,
    /// Dates whose order of day and month is open; read with the day first.
    pub(super) open: bool,
    /// A date that can only have the day first.
    pub(super) day_first: bool,
    /// A date that can only have the month first.
    pub(super) month_first: bool,
    /// True when the first stamp tells its offset from UTC.
    pub(super) zoned: bool,
    /// True when some year has two digits.
    pub(super) short_year: bool,
    /// The date or the clock time of a row whose other half is still to come.
    half: Option<Civil>,
}

impl Ticks {
    pub(super) fn new(form: Form, decimal: u8) -> Ticks {
        Ticks {
            form,
            decimal,
            ticks: Vec::new(),
            scale: 0,
            floats: None,
            decimals: Decimals::new(),
            open: false,
            day_first: false,
            month_first: false,
            zoned: false,
            short_year: false,
            half: None,
        }
    }

    /// Number of stamps.
    pub(super) fn len(&self) -> usize {
        self.floats.as_ref().map_or(self.ticks.len(), Vec::len)
    }

    /// Adds the stamp at the start of `text` and gives its length, for numbers only; the caller looks at what follows.
    pub(super) fn push_number(&mut self, text: &[u8]) -> Option<usize> {
        let printed = number::scan(text, self.decimal)?;
        self.push_printed(&printed, text);
        Some(printed.len)
    }

    /// Adds the number that was scanned at the start of `text`.
    #[inline]
    pub(super) fn push_printed(&mut self, printed: &Printed, text: &[u8]) {
        let decimals = printed.decimals as i64 - i64::from(printed.exponent);
        if printed.digits <= 18 && decimals == i64::from(self.scale) && self.floats.is_none() {
            self.decimals.note(printed.mantissa, decimals as i16);
            let mantissa = printed.mantissa as i64; // 18 digits fit
            self.ticks.push(if printed.negative { -mantissa } else { mantissa });
        } else {
            self.push_odd(printed, text, decimals);
        }
    }

    /// Adds the date or clock time that `text` is.
    pub(super) fn push_civil(&mut self, text: &[u8]) -> Option<()> {
        let civil = civil::parse(text).filter(|civil| civil.days.is_some() == (self.form == Form::Date))?;
        self.push_parsed(&civil);
        Some(())
    }

    /// Takes the date or the clock time of a row, in any order, and adds the stamp once both are there.
    pub(super) fn push_half(&mut self, text: &[u8]) -> Option<()> {
        let civil = civil::parse(text)?;
        let Some(other) = self.half.take() else {
            self.half = Some(civil);
            return Some(());
        };
        let (date, clock) = if civil.days.is_some() { (civil, other) } else { (other, civil) };
        if date.days.is_none() || clock.days.is_some() {
            return None;
        }
        self.push_parsed(&Civil { days: date.days, order: date.order, short_year: date.short_year, ..clock });
        Some(())
    }

    fn push_parsed(&mut self, civil: &Civil) {
        if self.len() == 0 {
            self.zoned = civil.zoned;
        }
        match civil.order {
            Order::Sure => {}
            Order::Open => self.open = true,
            Order::DayFirst => self.day_first = true,
            Order::MonthFirst => self.month_first = true,
        }
        self.short_year |= civil.short_year;
        let seconds = civil.days.unwrap_or(0) * 86_400 + civil.seconds;
        self.decimals.note(1, i16::from(civil.decimals));
        let size = 10_i128.pow(u32::from(civil.decimals));
        self.push_exact(i128::from(seconds) * size + i128::from(civil.fraction), civil.decimals);
    }

    /// Removes the last stamp of a row that turned out faulty.
    pub(super) fn truncate(&mut self, rows: usize) {
        self.half = None;
        self.ticks.truncate(rows);
        if let Some(floats) = &mut self.floats {
            floats.truncate(rows);
        }
    }

    /// Joins the stamps of the next rows.
    pub(super) fn append(&mut self, other: &Ticks) {
        if self.len() == 0 {
            self.zoned = other.zoned;
        }
        self.decimals.append(&other.decimals);
        self.open |= other.open;
        self.day_first |= other.day_first;
        self.month_first |= other.month_first;
        self.short_year |= other.short_year;
        if let Some(values) = &other.floats {
            self.turn_to_floats();
            self.floats.get_or_insert_default().extend_from_slice(values);
            return;
        }
        if self.floats.is_none() && self.rescale(other.scale) {
            let factor = 10_i64.pow(u32::from(self.scale - other.scale));
            let before = self.ticks.len();
            self.ticks.extend(other.ticks.iter().map_while(|&tick| tick.checked_mul(factor)));
            if self.ticks.len() - before == other.ticks.len() {
                return;
            }
            self.ticks.truncate(before);
        }
        self.turn_to_floats();
        self.floats.get_or_insert_default().extend(other.ticks.iter().map(|&tick| exact(tick, other.scale)));
    }

    /// A stamp of other decimals than the ones before, or of many digits.
    #[cold]
    fn push_odd(&mut self, printed: &Printed, text: &[u8], decimals: i64) {
        let shown = decimals.clamp(-300, 300) as i16;
        if printed.digits <= 19 {
            self.decimals.note(printed.mantissa, shown);
        } else {
            let magnitude = number::value(printed, text, self.decimal).abs().log10().floor();
            self.decimals.note_power(magnitude.clamp(-400.0, 400.0) as i32, shown);
        }
        match reduced(&text[..printed.len], self.decimal, i64::from(printed.exponent)) {
            Some((mantissa, scale)) => self.push_exact(i128::from(mantissa), scale),
            None => {
                self.turn_to_floats();
                self.floats.get_or_insert_default().push(number::value(printed, text, self.decimal));
            }
        }
    }

    fn push_exact(&mut self, mantissa: i128, scale: u8) {
        if self.floats.is_none() && self.rescale(scale) {
            let factor = 10_i128.pow(u32::from(self.scale - scale));
            if let Ok(tick) = i64::try_from(mantissa * factor) {
                self.ticks.push(tick);
                return;
            }
        }
        self.turn_to_floats();
        let value =
            i64::try_from(mantissa).map_or(mantissa as f64 / 10_f64.powi(i32::from(scale)), |m| exact(m, scale));
        self.floats.get_or_insert_default().push(value);
    }

    /// Makes `ticks` count in at least `scale` decimals; false when they do not fit.
    fn rescale(&mut self, scale: u8) -> bool {
        if scale <= self.scale {
            return true;
        }
        let factor = 10_i64.pow(u32::from(scale - self.scale));
        if self.ticks.iter().any(|tick| tick.checked_mul(factor).is_none()) {
            return false;
        }
        self.ticks.iter_mut().for_each(|tick| *tick *= factor);
        self.scale = scale;
        true
    }

    fn turn_to_floats(&mut self) {
        if self.floats.is_none() {
            let scale = self.scale;
            self.floats = Some(std::mem::take(&mut self.ticks).into_iter().map(|tick| exact(tick, scale)).collect());
        }
    }
}

/// Mantissa and decimals (0 to 18) of a scanned number without needless zeros, where they fit.
fn reduced(text: &[u8], decimal: u8, exponent: i64) -> Option<(i64, u8)> {
    let negative = text.first() == Some(&b'-');
    let digits_and_mark = text.iter().take_while(|byte| !matches!(byte, b'e' | b'E' | b'd' | b'D'));
    let mut digits: Vec<u8> = Vec::new();
    let mut decimals = -exponent;
    let mut after = false;
    for &byte in digits_and_mark {
        if byte == decimal {
            after = true;
        } else if byte.is_ascii_digit() {
            decimals += i64::from(after);
            if byte != b'0' || !digits.is_empty() {
                digits.push(byte);
            }
        }
    }
    if digits.is_empty() {
        return Some((0, 0));
    }
    while (decimals > 0 && digits.last() == Some(&b'0')) && (digits.len() > 18 || decimals > 18) {
        digits.pop();
        decimals -= 1;
    }
    if !(-18..=18).contains(&decimals) {
        return None;
    }
    let mut mantissa: i64 = 0;
    let zeros = (-decimals).max(0) as usize;
    for digit in digits.iter().copied().chain(std::iter::repeat_n(b'0', zeros)) {
        mantissa = mantissa.checked_mul(10)?.checked_add(i64::from(digit - b'0'))?;
    }
    Some((if negative { -mantissa } else { mantissa }, decimals.max(0) as u8))
}

/// `tick` x 10^-`scale`, correctly rounded.
pub(super) fn exact(tick: i64, scale: u8) -> f64 {
    if tick.unsigned_abs() <= 1 << 53 {
        return tick as f64 / 10_f64.powi(i32::from(scale)); // both exact up to 10^22
    }
    let text = format!("{tick}e-{scale}");
    number::whole(text.as_bytes(), b'.').unwrap_or(f64::NAN)
}

#[cfg(test)]
mod tests {
    use proptest::prelude::*;

    use super::*;

    fn column(stamps: &[&str]) -> Ticks {
        let mut ticks = Ticks::new(Form::Number, b'.');
        for stamp in stamps {
            assert_eq!(ticks.push_number(stamp.as_bytes()), Some(stamp.len()));
        }
        ticks
    }

    #[test]
    fn nanoseconds_since_1970_lose_nothing() {
        let ticks = column(&["1772359200123456789", "1772359200123456790"]);
        assert_eq!((ticks.ticks, ticks.scale), (vec![1_772_359_200_123_456_789, 1_772_359_200_123_456_790], 0));
    }

    #[test]
    fn decimals_may_vary() {
        let ticks = column(&["0", "0.5", "1.25", "-3", "1e-3", "2e2"]);
        assert_eq!((ticks.ticks, ticks.scale), (vec![0, 500, 1250, -3000, 1, 200_000], 3));
    }

    #[test]
    fn too_many_digits_become_floats() {
        let ticks = column(&["0.1", "0.30000000000000004441", "17.5"]);
        assert_eq!(ticks.floats, Some(vec![0.1, 0.30000000000000004, 17.5]));
        let zeros = column(&["1.000000000000000000000e+00"]);
        assert_eq!(zeros.ticks, [10_i64.pow(u32::from(zeros.scale))]);
    }

    proptest! {
        #[test]
        fn parts_joined_equal_the_whole(
            stamps in proptest::collection::vec("-?[0-9]{1,12}(\\.[0-9]{1,9})?(e-?[0-9])?", 1..12),
            cut in 0_usize..12,
        ) {
            let stamps: Vec<&str> = stamps.iter().map(String::as_str).collect();
            let cut = cut.min(stamps.len());
            let whole = column(&stamps);
            let mut head = column(&stamps[..cut]);
            head.append(&column(&stamps[cut..]));
            prop_assert_eq!(&head.floats, &whole.floats);
            prop_assert_eq!(head.ticks, whole.ticks);
            // Floats have no scale.
            prop_assert!(whole.floats.is_some() || head.scale == whole.scale);
            prop_assert_eq!(head.decimals.coarsest(), whole.decimals.coarsest());
        }
    }
}
