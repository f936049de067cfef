//! The roll-off shapes: how steeply a gain falls around its corner, chosen once for all filters of a run.

use std::fmt;

use serde::{Deserialize, Serialize};

use crate::error::{Error, Result};
use crate::record::Axis;

use super::corner::{Corner, ROUNDING, quoted};
use super::edge::{Edge, Rolloff};

/// A roll-off as asked for; it serialises as its text, `butterworth:4`.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
#[serde(try_from = "String", into = "String")]
pub enum Shape {
    /// Squared magnitude of a Butterworth low-pass of this order (1..=32), gain 0.5 at the corner.
    Butterworth(u8),
    /// The Gaussian of ISO 16610-21: gain 0.5 at the corner.
    Gaussian,
    /// Raised cosine over this full transition width, centred on the corner: gain 0.5 there.
    Cosine(Corner),
    /// 1 below the corner, 0.5 at it, 0 above.
    Brickwall,
}

impl Default for Shape {
    fn default() -> Self {
        Shape::Butterworth(4)
    }
}

/// A row of the table of shapes.
#[derive(Debug)]
pub struct ShapeRow {
    /// The name before the colon.
    pub name: &'static str,
    /// A whole example.
    pub example: &'static str,
    /// One line for help texts.
    pub help: &'static str,
    read: fn(Option<&str>) -> Result<Shape>,
}

/// All shapes, in the order of help texts.
pub static SHAPES: &[ShapeRow] = &[
    ShapeRow {
        name: "butterworth",
        example: "butterworth:4",
        help: "squared magnitude of order N (1..=32), zero phase, gain 0.5 at the corner",
        read: butterworth,
    },
    ShapeRow {
        name: "gaussian",
        example: "gaussian",
        help: "Gaussian profile filter, gain 0.5 at the corner (ISO 16610-21)",
        read: |argument| plain(argument, Shape::Gaussian),
    },
    ShapeRow {
        name: "cosine",
        example: "cosine:4Hz",
        help: "raised cosine over a full transition width, centred on the corner",
        read: cosine,
    },
    ShapeRow {
        name: "brickwall",
        example: "brickwall",
        help: "1 below the corner, 0 above: rings without end",
        read: |argument| plain(argument, Shape::Brickwall),
    },
];

impl Shape {
    /// Reads `butterworth:N`, `gaussian`, `cosine:WIDTH` or `brickwall`.
    ///
    /// # Errors
    /// `Usage` for another name, a missing, surplus or faulty argument.
    pub fn parse(text: &str) -> Result<Shape> {
        let text = text.trim();
        let (name, argument) = match text.split_once(':') {
            Some((name, argument)) => (name.trim(), Some(argument.trim())),
            None => (text, None),
        };
        let Some(row) = SHAPES.iter().find(|row| row.name == name) else {
            let examples: Vec<&str> = SHAPES.iter().map(|row| row.example).collect();
            return Err(Error::usage(format!("--shape: no shape {}", quoted(name)))
                .remedy(format!("write --shape as one of {}", examples.join(", "))));
        };
        (row.read)(argument).map_err(|e| {
            Error::usage(format!("--shape {name}: {}", e.what()))
                .remedy(format!("write it as in --shape {}", row.example))
        })
    }

    /// Gain of its high-pass at `ratio` times the corner; a raised cosine, whose width is no share of the corner, counts as
    /// a step.
    pub fn high_pass(&self, ratio: f64) -> f64 {
        let rolloff = match self {
            Shape::Butterworth(order) => Rolloff::Butterworth { order: i32::from(*order) },
            Shape::Gaussian => Rolloff::Gaussian,
            Shape::Cosine(_) | Shape::Brickwall => Rolloff::Brickwall,
        };
        Edge { corner: 1.0, rolloff }.split(ratio).1
    }

    /// The edge of this shape at a corner, in cycles per sample. `option` is the operator's, for errors.
    ///
    /// # Errors
    /// As `Corner::resolve`; `Unsupported` when a raised cosine does not fit between zero and the Nyquist frequency.
    pub(super) fn edge(&self, option: &str, corner: &Corner, axis: &Axis) -> Result<Edge> {
        let cycles = corner.resolve(option, axis)?;
        Ok(Edge { corner: cycles, rolloff: self.rolloff(option, cycles, corner, axis)? })
    }

    /// The roll-off of this shape around `cycles` per sample; `corner` gives the measure of a transition width.
    ///
    /// # Errors
    /// As `edge`.
    pub(super) fn rolloff(&self, option: &str, cycles: f64, corner: &Corner, axis: &Axis) -> Result<Rolloff> {
        Ok(match self {
            Shape::Butterworth(order) => Rolloff::Butterworth { order: i32::from(*order) },
            Shape::Gaussian => Rolloff::Gaussian,
            Shape::Brickwall => Rolloff::Brickwall,
            Shape::Cosine(width) => {
                let half = width.resolve_width("--shape", corner, axis)? / 2.0;
                if half > cycles * (1.0 + ROUNDING) || cycles + half > 0.5 * (1.0 + ROUNDING) {
                    return Err(Error::unsupported(format!(
                        "--shape {self}: the transition about {option} {corner} does not fit between zero and the Nyquist frequency"
                    ))
                    .remedy("choose a narrower transition for --shape"));
                }
                // A transition that begins at zero begins there exactly, however its corner was written.
                let half_width = if half > cycles * (1.0 - ROUNDING) { cycles } else { half };
                if cycles / half_width > 1e15 {
                    return Err(Error::unsupported(format!(
                        "--shape {self}: too narrow a transition about {option} {corner} to be told from a step"
                    ))
                    .remedy("use --shape brickwall"));
                }
                Rolloff::Cosine { half_width }
            }
        })
    }
}

