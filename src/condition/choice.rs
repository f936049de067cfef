//! The stage as the user asks for it: extension, baseline and seat.

use std::fmt;
use std::str::FromStr;

use crate::baseline::BaselineKind;
use crate::ends::{Ends, Seat};
use crate::error::{Error, Result};

/// Which continuation past the ends is asked for.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Hash, Default)]
pub enum ExtensionChoice {
    /// An asserted structure, else a closed record that proves itself, else the forecast.
    #[default]
    Auto,
    /// The verdict's pick among the cosine, sine and periodic bases.
    Symmetric,
    /// The record's own past continues it past both ends.
    Forecast,
    /// A continuation by name.
    Fixed(Ends),
}

impl ExtensionChoice {
    /// Every spelling that `from_str` takes, for help texts.
    pub const SPELLINGS: &'static str = "auto, symmetric, forecast, periodic, even, odd, even-odd, odd-even";
}

impl FromStr for ExtensionChoice {
    type Err = Error;

    fn from_str(text: &str) -> Result<Self> {
        match text {
            "auto" => return Ok(Self::Auto),
            "symmetric" => return Ok(Self::Symmetric),
            "forecast" => return Ok(Self::Forecast),
            _ => {}
        }
        let fixed = [Ends::Periodic, Ends::EVEN, Ends::ODD, Ends::EVEN_ODD, Ends::ODD_EVEN];
        fixed.into_iter().find(|ends| ends.name() == text).map(Self::Fixed).ok_or_else(|| {
            Error::usage(format!("not an extension: {text:?}")).remedy(format!("use one of {}", Self::SPELLINGS))
        })
    }
}

impl fmt::Display for ExtensionChoice {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        match self {
            Self::Auto => f.write_str("auto"),
            Self::Symmetric => f.write_str("symmetric"),
            Self::Forecast => f.write_str("forecast"),
            Self::Fixed(ends) => f.write_str(ends.name()),
        }
    }
}

/// Extension, baseline and seat; what is left open is decided by the chain and the record.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Default)]
pub struct Stage {
    /// The continuation.
    pub extension: ExtensionChoice,
    /// The baseline; `None` is the one that goes with ends and chain.
    pub baseline: Option<BaselineKind>,
    /// The seat of the mirrors.
    pub seat: Seat,
}
