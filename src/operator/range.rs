//! A band between two corners, `2Hz..40Hz`, and a notch, `50Hz:2Hz`, as people write them.

use std::fmt;

use crate::error::{Error, Result};

use super::corner::{Corner, quoted};

/// Two corners, held by frequency.
#[derive(Debug, Clone, PartialEq)]
pub struct Range {
    text: String,
    low: Corner,
    high: Corner,
}

impl Range {
    /// Reads `A..B` with units on both sides. Corners of one measure run upwards as written; `0.8mm..8mm` is the band
    /// of those wavelengths, so its lower frequency is that of 8 mm.
    ///
    /// # Errors
    /// `Usage` without `..`, for faults of either corner, equal or falling corners, or time mixed with length.
    pub fn parse(text: &str) -> Result<Range> {
        const EXAMPLE: &str = "write a range with units on both sides, as in 2Hz..40Hz or 0.8mm..8mm";
        let text = text.trim();
        let fault = |what: &str| Error::usage(format!("{}: {what}", quoted(text))).remedy(EXAMPLE);
        let Some((first, second)) = text.split_once("..") else {
            return Err(fault("no range"));
        };
        let read = |side: &str| Corner::parse(side).map_err(|e| Error::usage(e.what()).remedy(EXAMPLE));
        let (first, second) = (read(first)?, read(second)?);
        if first.measure().is_time() != second.measure().is_time() {
            return Err(fault("mixes time and length"));
        }
        if first.measure() == second.measure() && first.base() >= second.base() {
            return Err(fault("does not run upwards"));
        }
        if first.frequency() == second.frequency() {
            return Err(fault("both corners are the same"));
        }
        let text = format!("{first}..{second}");
        let (low, high) = if first.frequency() < second.frequency() { (first, second) } else { (second, first) };
        Ok(Range { text, low, high })
    }

    /// The corner of lower frequency.
    pub fn low(&self) -> &Corner {
        &self.low
    }

    /// The corner of higher frequency.
    pub fn high(&self) -> &Corner {
        &self.high
    }

    /// The text as written, without blanks around the parts.
    pub fn text(&self) -> &str {
        &self.text
    }
}

impl fmt::Display for Range {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        f.write_str(&self.text)
    }
}

/// A centre and a full width, of one line or of a line and its harmonics.
#[derive(Debug, Clone, PartialEq)]
pub struct CentreWidth {
    text: String,
    centre: Corner,
    width: Corner,
    orders: Orders,
}

/// Which harmonics of a line are meant.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Orders {
    /// The line and its harmonics up to this order; 1 is the line alone.
    UpTo(u32),
    /// Every harmonic that fits below the Nyquist frequency.
    All,
}

impl CentreWidth {
    /// Reads `CENTRE:WIDTH`, `CENTRE:WIDTH:5` or `CENTRE:WIDTH:all`. The width is a difference of frequencies, or of periods
    /// or wavelengths as the centre is.
    ///
    /// # Errors
    /// `Usage` without `:`, for faults of any part, or measures that do not go together.
    pub fn parse(text: &str) -> Result<CentreWidth> {
        const EXAMPLE: &str = "write a notch as centre and full width, as in 50Hz:2Hz, 50Hz:2Hz:5 or 50Hz:2Hz:all";
        let text = text.trim();
        let fault = |what: &str| Error::usage(format!("{}: {what}", quoted(text))).remedy(EXAMPLE);
        let Some((centre, rest)) = text.split_once(':') else {
            return Err(fault("no centre and width"));
        };
        let (width, orders) = match rest.split_once(':') {
            None => (rest, Orders::UpTo(1)),
            Some((width, orders)) => (
                width,
                match (orders.trim(), orders.trim().parse::<u32>()) {
                    ("all", _) => Orders::All,
                    (_, Ok(count @ 1..=MOST_ORDERS)) => Orders::UpTo(count),
                    _ => return Err(fault("the orders are neither a number from 1 to 1000 nor all")),
                },
            ),
        };
        let read = |side: &str| Corner::parse(side).map_err(|e| Error::usage(e.what()).remedy(EXAMPLE));
        let (centre, width) = (read(centre)?, read(width)?);
        if centre.measure().is_time() != width.measure().is_time() {
            return Err(fault("mixes time and length"));
        }
        if !width.measure().is_frequency() && width.measure() != centre.measure() {
            return Err(fault("the width is no difference of frequencies"));
        }
        let suffix = match orders {
            Orders::UpTo(1) => String::new(),
            Orders::UpTo(count) => format!(":{count}"),
            Orders::All => ":all".to_owned(),
        };
        Ok(CentreWidth { text: format!("{centre}:{width}{suffix}"), centre, width, orders })
    }