impl fmt::Display for Shape {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        match self {
            Shape::Butterworth(order) => write!(f, "butterworth:{order}"),
            Shape::Gaussian => f.write_str("gaussian"),
            Shape::Cosine(width) => write!(f, "cosine:{width}"),
            Shape::Brickwall => f.write_str("brickwall"),
        }
    }
}

impl TryFrom<String> for Shape {
    type Error = Error;
    fn try_from(text: String) -> Result<Shape> {
        Shape::parse(&text)
    }
}

impl From<Shape> for String {
    fn from(shape: Shape) -> String {
        shape.to_string()
    }
}

fn butterworth(argument: Option<&str>) -> Result<Shape> {
    let Some(argument) = argument else {
        return Err(Error::usage("the order is missing"));
    };
    match argument.parse::<u8>() {
        Ok(order @ 1..=32) => Ok(Shape::Butterworth(order)),
        _ => Err(Error::usage(format!("{}: no order from 1 to 32", quoted(argument)))),
    }
}

fn cosine(argument: Option<&str>) -> Result<Shape> {
    match argument {
        Some(argument) => Ok(Shape::Cosine(Corner::parse(argument)?)),
        None => Err(Error::usage("the transition width is missing")),
    }
}

fn plain(argument: Option<&str>, shape: Shape) -> Result<Shape> {
    match argument {
        Some(argument) => Err(Error::usage(format!("{}: takes no argument", quoted(argument)))),
        None => Ok(shape),
    }
}

#[cfg(test)]
mod tests {
    use proptest::prelude::*;

    use super::*;
    use crate::record::RateSource;

    #[test]
    fn every_row_reads_its_own_example() {
        for row in SHAPES {
            let shape = Shape::parse(row.example).unwrap();
            assert_eq!(shape.to_string(), row.example);
            let json = serde_json::to_string(&shape).unwrap();
            assert_eq!(json, format!("{:?}", row.example));
            assert_eq!(serde_json::from_str::<Shape>(&json).unwrap(), shape);
        }
        assert_eq!(Shape::default().to_string(), "butterworth:4");
    }

    #[test]
    fn faulty_shapes_are_refused_in_full() {
        for (text, message) in [
            (
                "bessel:4",
                "--shape: no shape \"bessel\"; write --shape as one of butterworth:4, gaussian, cosine:4Hz, brickwall",
            ),
            ("butterworth", "--shape butterworth: the order is missing; write it as in --shape butterworth:4"),
            (
                "butterworth:0",
                "--shape butterworth: \"0\": no order from 1 to 32; write it as in --shape butterworth:4",
            ),
            (
                "butterworth:33",
                "--shape butterworth: \"33\": no order from 1 to 32; write it as in --shape butterworth:4",
            ),
            (
                "butterworth:1e1",
                "--shape butterworth: \"1e1\": no order from 1 to 32; write it as in --shape butterworth:4",
            ),
            ("gaussian:2", "--shape gaussian: \"2\": takes no argument; write it as in --shape gaussian"),
            ("cosine", "--shape cosine: the transition width is missing; write it as in --shape cosine:4Hz"),
            ("cosine:4", "--shape cosine: \"4\": a corner without a unit; write it as in --shape cosine:4Hz"),
        ] {
            assert_eq!(Shape::parse(text).expect_err(text).to_string(), message);
        }
    }

    #[test]
    fn a_raised_cosine_must_fit() {
        let axis = Axis::from_rate_hz(100.0, 1000, RateSource::Given).unwrap();
        let edge = |shape: &str, corner: &str| {
            Shape::parse(shape).unwrap().edge("--lowpass", &Corner::parse(corner).unwrap(), &axis)
        };
        assert_eq!(edge("cosine:4Hz", "2Hz").unwrap().rolloff, Rolloff::Cosine { half_width: 0.02 });
        assert_eq!(edge("cosine:4Hz", "0.5s").unwrap().rolloff, Rolloff::Cosine { half_width: 0.02 });
        assert!(edge("cosine:20Hz", "40Hz").is_ok());
        let message = |corner: &str| {
            format!(
                "--shape cosine:4Hz: the transition about --lowpass {corner} does not fit between zero and the Nyquist frequency; choose a narrower transition for --shape"
            )
        };
        for corner in ["1.9Hz", "48.5Hz"] {
            assert_eq!(edge("cosine:4Hz", corner).unwrap_err().to_string(), message(corner));
        }
        assert_eq!(
            edge("cosine:4mm", "2Hz").unwrap_err().to_string(),
            "--shape 4mm: a corner in length, but the record's axis is time in s; give --shape as in 40Hz or 2.5s"
        );
        assert!(edge("cosine:1e-300Hz", "2Hz").is_err());
    }

    proptest! {
        #[test]
        fn no_text_panics(text in ".{0,40}", near in "(butterworth|gaussian|cosine|brickwall)?:?[-0-9.eE]{0,6}(Hz|s|mm)?") {
            for text in [text, near] {
                if let Ok(shape) = Shape::parse(&text) {
                    prop_assert_eq!(Shape::parse(&shape.to_string()).unwrap(), shape);
                }
            }
        }
    }
}
