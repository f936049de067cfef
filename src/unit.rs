//! Units of channels and axes, as far as integration and differentiation need them: length and time, spelled as found.

use serde::{Serialize, Serializer};

/// Standard gravity in m/s2, exact (CGPM 1901; ISO 80000-3).
pub const STANDARD_GRAVITY: f64 = 9.80665;

/// A unit: its label, and its meaning in metres and seconds where the label is known.
#[derive(Debug, Clone, PartialEq)]
pub struct Unit {
    label: String,
    meaning: Option<Meaning>,
}

/// `scale` x metre^`length` x second^`time`.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Meaning {
    /// Size of one unit in SI base units.
    pub scale: f64,
    /// Power of the metre.
    pub length: i8,
    /// Power of the second.
    pub time: i8,
}

/// Canonical spellings. The first row of a meaning is the one written for results; later rows are read only.
#[rustfmt::skip]
const SPELLINGS: &[(&str, f64, i8, i8)] = &[
    ("m", 1.0, 1, 0), ("mm", 1e-3, 1, 0), ("um", 1e-6, 1, 0), ("nm", 1e-9, 1, 0), ("cm", 1e-2, 1, 0), ("km", 1e3, 1, 0),
    ("in", 0.0254, 1, 0), ("ft", 0.3048, 1, 0), ("mil", 2.54e-5, 1, 0),
    ("m/s", 1.0, 1, -1), ("mm/s", 1e-3, 1, -1), ("um/s", 1e-6, 1, -1), ("cm/s", 1e-2, 1, -1), ("in/s", 0.0254, 1, -1),
    ("km/h", 1.0 / 3.6, 1, -1),
    ("m/s2", 1.0, 1, -2), ("mm/s2", 1e-3, 1, -2), ("um/s2", 1e-6, 1, -2), ("cm/s2", 1e-2, 1, -2), ("in/s2", 0.0254, 1, -2),
    ("g", STANDARD_GRAVITY, 1, -2), ("mg", STANDARD_GRAVITY * 1e-3, 1, -2), ("ug", STANDARD_GRAVITY * 1e-6, 1, -2),
    ("Gal", 1e-2, 1, -2),
    ("m/s3", 1.0, 1, -3), ("mm/s3", 1e-3, 1, -3), ("g/s", STANDARD_GRAVITY, 1, -3), ("m/s4", 1.0, 1, -4), ("mm/s4", 1e-3, 1, -4),
    ("s", 1.0, 0, 1), ("ms", 1e-3, 0, 1), ("us", 1e-6, 0, 1), ("ns", 1e-9, 0, 1), ("min", 60.0, 0, 1), ("h", 3600.0, 0, 1),
    ("Hz", 1.0, 0, -1), ("kHz", 1e3, 0, -1),
    ("m s", 1.0, 1, 1), ("mm s", 1e-3, 1, 1),
    ("1", 1.0, 0, 0), ("mm/m", 1e-3, 0, 0), ("um/m", 1e-6, 0, 0), ("um/mm", 1e-3, 0, 0), ("%", 1e-2, 0, 0),
    ("m2", 1.0, 2, 0), ("mm2", 1e-6, 2, 0), ("1/m", 1.0, -1, 0), ("1/mm", 1e3, -1, 0), ("1/s", 1.0, 0, -1),
];

/// A count with its noun: `1 sample`, `2 samples`.
pub fn counted(count: impl std::fmt::Display, noun: &str) -> String {
    let count = count.to_string();
    let plural = if count == "1" { "" } else { "s" };
    format!("{count} {noun}{plural}")
}

