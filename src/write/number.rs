//! Numbers as text: the shortest digits that read back to the same double, or a fixed count of decimals, exactly rounded.

use std::io::Write;

use serde::{Deserialize, Serialize};

/// How many digits a number gets.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Default, Serialize, Deserialize)]
#[serde(rename_all = "snake_case")]
pub enum Digits {
    /// The fewest that read back to the same double.
    #[default]
    Shortest,
    /// That many after the decimal mark.
    Fixed(u8),
}

/// Appends `value`, which must be finite, with `decimal` (`.` or `,`) as its mark.
///
/// `Shortest` is positional from 1e-5 up to below 1e16 and `1.5e-7` otherwise, which every reader of delimited text takes;
/// whole numbers carry no mark (`1`, `-0`). `Fixed` rounds the double's exact value, halves to even: the text is that of the
/// standard library's `{:.n}`.
pub fn push(out: &mut Vec<u8>, value: f64, digits: Digits, decimal: u8) {
    let start = out.len();
    match digits {
        Digits::Shortest => {
            let mut buffer = zmij::Buffer::new();
            let text = buffer.format_finite(value).as_bytes();
            let text = text.strip_suffix(b".0").unwrap_or(text);
            out.extend_from_slice(text);
            // An exponent needs no plus; only numbers this large have one.
            if value.abs() >= 1e16
                && let Some(plus) = out[start..].iter().position(|&byte| byte == b'+')
            {
                out.remove(start + plus);
            }
        }
        Digits::Fixed(decimals) => {
            if !push_fixed(out, value, decimals) {
                // Writing into a vector cannot fail.
                let _ = write!(out, "{value:.*}", usize::from(decimals));
            }
        }
    }
    if decimal != b'.'
        && let Some(mark) = out[start..].iter().position(|&byte| byte == b'.')
    {
        out[start + mark] = decimal;
    }
}

/// The common case in integers: false, with nothing written, where the number is too large or the decimals too many.
fn push_fixed(out: &mut Vec<u8>, value: f64, decimals: u8) -> bool {
    let bits = value.to_bits();
    let exponent = (bits >> 52 & 0x7ff) as i32;
    let fraction = bits & ((1 << 52) - 1);
    // |value| = whole x 2^-shift.
    let (whole, shift) = if exponent == 0 { (fraction, 1074) } else { (fraction | 1 << 52, 1075 - exponent) };
    let Some(&power) = POWERS.get(usize::from(decimals)) else { return false };
    if shift < 0 || !value.is_finite() {
        return false;
    }
    // whole < 2^53 and power < 2^64: the product holds, and so does the quotient's exact remainder.
    let product = u128::from(whole) * u128::from(power);
    let rounded = match u32::try_from(shift) {
        Ok(0) => product,
        // 2^(shift - 1) exceeds the product: less than a half.
        Ok(118..) => 0,
        Ok(shift) => {
            let (quotient, rest, half) = (product >> shift, product & ((1 << shift) - 1), 1_u128 << (shift - 1));
            quotient + u128::from(rest > half || (rest == half && quotient & 1 == 1))
        }
        Err(_) => return false,
    };
    let Ok(rounded) = u64::try_from(rounded) else { return false };
    if value.is_sign_negative() {
        out.push(b'-');
    }
    push_integer(out, rounded / power, 1);
    if decimals > 0 {
        out.push(b'.');
        push_integer(out, rounded % power, usize::from(decimals));
    }
    true
}

/// Powers of ten that a 64-bit number holds.
const POWERS: [u64; 20] = {
    let mut powers = [1; 20];
    let mut n = 1;
    while n < 20 {
        powers[n] = powers[n - 1] * 10;
        n += 1;
    }
    powers
};

/// Appends a whole number, with leading zeros up to `width` digits.
fn push_integer(out: &mut Vec<u8>, mut number: u64, width: usize) {
    let mut text = [b'0'; 20];
    let mut first = text.len();
    while number >= 100 {
        first -= 2;
        let pair = (number % 100) as usize * 2;
        text[first..first + 2].copy_from_slice(&PAIRS[pair..pair + 2]);
        number /= 100;
    }
    if number >= 10 {
        first -= 2;
        text[first..first + 2].copy_from_slice(&PAIRS[number as usize * 2..number as usize * 2 + 2]);
    } else if number > 0 {
        first -= 1;
        text[first] += number as u8;
    }
    out.extend_from_slice(&text[first.min(text.len() - width)..]);
}

