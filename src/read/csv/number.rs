//! Decimal numbers, exact to the last bit.

/// Powers of ten that a 64-bit float holds exactly.
const POWERS: [f64; 23] = [
    1e0, 1e1, 1e2, 1e3, 1e4, 1e5, 1e6, 1e7, 1e8, 1e9, 1e10, 1e11, 1e12, 1e13, 1e14, 1e15, 1e16, 1e17, 1e18, 1e19, 1e20,
    1e21, 1e22,
];

/// A number as printed: sign, up to 19 digits as an integer, and the power of ten.
#[derive(Debug, Clone, Copy)]
pub(super) struct Printed {
    /// True after a minus.
    pub(super) negative: bool,
    /// The digits as an integer, wrapped when there are more than 19.
    pub(super) mantissa: u64,
    /// Digits, leading zeros included.
    pub(super) digits: usize,
    /// Digits after the mark.
    pub(super) decimals: usize,
    /// Value of the exponent, capped at +-99,999.
    pub(super) exponent: i32,
    /// Bytes of text.
    pub(super) len: usize,
}

/// Bytes that hold an everyday number and what follows it.
pub(super) const SPAN: usize = 32;

/// An everyday number at the start of a span of text: a sign, up to 7 digits, perhaps the mark and up to 15 more, no exponent,
/// so few digits that they are exact. `None` for anything else; `scan` then decides.
#[inline(always)]
pub(super) fn short(text: &[u8; SPAN], decimal: u8) -> Option<Printed> {
    let negative = text[0] == b'-';
    let start = usize::from(negative || text[0] == b'+');
    let (mut mantissa, mut at) = (0_u64, start);
    // Few digits stand before the mark: one by one is quicker there.
    loop {
        let digit = text[at].wrapping_sub(b'0');
        if digit > 9 {
            break;
        }
        mantissa = mantissa * 10 + u64::from(digit);
        at += 1;
        if at > start + 7 {
            return None;
        }
    }
    let whole = at - start;
    let mut decimals = 0;
    if text[at] == decimal {
        at += 1;
        let (more, count) = leading_digits(text, at);
        mantissa = mantissa * TENS[count] + more;
        (at, decimals) = (at + count, count);
        if count == 8 {
            let (more, count) = leading_digits(text, at);
            if count == 8 {
                return None;
            }
            // May wrap: too many digits are refused below.
            mantissa = mantissa.wrapping_mul(TENS[count]).wrapping_add(more);
            (at, decimals) = (at + count, 8 + count);
        }
    }
    let digits = whole + decimals;
    // Up to 18 digits are below 2^63, and at most 24 bytes are passed.
    let sound = (1..=18).contains(&digits) && mantissa <= EXACT && !matches!(text[at], b'e' | b'E' | b'd' | b'D');
    sound.then_some(Printed { negative, mantissa, digits, decimals, exponent: 0, len: at })
}

/// The value of an everyday number.
#[inline(always)]
pub(super) fn short_value(printed: &Printed) -> f64 {
    // Clinger 1990: both operands are exact, so one division rounds correctly.
    let size = printed.mantissa as f64 / POWERS[printed.decimals];
    // The sign of a vibration is a coin toss, so a branch on it would be guessed wrong half of the time.
    f64::from_bits(size.to_bits() | u64::from(printed.negative) << 63)
}

/// Integers up to this are exact as floats.
const EXACT: u64 = 1 << 53;

const TENS: [u64; 9] = [1, 10, 100, 1_000, 10_000, 100_000, 1_000_000, 10_000_000, 100_000_000];

/// Value and count of the digits at `at` (at most 24), 8 at most.
#[inline(always)]
fn leading_digits(text: &[u8; SPAN], at: usize) -> (u64, usize) {
    let Some(eight) = text.get(at..at + 8).and_then(|eight| <[u8; 8]>::try_from(eight).ok()) else { return (0, 8) };
    let word = u64::from_le_bytes(eight);
    let count = (no_digits(word).trailing_zeros() / 8) as usize;
    if count == 0 {
        return (0, 0);
    }
    // Leading zero digits take the place of what follows.
    let digits = word.wrapping_sub(ZEROS) << (64 - 8 * count);
    (combined(digits), count)
}

