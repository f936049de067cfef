//! What the user knows about the ends: a clamped beam, an insulated rod, a closed profile. Followed, and checked.

use std::fmt;
use std::str::FromStr;

use serde::Serialize;

use crate::baseline::Side;
use crate::compare::Judgement;
use crate::ends::Parity;
use crate::error::{Error, Result};
use crate::place::escape;

/// A physical property of an end.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Serialize)]
#[serde(rename_all = "snake_case")]
pub enum Property {
    /// The slope is zero: even reflection.
    ZeroSlope,
    /// The value is zero: odd reflection.
    ZeroValue,
    /// The record closes on itself: periodic.
    Closed,
}

impl Property {
    /// The reflection that the property stands for; none for a closed record.
    pub fn parity(self) -> Option<Parity> {
        match self {
            Self::ZeroSlope => Some(Parity::Even),
            Self::ZeroValue => Some(Parity::Odd),
            Self::Closed => None,
        }
    }

    fn word(self) -> &'static str {
        match self {
            Self::ZeroSlope => "zero-slope",
            Self::ZeroValue => "zero-value",
            Self::Closed => "closed",
        }
    }
}

/// Asserted properties, by end.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Default)]
pub struct Assertion {
    /// At the left end.
    pub left: Option<Property>,
    /// At the right end.
    pub right: Option<Property>,
}

impl Assertion {
    /// Adds what `text` asserts: `zero-slope`, `left:zero-value`, `closed`.
    ///
    /// # Errors
    /// `Usage` for unknown words, for a closed single end, and for two assertions about one end.
    pub fn add(&mut self, text: &str) -> Result<()> {
        let (side, word) = match text.split_once(':') {
            Some(("left", word)) => (Some(Side::Left), word),
            Some(("right", word)) => (Some(Side::Right), word),
            Some(_) | None => (None, text),
        };
        let property: Property = word.parse()?;
        if property == Property::Closed && side.is_some() {
            return Err(Error::usage("a record is closed at both ends or not at all").remedy("write --assert closed"));
        }
        for (end, own) in [(Side::Left, &mut self.left), (Side::Right, &mut self.right)] {
            if side.is_none_or(|side| side == end) {
                if own.is_some() {
                    return Err(Error::usage(format!("two assertions about the {} end", side_word(end))));
                }
                *own = Some(property);
            }
        }
        Ok(())
    }

    /// True when nothing is asserted.
    pub fn is_empty(&self) -> bool {
        *self == Self::default()
    }
}

impl fmt::Display for Property {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        f.write_str(self.word())
    }
}

impl FromStr for Property {
    type Err = Error;

    fn from_str(text: &str) -> Result<Self> {
        [Self::ZeroSlope, Self::ZeroValue, Self::Closed].into_iter().find(|known| known.word() == text).ok_or_else(
            || {
                Error::usage(format!("not an assertion: \"{}\"", escape(text)))
                    .remedy("use zero-slope, zero-value or closed, with left: or right: for one end")
            },
        )
    }
}

impl fmt::Display for Assertion {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        match (self.left, self.right) {
            (Some(left), Some(right)) if left == right => f.write_str(left.word()),
            (left, right) => {
                let ends = [(Side::Left, left), (Side::Right, right)];
                let words: Vec<String> = ends
                    .iter()
                    .filter_map(|(side, property)| property.map(|p| format!("{}:{}", side_word(*side), p.word())))
                    .collect();
                f.write_str(&words.join(", "))
            }
        }
    }
}

fn side_word(side: Side) -> &'static str {
    match side {
        Side::Left => "left",
        Side::Right => "right",
    }
}

/// How an assertion stands against the record. Nothing stronger than "not contradicted" can be said.
#[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord, Serialize)]
#[serde(rename_all = "snake_case")]
pub enum Standing {
    /// The record does not speak against it.
    NotContradicted,
    /// The record is too short or too plain to speak.
    Untested,
    /// The record speaks against it.
    Contradicted,
}

impl Standing {
    /// In words.
    pub fn word(self) -> &'static str {
        match self {
            Standing::NotContradicted => "not contradicted",
            Standing::Untested => "untested",
            Standing::Contradicted => "contradicted",
        }
    }
}

/// How the assertion about one end stands. A closed record is asserted of both ends and tested by their one join.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Serialize)]
pub struct EndStanding {
    /// Which end.
    pub end: Side,
    /// What is asserted of it.
    pub property: Property,
    /// How that stands.
    pub standing: Standing,
}

impl fmt::Display for EndStanding {
    /// As the option is written: `left:zero-slope`, or `closed`.
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        match self.property {
            Property::Closed => f.write_str(self.property.word()),
            property => write!(f, "{}:{}", side_word(self.end), property.word()),
        }
    }
}

/// `zero-slope: not contradicted`, or end by end where the ends differ.
pub fn standings_text(standings: &[EndStanding]) -> String {
    match standings {
        [left, right] if (left.property, left.standing) == (right.property, right.standing) => {
            format!("{}: {}", left.property, left.standing.word())
        }
        ends => {
            let words: Vec<String> = ends.iter().map(|found| format!("{found}: {}", found.standing.word())).collect();
            words.join(", ")
        }
    }
}

/// A join this much rougher than the interior contradicts a smooth one (T > 4 refuted no true case among the trials).
const ROUGH_JOIN: f64 = 4.0;
/// An end value so many standard errors from zero contradicts a zero value, where it is also a visible share of the record.
const FAR_VALUE: f64 = 4.0;
/// The visible share, of the record's standard deviation.
const VISIBLE: f64 = 0.05;

impl Assertion {
    /// Checks every asserted end against a judgement of the record with standard deviation `deviation`, left end first.
    pub fn standings(&self, judgement: &Judgement, deviation: f64) -> Vec<EndStanding> {
        let joins = &judgement.structure;
        let by_join = |join: Option<f64>| match join {
            Some(ratio) if ratio > ROUGH_JOIN => Standing::Contradicted,
            Some(_) => Standing::NotContradicted,
            None => Standing::Untested,
        };
        let of = |property: Property, end: Side| match property {
            Property::Closed => by_join(joins.periodic.map(|join| join.ratio)),
            Property::ZeroSlope => {
                let join = if end == Side::Left { joins.even_left } else { joins.even_right };
                by_join(join.map(|join| join.ratio))
            }
            Property::ZeroValue => {
                let found = judgement.estimates.at(end);
                let far = found.value.abs() > FAR_VALUE * found.value_error && found.value.abs() > VISIBLE * deviation;
                if far { Standing::Contradicted } else { Standing::NotContradicted }
            }
        };
        [(Side::Left, self.left), (Side::Right, self.right)]
            .into_iter()
            .filter_map(|(end, property)| {
                property.map(|property| EndStanding { end, property, standing: of(property, end) })
            })
            .collect()
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn ends_are_asserted_together_or_apart() {
        let of = |texts: &[&str]| {
            let mut assertion = Assertion::default();
            texts.iter().try_for_each(|text| assertion.add(text)).map(|()| assertion.to_string())
        };
        assert_eq!(of(&["zero-slope"]), Ok("zero-slope".to_owned()));
        assert_eq!(of(&["left:zero-slope", "right:zero-value"]), Ok("left:zero-slope, right:zero-value".to_owned()));
        assert_eq!(of(&["closed"]), Ok("closed".to_owned()));
        for bad in [&["flat"][..], &["left:closed"], &["zero-slope", "left:zero-value"], &["up:closed"]] {
            assert!(of(bad).is_err(), "{bad:?}");
        }
    }
}
