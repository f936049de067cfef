//! What the user can tell a reader: what overrides detection, which channels are wanted, and what their numbers mean.

use crate::error::{Error, Result};
use crate::place::escape;
use crate::record::StatedRate;
use crate::unit::Unit;

/// Overrides of what a reader would find by itself. The default leaves everything to detection.
#[derive(Debug, Clone, Default)]
pub struct ReadOptions {
    /// Wanted channels, by name or by field number (`#3`); all numeric ones but the stamps when `None`.
    pub channels: Option<Vec<String>>,
    /// Time or position column, by name or field number (`#1` or `1`); `none` says that there is none.
    pub time_column: Option<String>,
    /// Unit of the stamps, of time or length.
    pub time_unit: Option<Unit>,
    /// Field separator; blank stands for runs of blanks.
    pub delimiter: Option<u8>,
    /// Decimal mark, `.` or `,`.
    pub decimal: Option<u8>,
    /// Mark between groups of three digits, which is then removed.
    pub thousands: Option<u8>,
    /// Number of lines above the data block, header included.
    pub header_lines: Option<usize>,
    /// Further spellings of a missing value. One that is a number also matches its other spellings (`-9999.0`). `NUL`
    /// declares lines of NUL bytes to be lost rows.
    pub missing: Vec<String>,
    /// Sampling rate, which wins over header and stamps.
    pub rate: Option<StatedRate>,
    /// Units by channel name, which win over the header's.
    pub units: Vec<(String, Unit)>,
    /// Factors by channel name.
    pub calibrate: Vec<Calibration>,
    /// Read what is there of a file that ends too early.
    pub allow_truncated: bool,
    /// Most bytes of memory that a run may take.
    pub memory: Option<u64>,
}

/// Refuses what needs more than a bound on memory. `bytes` are needed, for `what`.
///
/// # Errors
/// `Unsupported` beyond the bound.
pub fn refuse_beyond(bound: Option<u64>, bytes: u64, what: &str) -> Result<()> {
    let Some(bound) = bound.filter(|bound| bytes > *bound) else { return Ok(()) };
    let size = |bytes: u64| match bytes {
        0..10_000_000 => format!("{} kB", bytes.div_ceil(1000)),
        _ => format!("{} MiB", bytes.div_ceil(1 << 20)),
    };
    Err(Error::unsupported(format!("{what} takes {} of memory, --memory allows {}", size(bytes), size(bound)))
        .remedy("raise --memory, or take fewer channels with --channel"))
}

/// A factor by which a channel's numbers are multiplied, and the unit they then have.
#[derive(Debug, Clone, PartialEq)]
pub struct Calibration {
    /// Channel name.
    pub channel: String,
    /// Factor, finite and not zero.
    pub factor: f64,
    /// Unit of the result; the channel's own when `None`.
    pub unit: Option<Unit>,
}

impl StatedRate {
    /// A rate as given on the command line: `100`, `100Hz`, `1.6kHz`, `2/mm`.
    ///
    /// # Errors
    /// `Usage` when it is none of these or not positive.
    pub fn parse(text: &str) -> Result<StatedRate> {
        rate(text)
            .map(|(rate_base, unit)| StatedRate { rate_base, unit, given: true, origin: "--rate".to_owned() })
            .ok_or_else(|| {
                Error::usage(format!("not a sampling rate: \"{}\"", escape(text)))
                    .remedy("write it as 100, 100Hz, 1.6kHz or 2/mm")
            })
    }
}

/// Samples per second or metre, and the axis unit, from `100`, `100 Hz`, `100 S/s`, `2/mm`.
pub(super) fn rate(text: &str) -> Option<(f64, Unit)> {
    let text = text.trim();
    let digits =
        text.find(|c: char| !(c.is_ascii_digit() || matches!(c, '.' | '+' | '-' | 'e' | 'E'))).unwrap_or(text.len());
    let value: f64 = text[..digits].trim().parse().ok()?;
    let suffix = text[digits..].trim();
    let (factor, unit) = match suffix.to_ascii_lowercase().as_str() {
        "" | "hz" | "sps" | "s/s" | "sa/s" | "samples/s" | "samples per second" | "1/s" | "/s" => {
            (1.0, Unit::parse("s"))
        }
        "khz" | "ksps" | "ks/s" => (1e3, Unit::parse("s")),
        "mhz" => (1e6, Unit::parse("s")),
        _ => {
            let unit = Unit::parse(suffix.trim_start_matches('1').strip_prefix('/')?);
            let scale = unit.meaning().filter(|_| unit.is_length() || unit.is_time())?.scale;
            (1.0 / scale, if unit.is_time() { Unit::parse("s") } else { unit })
        }
    };
    let rate_base = value * factor;
    (rate_base.is_finite() && rate_base > 0.0).then_some((rate_base, unit))
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn rates_carry_their_unit() {
        for (text, rate_base, unit) in [
            ("100", 100.0, "s"),
            ("1.6kHz", 1600.0, "s"),
            ("50 S/s", 50.0, "s"),
            ("2/mm", 2000.0, "mm"),
            ("4/m", 4.0, "m"),
        ] {
            let rate = StatedRate::parse(text).expect(text);
            assert!((rate.rate_base / rate_base - 1.0).abs() < 1e-15, "{text}: {rate:?}");
            assert_eq!((rate.unit.label(), rate.given), (unit, true), "{text}");
        }
        for text in ["", "fast", "-5", "0", "3/kg", "1e999", "nan", "100 V"] {
            assert!(StatedRate::parse(text).is_err(), "{text}");
        }
    }
}