const ZEROS: u64 = 0x3030_3030_3030_3030;

/// A word of text whose lowest non-zero byte marks the first byte that is no digit. Carries only reach later bytes.
#[inline(always)]
fn no_digits(word: u64) -> u64 {
    (word.wrapping_add(0x4646_4646_4646_4646) | word.wrapping_sub(ZEROS)) & 0x8080_8080_8080_8080
}

/// Eight digits, the first in the lowest byte, by three multiplications on bytes, pairs and fours.
#[inline(always)]
fn combined(digits: u64) -> u64 {
    let pairs = (digits.wrapping_mul(10).wrapping_add(digits >> 8)) & 0x00ff_00ff_00ff_00ff;
    let fours = (pairs.wrapping_mul(100).wrapping_add(pairs >> 16)) & 0x0000_ffff_0000_ffff;
    fours.wrapping_mul(10_000).wrapping_add(fours >> 32) & 0xffff_ffff
}

/// Scans the number at the start of `text`: digits around at most one decimal mark, then perhaps an exponent (`e`, or `d` as
/// Fortran prints it). `.5`, `5.` and `+1` are numbers; a mark or an exponent without digits is none.
pub(super) fn scan(text: &[u8], decimal: u8) -> Option<Printed> {
    let mut at = 0;
    let mut negative = false;
    if let Some(&sign @ (b'-' | b'+')) = text.first() {
        negative = sign == b'-';
        at = 1;
    }
    let start = at;
    let mut mantissa: u64 = 0;
    while let Some(digit) = digit(text, at) {
        mantissa = mantissa.wrapping_mul(10).wrapping_add(digit);
        at += 1;
    }
    let mut digits = at - start;
    let mut decimals = 0;
    if text.get(at) == Some(&decimal) {
        at += 1;
        let mark = at;
        while let Some(digit) = digit(text, at) {
            mantissa = mantissa.wrapping_mul(10).wrapping_add(digit);
            at += 1;
        }
        decimals = at - mark;
        digits += decimals;
    }
    if digits == 0 {
        return None;
    }
    let mut exponent = 0;
    if let Some(b'e' | b'E' | b'd' | b'D') = text.get(at) {
        at += 1;
        let mut down = false;
        if let Some(&sign @ (b'-' | b'+')) = text.get(at) {
            down = sign == b'-';
            at += 1;
        }
        let first = at;
        while let Some(digit) = digit(text, at) {
            exponent = (exponent * 10 + digit as i32).min(99_999);
            at += 1;
        }
        if at == first {
            return None;
        }
        if down {
            exponent = -exponent;
        }
    }
    Some(Printed { negative, mantissa, digits, decimals, exponent, len: at })
}

/// The value of a scanned number, correctly rounded; infinite when it is beyond the range.
#[inline]
pub(super) fn value(printed: &Printed, text: &[u8], decimal: u8) -> f64 {
    let power = printed.exponent - printed.decimals.min(1 << 20) as i32;
    // Clinger 1990: both operands are exact, so one division or multiplication rounds correctly.
    if printed.digits <= 19 && printed.mantissa <= EXACT && (-22..=22).contains(&power) {
        let mantissa = printed.mantissa as f64;
        let size = if power < 0 { mantissa / POWERS[-power as usize] } else { mantissa * POWERS[power as usize] };
        return if printed.negative { -size } else { size };
    }
    long(&text[..printed.len], decimal)
}

/// A number of many digits or a large exponent.
#[cold]
fn long(text: &[u8], decimal: u8) -> f64 {
    let plain: Vec<u8> = text
        .iter()
        .map(|&byte| match byte {
            mark if mark == decimal => b'.',
            b'd' | b'D' => b'e',
            other => other,
        })
        .collect();
    // The text was scanned, so it is a number; should the library think otherwise, the reader reports it as none.
    fast_float2::parse(&plain).unwrap_or(f64::NAN)
}

