//! The end conditions of an integral: what is known of the motion at the record's two ends, under names of our own.

use std::fmt;
use std::str::FromStr;

use serde::Serialize;

use crate::error::{Error, Result};

use super::corner::quoted;
use super::quantity::Quantity;

/// What settles the constants of an integral. "First integral" is the velocity of an acceleration record, "second
/// integral" its displacement; x = 0 and x = L are the record's ends, b is a constant offset of the sensor and c a drift
/// of it per unit of x about the middle.
#[derive(Debug, Clone, PartialEq)]
pub enum Conditions {
    /// Both integrals are zero at x = 0. Offset and drift stay as they are given.
    StartRest,
    /// The first integral is zero at both ends: solves the offset.
    Rest,
    /// As `Rest`, and the second integral ends at this value: solves offset and drift.
    RestTo(Quantity),
    /// Both integrals are zero at x = 0 and the second ends at this value: solves the offset.
    StartRestTo(Quantity),
    /// The second integral is zero at x = 0 and ends at this value (zero when none is given): solves the initial first
    /// integral.
    Pinned(Option<Quantity>),
    /// Whole cycles: means of record and integrals are zero. For periodic ends.
    ZeroMean,
    /// The least mean square of the last integral over its constants, the offset and, unless it is left out, the drift.
    Steady(Drift),
    /// The first integral is zero in these stretches of the axis, as nearly as constant, offset and (from two stretches
    /// on) drift allow.
    Still(Vec<[Quantity; 2]>),
}

/// Whether the drift of the sensor is solved too.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Drift {
    /// The offset alone.
    Ignored,
    /// Offset and drift.
    Solved,
}

/// What the motion at the ends must be for conditions to hold.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Serialize)]
#[serde(rename_all = "snake_case")]
pub enum Needs {
    /// The record starts at rest.
    RestAtStart,
    /// The record starts and ends at rest.
    RestAtBothEnds,
    /// The motion goes on past both ends much as inside.
    Motion,
    /// Nothing that the ends of the record could show.
    Nothing,
}

/// A row of the table of end conditions.
pub struct ConditionsRow {
    /// The name before the `=`.
    pub name: &'static str,
    /// A whole example.
    pub example: &'static str,
    /// One line for help texts.
    pub help: &'static str,
    /// What the motion at the ends must be.
    pub needs: Needs,
    /// Whether they say something about the second integral, so that there must be two.
    pub twice: bool,
    read: fn(Option<&str>) -> Result<Conditions>,
}

/// All end conditions, in the order of help texts.
pub static CONDITIONS: &[ConditionsRow] = &[
    ConditionsRow {
        name: "start-rest",
        example: "start-rest",
        help: "at rest at the start; nothing is known of the end",
        needs: Needs::RestAtStart,
        twice: false,
        read: |argument| plain(argument, Conditions::StartRest),
    },
    ConditionsRow {
        name: "rest",
        example: "rest",
        help: "at rest at both ends: solves the sensor's offset",
        needs: Needs::RestAtBothEnds,
        twice: false,
        read: |argument| plain(argument, Conditions::Rest),
    },
    ConditionsRow {
        name: "rest-to",
        example: "rest-to=0.25m",
        help: "at rest at both ends, displaced by that much: solves offset and drift",
        needs: Needs::RestAtBothEnds,
        twice: true,
        read: |argument| Ok(Conditions::RestTo(needed(argument)?)),
    },
    ConditionsRow {
        name: "start-rest-to",
        example: "start-rest-to=0.25m",
        help: "at rest at the start, displaced by that much at the end: solves the offset",
        needs: Needs::RestAtStart,
        twice: true,
        read: |argument| Ok(Conditions::StartRestTo(needed(argument)?)),
    },
    ConditionsRow {
        name: "pinned",
        example: "pinned=0mm",
        help: "displacement known at both ends (0 unless given): solves the initial velocity",
        needs: Needs::Nothing,
        twice: true,
        read: |argument| Ok(Conditions::Pinned(argument.map(Quantity::parse).transpose()?)),
    },
    ConditionsRow {
        name: "zero-mean",
        example: "zero-mean",
        help: "a whole number of cycles, with --extension periodic: every mean is zero",
        needs: Needs::Motion,
        twice: false,
        read: |argument| plain(argument, Conditions::ZeroMean),
    },
    ConditionsRow {
        name: "steady",
        example: "steady",
        help: "motion about a fixed place: constants, offset and drift by least squares (steady:offset leaves the drift)",
        needs: Needs::Motion,
        twice: false,
        read: |argument| plain(argument, Conditions::Steady(Drift::Solved)),
    },
    ConditionsRow {
        name: "still",
        example: "still=0s..1.5s,8s..10s",
        help: "at rest in these stretches: solves the offset and, from two on, the drift",
        needs: Needs::Nothing,
        twice: false,
        read: |argument| still(argument),
    },
];

impl Conditions {
    /// The row of the table.
    pub fn row(&self) -> &'static ConditionsRow {
        let name = match self {
            Conditions::StartRest => "start-rest",
            Conditions::Rest => "rest",
            Conditions::RestTo(_) => "rest-to",
            Conditions::StartRestTo(_) => "start-rest-to",
            Conditions::Pinned(_) => "pinned",
            Conditions::ZeroMean => "zero-mean",
            Conditions::Steady(_) => "steady",
            Conditions::Still(_) => "still",
        };
        CONDITIONS.iter().find(|row| row.name == name).unwrap_or(&CONDITIONS[0])
    }

    /// True where the offset is not solved, so that one may be given.
    pub fn takes_offset(&self) -> bool {
        matches!(self, Conditions::StartRest | Conditions::Pinned(_))
    }

    /// Every spelling by example, for remedies.
    pub fn examples() -> String {
        CONDITIONS.iter().map(|row| row.example).collect::<Vec<_>>().join(", ")
    }
}