/// `00` to `99`.
const PAIRS: [u8; 200] = {
    let mut pairs = [b'0'; 200];
    let mut n = 0;
    while n < 100 {
        pairs[2 * n] += (n / 10) as u8;
        pairs[2 * n + 1] += (n % 10) as u8;
        n += 1;
    }
    pairs
};

#[cfg(test)]
mod tests {
    use super::*;
    use proptest::prelude::*;

    fn text(value: f64, digits: Digits, decimal: u8) -> String {
        let mut out = Vec::new();
        push(&mut out, value, digits, decimal);
        String::from_utf8(out).unwrap()
    }

    #[test]
    fn shortest_forms_are_plain() {
        let cases = [
            (1.0, "1"),
            (-0.0, "-0"),
            (0.1, "0.1"),
            (1e-7, "1e-7"),
            (1.5e-7, "1.5e-7"),
            (1e-5, "0.00001"),
            (9.5e-6, "9.5e-6"),
            (1e16, "1e16"),
            (123456.75, "123456.75"),
            (1e15, "1000000000000000"),
            (1e308, "1e308"),
            (5e-324, "5e-324"),
        ];
        for (value, expected) in cases {
            assert_eq!(text(value, Digits::Shortest, b'.'), expected);
        }
        assert_eq!(text(-0.25, Digits::Shortest, b','), "-0,25");
    }

    #[test]
    fn halves_round_to_even() {
        // Exact doubles: 0.125 and 0.375 lie halfway between two decimals.
        for (value, expected) in [(0.125, "0.12"), (0.375, "0.38"), (-2.5, "-2.50"), (0.0, "0.00")] {
            assert_eq!(text(value, Digits::Fixed(2), b'.'), expected);
        }
        assert_eq!(text(2.5, Digits::Fixed(0), b'.'), "2");
        assert_eq!(text(0.5, Digits::Fixed(0), b'.'), "0");
        assert_eq!(text(1234.5, Digits::Fixed(1), b','), "1234,5");
    }

    proptest! {
        #![proptest_config(ProptestConfig { cases: 4000, failure_persistence: None, ..ProptestConfig::default() })]

        #[test]
        fn shortest_reads_back(bits in any::<u64>()) {
            let value = f64::from_bits(bits);
            prop_assume!(value.is_finite());
            let text = text(value, Digits::Shortest, b'.');
            prop_assert_eq!(text.parse::<f64>().unwrap().to_bits(), bits);
            prop_assert!(text.bytes().all(|b| b.is_ascii_digit() || b"-.e".contains(&b)), "{}", text);
            prop_assert!(!text.ends_with('.') && text.matches('.').count() <= 1);
        }

        // The oracle is the standard library's exact decimal conversion.
        #[test]
        fn fixed_is_exactly_rounded(bits in any::<u64>(), decimals in 0_u8..40) {
            let value = f64::from_bits(bits);
            prop_assume!(value.is_finite());
            prop_assert_eq!(text(value, Digits::Fixed(decimals), b'.'), format!("{value:.*}", usize::from(decimals)));
        }

        #[test]
        fn fixed_is_exactly_rounded_at_common_sizes(value in -1e6_f64..1e6, decimals in 0_u8..16) {
            prop_assert_eq!(text(value, Digits::Fixed(decimals), b'.'), format!("{value:.*}", usize::from(decimals)));
        }

        #[test]
        fn fixed_ties_agree_with_the_standard_library(n in -4_000_000_i64..4_000_000, shift in 0_u32..12, decimals in 0_u8..12) {
            let value = n as f64 / f64::from(1_u32 << shift);
            prop_assert_eq!(text(value, Digits::Fixed(decimals), b'.'), format!("{value:.*}", usize::from(decimals)));
        }
    }
}
