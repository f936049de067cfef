//! Why nothing could be said about the ends of a record.

use std::fmt;

use serde::Serialize;

use super::{SHORTEST_RECORD, SHORTEST_WAVELENGTH};
use crate::forecast::Response;

/// The reason why a record was not judged under an operator.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Serialize)]
#[serde(rename_all = "snake_case")]
pub enum Unjudged {
    /// Nothing is done to the record: what lies past its ends does not matter.
    NoOperator,
    /// The operators have no corner, which would tell how far an end is felt.
    NoCorner,
    /// An integral keeps zero frequency: every sample depends on everything outside.
    KeepsOffset,
    /// The record is constant: every extension that keeps a constant is right.
    Constant,
    /// The record is constant, and the extension in use turns its sign at an end.
    ConstantTurned,
    /// The record has too few samples.
    Short,
    /// A corner of too few samples.
    Coarse,
    /// The shortest corner wavelength is many times the record.
    FewBlocks,
    /// The output under the forecast is zero everywhere, or too large for a double.
    Unformed,
}

impl Unjudged {
    /// The reason that a record and an operator give, where they give one.
    pub fn of(samples: &[f64], response: &Response) -> Option<Unjudged> {
        if samples.windows(2).all(|w| w[0] == w[1]) {
            Some(Unjudged::Constant)
        } else if samples.len() < SHORTEST_RECORD {
            Some(Unjudged::Short)
        } else if response.shape().shortest_wavelength < SHORTEST_WAVELENGTH {
            Some(Unjudged::Coarse)
        } else {
            None
        }
    }

    /// True where no assumption about the ends could be wrong, so that nothing need be judged.
    pub fn is_harmless(self) -> bool {
        matches!(self, Unjudged::NoOperator | Unjudged::Constant)
    }
}

impl fmt::Display for Unjudged {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        match self {
            Unjudged::NoOperator => f.write_str("there is no operator, so nothing depends on the ends"),
            Unjudged::NoCorner => f.write_str("the operators have no corner"),
            Unjudged::KeepsOffset => f.write_str("an integral without a high-pass keeps zero frequency"),
            Unjudged::Constant => f.write_str("the record is constant"),
            Unjudged::ConstantTurned => {
                f.write_str("the record is constant, and the extension turns its sign at an end")
            }
            Unjudged::Short => write!(f, "the record is shorter than {SHORTEST_RECORD} samples"),
            Unjudged::Coarse => {
                write!(f, "a corner wavelength is shorter than {SHORTEST_WAVELENGTH} samples")
            }
            Unjudged::FewBlocks => f.write_str("every corner wavelength is many times the record"),
            Unjudged::Unformed => f.write_str("the output is zero everywhere, or cannot be formed"),
        }
    }
}
