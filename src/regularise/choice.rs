//! What may be done about gaps, repeated rows and uneven stamps, by the words of the options.

use std::fmt;
use std::str::FromStr;

use crate::error::Error;

/// What happens to missing rows and values.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Default)]
pub enum Gaps {
    /// They are an error.
    #[default]
    Reject,
    /// They are interpolated where the content allows it, and are an error where it does not.
    Fill,
    /// Smoothing finds what belongs there: until then straight lines hold their places, and the record lists them.
    Smooth,
    /// The record falls into the stretches between them, each a record of its own.
    Split,
}

/// What happens to rows that repeat the stamp of the row before.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Default)]
pub enum Duplicates {
    /// They are an error.
    #[default]
    Reject,
    /// Those that repeat the values too are left out; others stay an error.
    Drop,
}

/// What happens to uneven stamps.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Regrid {
    /// The samples are interpolated onto an even grid by a cubic spline.
    Cubic,
    /// The cosine series that fits the samples best is read off on an even grid: for content near the end of the band.
    LeastSquares,
    /// The samples are taken as even: right where the stamps scatter and the sampling does not.
    Off,
}

/// The words of each choice, first the one that results show.
const GAPS: &[(&str, Gaps)] =
    &[("reject", Gaps::Reject), ("fill", Gaps::Fill), ("smooth", Gaps::Smooth), ("split", Gaps::Split)];
const DUPLICATES: &[(&str, Duplicates)] = &[("reject", Duplicates::Reject), ("drop", Duplicates::Drop)];
const REGRIDS: &[(&str, Regrid)] =
    &[("cubic", Regrid::Cubic), ("least-squares", Regrid::LeastSquares), ("off", Regrid::Off)];

fn chosen<T: Copy>(rows: &[(&str, T)], text: &str) -> Result<T, Error> {
    rows.iter().find(|(word, _)| *word == text).map(|(_, value)| *value).ok_or_else(|| {
        let words: Vec<&str> = rows.iter().map(|(word, _)| *word).collect();
        Error::usage(format!("unknown choice {text:?}")).remedy(format!("choose {}", words.join(" or ")))
    })
}

fn word<T: PartialEq>(rows: &[(&'static str, T)], value: &T) -> &'static str {
    rows.iter().find(|(_, known)| known == value).map_or("", |(word, _)| word)
}

impl FromStr for Gaps {
    type Err = Error;

    fn from_str(text: &str) -> Result<Gaps, Error> {
        chosen(GAPS, text)
    }
}

impl FromStr for Duplicates {
    type Err = Error;

    fn from_str(text: &str) -> Result<Duplicates, Error> {
        chosen(DUPLICATES, text)
    }
}

impl FromStr for Regrid {
    type Err = Error;

    fn from_str(text: &str) -> Result<Regrid, Error> {
        chosen(REGRIDS, text)
    }
}

impl fmt::Display for Gaps {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        f.write_str(word(GAPS, self))
    }
}

impl fmt::Display for Duplicates {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        f.write_str(word(DUPLICATES, self))
    }
}

impl fmt::Display for Regrid {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        f.write_str(word(REGRIDS, self))
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn every_word_is_read_back() {
        for (text, value) in GAPS {
            assert_eq!((text.parse(), value.to_string().as_str()), (Ok(*value), *text));
        }
        for (text, value) in DUPLICATES {
            assert_eq!((text.parse(), value.to_string().as_str()), (Ok(*value), *text));
        }
        for (text, value) in REGRIDS {
            assert_eq!((text.parse(), value.to_string().as_str()), (Ok(*value), *text));
        }
        assert!(
            "cut".parse::<Gaps>().is_err_and(|e| e.to_string().contains("choose reject or fill or smooth or split"))
        );
    }
}
