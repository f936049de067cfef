//! Numbers for people: so many significant digits, no trailing zeros, an exponent only where it shortens.

/// `value` to `digits` significant digits.
pub fn figure(value: f64, digits: usize) -> String {
    if value == 0.0 || !value.is_finite() {
        return if value == 0.0 { "0".to_owned() } else { value.to_string() };
    }
    let scientific = format!("{value:.*e}", digits.saturating_sub(1));
    let (mantissa, exponent) = scientific.split_once('e').unwrap_or((&scientific, "0"));
    let power: i32 = exponent.parse().unwrap_or(0);
    if (-4..digits.max(7) as i32).contains(&power) {
        let decimals = (digits as i32 - 1 - power).max(0) as usize;
        return trimmed(&format!("{value:.decimals$}"));
    }
    format!("{}e{power}", trimmed(mantissa))
}

/// Without zeros at the end of the decimals.
fn trimmed(text: &str) -> String {
    if text.contains('.') { text.trim_end_matches('0').trim_end_matches('.').to_owned() } else { text.to_owned() }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn figures_are_short_and_right() {
        for (value, digits, shown) in [
            (0.0, 4, "0"),
            (200.0, 4, "200"),
            (0.012345678, 4, "0.01235"),
            (1.0e-7, 4, "1e-7"),
            (123456.7, 4, "123457"),
            (-2.5, 4, "-2.5"),
            (9.9999e9, 3, "1e10"),
            (f64::NAN, 4, "NaN"),
        ] {
            assert_eq!(figure(value, digits), shown);
        }
    }
}
