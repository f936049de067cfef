//! The stage as the user asks for it: extension, baseline and seat.

use std::fmt;
use std::str::FromStr;

use crate::baseline::BaselineKind;
use crate::ends::{Ends, Seat};
use crate::error::{Error, Result};

/// Which continuation past the ends is asked for.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Hash)]
pub enum ExtensionChoice {
    /// A continuation by name.
    Fixed(Ends),
}

impl ExtensionChoice {
    /// Every spelling that `from_str` takes, for help texts.
    pub const SPELLINGS: &'static str = "periodic, even, odd, even-odd, odd-even";
}

impl FromStr for ExtensionChoice {
    type Err = Error;

    fn from_str(text: &str) -> Result<Self> {
        let fixed = [Ends::Periodic, Ends::EVEN, Ends::ODD, Ends::EVEN_ODD, Ends::ODD_EVEN];
        fixed.into_iter().find(|ends| ends.name() == text).map(Self::Fixed).ok_or_else(|| {
            Error::usage(format!("not an extension: {text:?}")).remedy(format!("use one of {}", Self::SPELLINGS))
        })
    }
}

impl fmt::Display for ExtensionChoice {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        match self {
            Self::Fixed(ends) => f.write_str(ends.name()),
        }
    }
}

/// Extension, baseline and seat; what is left open is decided by the chain and the record.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Default)]
pub struct Stage {
    /// The continuation; `None` is the default.
    pub extension: Option<ExtensionChoice>,
    /// The baseline; `None` is the one that goes with ends and chain.
    pub baseline: Option<BaselineKind>,
    /// The seat of the mirrors.
    pub seat: Seat,
}