impl FromStr for Conditions {
    type Err = Error;

    fn from_str(text: &str) -> Result<Conditions> {
        let text = text.trim();
        if text == "steady:offset" {
            return Ok(Conditions::Steady(Drift::Ignored));
        }
        let (name, argument) = match text.split_once('=') {
            Some((name, argument)) => (name.trim(), Some(argument.trim())),
            None => (text, None),
        };
        let Some(row) = CONDITIONS.iter().find(|row| row.name == name) else {
            return Err(Error::usage(format!("no end conditions {}", quoted(text)))
                .remedy(format!("use one of {}", Conditions::examples())));
        };
        (row.read)(argument)
            .map_err(|error| Error::usage(error.what()).remedy(format!("write it as in {}", row.example)))
    }
}

impl fmt::Display for Conditions {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        f.write_str(self.row().name)?;
        match self {
            Conditions::RestTo(value) | Conditions::StartRestTo(value) | Conditions::Pinned(Some(value)) => {
                write!(f, "={value}")
            }
            Conditions::Steady(Drift::Ignored) => f.write_str(":offset"),
            Conditions::Still(stretches) => {
                for (index, [from, to]) in stretches.iter().enumerate() {
                    let mark = if index == 0 { '=' } else { ',' };
                    write!(f, "{mark}{from}..{to}")?;
                }
                Ok(())
            }
            _ => Ok(()),
        }
    }
}

/// The sensor's offset where the end conditions do not solve it: a value, or the mean over a quiet stretch.
#[derive(Debug, Clone, PartialEq)]
pub enum Offset {
    /// In the unit of the record, or one that converts to it.
    Value(Quantity),
    /// The mean of the record over this stretch of the axis.
    Stretch([Quantity; 2]),
}

impl FromStr for Offset {
    type Err = Error;

    fn from_str(text: &str) -> Result<Offset> {
        let read = if text.contains("..") {
            stretch(text).map(Offset::Stretch)
        } else {
            Quantity::parse(text).map(Offset::Value)
        };
        read.map_err(|error| {
            Error::usage(error.what())
                .remedy("write a value with its unit, or a quiet stretch, as in 0.02m/s2 or 0s..1.5s")
        })
    }
}

impl fmt::Display for Offset {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        match self {
            Offset::Value(value) => write!(f, "{value}"),
            Offset::Stretch([from, to]) => write!(f, "{from}..{to}"),
        }
    }
}

fn plain(argument: Option<&str>, conditions: Conditions) -> Result<Conditions> {
    match argument {
        Some(argument) => Err(Error::usage(format!("{}: takes no argument", quoted(argument)))),
        None => Ok(conditions),
    }
}

fn needed(argument: Option<&str>) -> Result<Quantity> {
    Quantity::parse(argument.ok_or_else(|| Error::usage("the displacement is missing"))?)
}

fn still(argument: Option<&str>) -> Result<Conditions> {
    let text = argument.ok_or_else(|| Error::usage("the stretches are missing"))?;
    Ok(Conditions::Still(text.split(',').map(stretch).collect::<Result<_>>()?))
}

fn stretch(text: &str) -> Result<[Quantity; 2]> {
    let (from, to) = text.split_once("..").ok_or_else(|| Error::usage(format!("{}: no stretch", quoted(text))))?;
    Ok([Quantity::parse(from)?, Quantity::parse(to)?])
}

#[cfg(test)]
mod tests {
    use proptest::prelude::*;

    use super::*;

    #[test]
    fn every_row_reads_its_own_example() {
        for row in CONDITIONS {
            let read: Conditions = row.example.parse().expect(row.example);
            assert_eq!(read.to_string(), row.example);
            assert_eq!(read.row().name, row.name);
        }
        let both: Conditions = "steady:offset".parse().expect("known");
        assert_eq!(both, Conditions::Steady(Drift::Ignored));
        assert_eq!(both.to_string(), "steady:offset");
    }

    #[test]
    fn faults_name_the_way_out() {
        for (text, message) in [
            ("rest-to", "the displacement is missing; write it as in rest-to=0.25m"),
            ("rest-to=3", "\"3\": a number without a unit; write it as in rest-to=0.25m"),
            ("rest=3m", "\"3m\": takes no argument; write it as in rest"),
            ("still=2s", "\"2s\": no stretch; write it as in still=0s..1.5s,8s..10s"),
        ] {
            assert_eq!(text.parse::<Conditions>().expect_err(text).to_string(), message);
        }
        assert!(
            "settled".parse::<Conditions>().expect_err("unknown").to_string().contains("use one of start-rest, rest,")
        );
        for text in ["0.1g", "0s..2s"] {
            assert_eq!(text.parse::<Offset>().expect(text).to_string(), text);
        }
    }

    proptest! {
        #[test]
        fn no_text_panics(text in ".{0,30}", near in "(rest-to|still|pinned|steady)[=:]{0,2}[-0-9.es,m]{0,12}") {
            for text in [text, near] {
                if let Ok(read) = text.parse::<Conditions>() {
                    prop_assert_eq!(read.to_string().parse::<Conditions>().expect("its own spelling"), read);
                }
                let _ = text.parse::<Offset>();
            }
        }
    }
}
