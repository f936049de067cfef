//! The number that a text such as `40Hz` or `98.1m/s2` begins with, and the unit that follows it.

/// Splits a text into the number that it begins with and the rest, both without blanks around them. `None` without a number,
/// for a number that is not finite as a double (`1e400`), and where a second number follows (`2 3mm`): neither is then a
/// unit. A rest of `1/m` is one.
pub fn split(text: &str) -> Option<(f64, &str)> {
    let text = text.trim();
    let (number, rest) = text.split_at(length(text));
    let value: f64 = number.parse().ok().filter(|value: &f64| value.is_finite())?;
    let rest = rest.trim_start();
    let second = rest.starts_with(|c: char| c.is_ascii_digit() || c == '.') && !rest.starts_with("1/");
    (!second).then_some((value, rest))
}

/// Bytes of the number that a text begins with: sign, digits, point, exponent. An `e` without digits belongs to the unit.
pub fn length(text: &str) -> usize {
    let bytes = text.as_bytes();
    let digits = |from: usize| bytes[from.min(bytes.len())..].iter().take_while(|b| b.is_ascii_digit()).count();
    let sign = |at: usize| usize::from(matches!(bytes.get(at), Some(b'+' | b'-')));
    let mut end = sign(0);
    end += digits(end);
    if bytes.get(end) == Some(&b'.') {
        end += 1 + digits(end + 1);
    }
    if matches!(bytes.get(end), Some(b'e' | b'E')) {
        let start = end + 1 + sign(end + 1);
        let count = digits(start);
        if count > 0 {
            end = start + count;
        }
    }
    end
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn number_and_unit_part_where_the_number_ends() {
        for (text, value, rest) in [
            ("98.1m/s2", 98.1, "m/s2"),
            (" -1e-3 s ", -1e-3, "s"),
            ("2e3", 2000.0, ""),
            ("10%", 10.0, "%"),
            ("1eV", 1.0, "eV"),
            (".5g", 0.5, "g"),
            ("2 1/m", 2.0, "1/m"),
        ] {
            assert_eq!(split(text), Some((value, rest)), "{text}");
        }
    }

    #[test]
    fn what_no_double_holds_is_no_number() {
        for text in ["1e400", "-1e400m", "1e400%", "", "g", "-", ".", "nan", "inf", "infm", "2 3mm", "1.2.3", "1e4.5"] {
            assert_eq!(split(text), None, "{text}");
        }
    }
}