/// The whole of `text` as a number.
pub(super) fn whole(text: &[u8], decimal: u8) -> Option<f64> {
    let printed = scan(text, decimal)?;
    (printed.len == text.len()).then(|| value(&printed, text, decimal)).filter(|value| !value.is_nan())
}

#[inline]
fn digit(text: &[u8], at: usize) -> Option<u64> {
    text.get(at).map(|byte| u64::from(byte.wrapping_sub(b'0'))).filter(|&digit| digit <= 9)
}

#[cfg(test)]
mod tests {
    use proptest::prelude::*;

    use super::*;

    fn same_as_std(text: &str) {
        let expected: f64 = text.parse().unwrap_or_else(|_| panic!("std refuses {text:?}"));
        let found = whole(text.as_bytes(), b'.').unwrap_or_else(|| panic!("refused {text:?}"));
        assert_eq!(found.to_bits(), expected.to_bits(), "{text}: {found:e} for {expected:e}");
        let comma = text.replace('.', ",");
        assert_eq!(whole(comma.as_bytes(), b',').map(f64::to_bits), Some(expected.to_bits()), "{comma}");
        if let Some(printed) = short(&span(&format!("{text},12345678")), b'.') {
            assert_eq!(printed.len, text.len());
            assert_eq!(short_value(&printed).to_bits(), expected.to_bits(), "{text}");
        }
    }

    fn span(text: &str) -> [u8; SPAN] {
        let mut span = [b'7'; SPAN];
        let kept = text.len().min(SPAN);
        span[..kept].copy_from_slice(&text.as_bytes()[..kept]);
        span
    }

    #[test]
    fn special_shapes_are_as_the_standard_library_reads_them() {
        for text in [
            "0",
            "-0",
            "+1",
            ".5",
            "5.",
            "-.5e-3",
            "1e308",
            "1.7976931348623157e308",
            "1e309",
            "5e-324",
            "2e-324",
            "2.2250738585072011e-308",
            "9007199254740993",
            "9007199254740992.999999999",
            "12345678.12345678",
            "0.00000000",
            "00000000000000000000001.5",
            "123456789012345678901234567890",
            "1e22",
            "1e23",
            "1e-22",
            "1e-23",
            "0.1e-400",
            "1e99999999999",
            "179769313486231580793728971405301e277",
            "8.98846567431158e307",
            "1448997445238699",
        ] {
            same_as_std(text);
        }
    }

    #[test]
    fn everyday_numbers_take_the_short_way() {
        for text in ["0", "-0.1234567", "+12.5", ".5", "5.", "1234567.123456789", "0.123456789012345"] {
            let printed = short(&span(&format!("{text}\n")), b'.');
            assert_eq!(printed.map(|printed| printed.len), Some(text.len()), "{text}");
        }
        for text in ["", "-", ".", "x", "12345678", "1e5", "0.1234567890123456", "1.5d3", "1234567.12345678901"] {
            assert!(short(&span(&format!("{text}\n")), b'.').is_none(), "{text}");
        }
        // Without a line end in sight nothing is read past the span.
        for text in [
            "-1234567.1234567890123456789012345",
            "11111111111111111111111111111111",
            "-.111111111111111111111111111111",
        ] {
            assert!(short(&span(text), b'.').is_none());
        }
    }

    #[test]
    fn what_is_no_number_is_refused() {
        for text in ["", "-", ".", "+.", "e5", "1e", "1e+", "1.2.3", "1,5", "0x10", "inf", "nan", "1 2", "--1", "1_000"]
        {
            assert_eq!(whole(text.as_bytes(), b'.'), None, "{text}");
        }
        assert_eq!(whole(b"1.5D+02", b'.'), Some(150.0));
    }

    proptest! {
        #[test]
        fn every_printed_float_comes_back(bits in any::<u64>()) {
            let value = f64::from_bits(bits);
            prop_assume!(value.is_finite());
            same_as_std(&format!("{value:e}"));
            same_as_std(&format!("{value:.3}"));
        }

        #[test]
        fn every_decimal_is_as_the_standard_library_reads_it(text in "[+-]?[0-9]{0,24}\\.[0-9]{1,24}([eE][+-]?[0-9]{1,3})?") {
            same_as_std(&text);
        }
    }
}