    /// The centre.
    pub fn centre(&self) -> &Corner {
        &self.centre
    }

    /// The full width.
    pub fn width(&self) -> &Corner {
        &self.width
    }

    /// Which harmonics are meant.
    pub fn orders(&self) -> Orders {
        self.orders
    }

    /// The text as written, without blanks around the parts.
    pub fn text(&self) -> &str {
        &self.text
    }
}

/// Harmonics at most: every one costs a factor at every frequency.
const MOST_ORDERS: u32 = 1000;

impl fmt::Display for CentreWidth {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        f.write_str(&self.text)
    }
}

#[cfg(test)]
mod tests {
    use proptest::prelude::*;

    use super::*;

    #[test]
    fn bands_are_held_by_frequency() {
        for (text, low, high) in [
            ("2Hz..40Hz", 2.0, 40.0),
            ("2Hz..0.04kHz", 2.0, 40.0),
            ("0.8mm..8mm", 125.0, 1250.0),
            ("20ms..2s", 0.5, 50.0),
            ("2.5s..40Hz", 0.4, 40.0),
            ("40Hz..2.5s", 0.4, 40.0),
            ("0.1/m..2/mm", 0.1, 2000.0),
        ] {
            let range = Range::parse(text).unwrap_or_else(|e| panic!("{text}: {e}"));
            let near = |a: f64, b: f64| (a / b - 1.0).abs() < 1e-14; // one division and one product
            assert!(near(range.low().frequency(), low) && near(range.high().frequency(), high), "{text}");
            assert_eq!(range.to_string(), text);
        }
    }

    #[test]
    fn faulty_bands_tell_what_was_found_and_show_an_example() {
        for (text, message) in [
            (
                "2..40Hz",
                "\"2\": a corner without a unit; write a range with units on both sides, as in 2Hz..40Hz or 0.8mm..8mm",
            ),
            ("40Hz", "\"40Hz\": no range; write a range with units on both sides, as in 2Hz..40Hz or 0.8mm..8mm"),
            (
                "40Hz..2Hz",
                "\"40Hz..2Hz\": does not run upwards; write a range with units on both sides, as in 2Hz..40Hz or 0.8mm..8mm",
            ),
            (
                "2Hz..2Hz",
                "\"2Hz..2Hz\": does not run upwards; write a range with units on both sides, as in 2Hz..40Hz or 0.8mm..8mm",
            ),
            (
                "0.5s..2Hz",
                "\"0.5s..2Hz\": both corners are the same; write a range with units on both sides, as in 2Hz..40Hz or 0.8mm..8mm",
            ),
            (
                "2Hz..4mm",
                "\"2Hz..4mm\": mixes time and length; write a range with units on both sides, as in 2Hz..40Hz or 0.8mm..8mm",
            ),
            ("", "\"\": no range; write a range with units on both sides, as in 2Hz..40Hz or 0.8mm..8mm"),
        ] {
            let error = Range::parse(text).expect_err(text);
            assert_eq!(error.to_string(), message);
        }
    }

    #[test]
    fn a_notch_has_a_centre_and_a_full_width() {
        let notch = CentreWidth::parse("50Hz:2Hz").unwrap();
        assert_eq!((notch.centre().frequency(), notch.width().base()), (50.0, 2.0));
        for (text, message) in [
            (
                "50Hz",
                "\"50Hz\": no centre and width; write a notch as centre and full width, as in 50Hz:2Hz, 50Hz:2Hz:5 or 50Hz:2Hz:all",
            ),
            (
                "50Hz:2",
                "\"2\": a corner without a unit; write a notch as centre and full width, as in 50Hz:2Hz, 50Hz:2Hz:5 or 50Hz:2Hz:all",
            ),
            (
                "50Hz:2mm",
                "\"50Hz:2mm\": mixes time and length; write a notch as centre and full width, as in 50Hz:2Hz, 50Hz:2Hz:5 or 50Hz:2Hz:all",
            ),
            (
                "50Hz:2ms",
                "\"50Hz:2ms\": the width is no difference of frequencies; write a notch as centre and full width, as in 50Hz:2Hz, 50Hz:2Hz:5 or 50Hz:2Hz:all",
            ),
        ] {
            assert_eq!(CentreWidth::parse(text).expect_err(text).to_string(), message);
        }
    }

    proptest! {
        #[test]
        fn no_text_panics(text in ".{0,40}", near in "[-+0-9.eE]{0,6}(Hz|mm|s|/m| ){0,2}(\\.\\.|:)[-+0-9.eE]{0,6}(Hz|mm|s|/m){0,2}") {
            let _ = (Range::parse(&text), Range::parse(&near), CentreWidth::parse(&text), CentreWidth::parse(&near));
        }
    }
}