impl Unit {
    /// A unit as a file or a person spells it. Common variants (`m/s^2`, `m/s²`, `µm`, `mm/s/s`, `sec`) are understood;
    /// anything else is kept as it is, without a meaning.
    pub fn parse(text: &str) -> Unit {
        let label = text.trim();
        let tidy = tidied(label);
        let found = SPELLINGS.iter().find(|(spelling, ..)| *spelling == tidy);
        match found {
            Some(&(spelling, scale, length, time)) => {
                Unit { label: spelling.to_owned(), meaning: Some(Meaning { scale, length, time }) }
            }
            None => Unit { label: label.to_owned(), meaning: None },
        }
    }

    /// No unit known.
    pub fn unknown() -> Unit {
        Unit { label: String::new(), meaning: None }
    }

    /// Full scale: what a WAV file carries until it is calibrated.
    pub fn full_scale() -> Unit {
        Unit { label: "FS".to_owned(), meaning: None }
    }

    /// The label, empty when unknown.
    pub fn label(&self) -> &str {
        &self.label
    }

    /// The meaning in metres and seconds, where the label is known.
    pub fn meaning(&self) -> Option<Meaning> {
        self.meaning
    }

    /// True when there is no label at all.
    pub fn is_unknown(&self) -> bool {
        self.label.is_empty()
    }

    /// True for a unit of time.
    pub fn is_time(&self) -> bool {
        matches!(self.meaning, Some(Meaning { length: 0, time: 1, .. }))
    }

    /// True for a unit of length.
    pub fn is_length(&self) -> bool {
        matches!(self.meaning, Some(Meaning { length: 1, time: 0, .. }))
    }

    /// The unit after `turns` derivatives (positive) or integrals (negative) along an axis in `axis` (`s`, `ms`, `m`,
    /// `mm` ...), and the factor by which numbers formed with the axis in its SI base unit (s or m) are multiplied to be
    /// in that unit. `g` becomes `m/s`; `mm/s2` becomes `mm/s`; an unknown unit `V` becomes `V s` or `V/s`, factor 1.
    pub fn turned(&self, turns: i32, axis: &Unit) -> (Unit, f64) {
        if turns == 0 {
            return (self.clone(), 1.0);
        }
        let base_axis = if axis.is_length() { "m" } else { "s" };
        let (Some(own), true) = (self.meaning, axis.is_length() || axis.is_time()) else {
            return (Unit { label: opaque_label(&self.label, turns, base_axis), meaning: None }, 1.0);
        };
        let (length, time) = if axis.is_length() {
            (i32::from(own.length) - turns, i32::from(own.time))
        } else {
            (i32::from(own.length), i32::from(own.time) - turns)
        };
        // The spelling of the result keeps the prefix where there is one of that size (mm/s2 -> mm/s), otherwise the
        // plain SI unit (g -> m/s), otherwise an opaque product.
        let candidates = |scale: f64| {
            SPELLINGS
                .iter()
                .find(|&&(_, s, l, t)| i32::from(l) == length && i32::from(t) == time && (s / scale - 1.0).abs() < 1e-9)
        };
        // A derivative of gravity units stays readable as m/s3; a prefix is kept only for decimal multiples.
        let decimal = (own.scale.log10() - own.scale.log10().round()).abs() < 1e-9;
        let row = if decimal { candidates(own.scale) } else { None }.or_else(|| candidates(1.0));
        match row {
            Some(&(spelling, scale, l, t)) => (
                Unit { label: spelling.to_owned(), meaning: Some(Meaning { scale, length: l, time: t }) },
                own.scale / scale,
            ),
            None => (Unit { label: opaque_label(&self.label, turns, base_axis), meaning: None }, 1.0),
        }
    }
}

impl std::fmt::Display for Unit {
    fn fmt(&self, f: &mut std::fmt::Formatter<'_>) -> std::fmt::Result {
        f.write_str(&crate::place::escape(&self.label))
    }
}

impl Serialize for Unit {
    /// The label, or `null` when unknown.
    fn serialize<S: Serializer>(&self, serializer: S) -> Result<S::Ok, S::Error> {
        if self.is_unknown() { serializer.serialize_none() } else { serializer.serialize_str(&self.label) }
    }
}

fn opaque_label(label: &str, turns: i32, axis: &str) -> String {
    let power = match turns.abs() {
        1 => axis.to_owned(),
        n => format!("{axis}{n}"),
    };
    match (label.is_empty(), turns > 0) {
        (true, true) => format!("1/{power}"),
        (true, false) => power,
        (false, true) => format!("{label}/{power}"),
        (false, false) => format!("{label} {power}"),
    }
}

/// The spelling with superscripts, carets, blanks and common long forms reduced to the table's.
fn tidied(label: &str) -> String {
    let mut text: String = label
        .chars()
        .filter_map(|c| match c {
            '²' => Some('2'),
            '³' => Some('3'),
            'µ' | 'μ' => Some('u'),
            '^' | '*' => None,
            '·' | '⋅' => Some(' '),
            other => Some(other),
        })
        .collect();
    text = text.split_whitespace().collect::<Vec<_>>().join(" ").replace(" / ", "/");
    let alias = match text.as_str() {
        "m/s/s" | "m/sec2" | "m s-2" | "m/(s2)" | "ms-2" | "m/sq.s" => "m/s2",
        "mm/s/s" | "mm/sec2" | "mm s-2" => "mm/s2",
        "mm/sec" | "mm s-1" => "mm/s",
        "m/sec" | "m s-1" => "m/s",
        "G" | "gn" | "g0" | "g_n" => "g",
        "micron" | "microns" => "um",
        "sec" | "secs" | "second" | "seconds" | "S" => "s",
        "msec" | "millis" | "milliseconds" => "ms",
        "usec" | "micros" | "microseconds" => "us",
        "nanos" | "nanoseconds" | "nsec" => "ns",
        "metre" | "metres" | "meter" | "meters" => "m",
        "hz" | "HZ" => "Hz",
        "-" | "–" => "1",
        other => other,
    };
    alias.to_owned()
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn usual_spellings_are_understood() {
        for (spelling, label) in [
            ("m/s^2", "m/s2"),
            ("m/s²", "m/s2"),
            ("m/s**2", "m/s2"),
            ("µm", "um"),
            ("μm", "um"),
            (" g ", "g"),
            ("m/s/s", "m/s2"),
            ("sec", "s"),
        ] {
            assert_eq!(Unit::parse(spelling).label(), label, "{spelling}");
            assert!(Unit::parse(spelling).meaning().is_some());
        }
        assert_eq!((counted(1, "sample"), counted("1.5", "sample")), ("1 sample".to_owned(), "1.5 samples".to_owned()));
        assert_eq!(Unit::parse("bar").label(), "bar");
        assert!(Unit::parse("bar").meaning().is_none());
    }

    #[test]
    fn integration_and_differentiation_change_the_unit() {
        let s = Unit::parse("s");
        // Numbers integrated in base units of the axis keep the channel's own scale factor.
        let cases = [
            ("g", -1, "m/s", STANDARD_GRAVITY),
            ("g", -2, "m", STANDARD_GRAVITY),
            ("m/s2", -1, "m/s", 1.0),
            ("mm/s2", -1, "mm/s", 1.0),
            ("mm/s", -1, "mm", 1.0),
            ("mm/s", 1, "mm/s2", 1.0),
            ("um", 1, "um/s", 1.0),
            ("V", -1, "V s", 1.0),
            ("V", 2, "V/s2", 1.0),
            ("", 1, "1/s", 1.0),
        ];
        for (unit, turns, label, factor) in cases {
            let (turned, scale) = Unit::parse(unit).turned(turns, &s);
            assert_eq!(turned.label(), label, "{unit} {turns}");
            assert!((scale / factor - 1.0).abs() < 1e-12, "{unit} {turns}: {scale}");
        }
        let (slope, scale) = Unit::parse("um").turned(1, &Unit::parse("mm"));
        assert_eq!((slope.label(), scale), ("um/m", 1.0));
    }
}
