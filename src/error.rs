//! What went wrong, where, and what would settle it; and remarks that do not stop a run.

use std::fmt;

use serde::Serialize;

use crate::place::Place;

/// What kind of fault stops a run. Each kind has one exit code of the program.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Hash, Serialize)]
#[serde(rename_all = "snake_case")]
pub enum Kind {
    /// The request contradicts itself or asks for something unknown (exit code 2).
    Usage,
    /// The input is unreadable or malformed (exit code 3).
    Malformed,
    /// The data are sound but cannot support the request (exit code 4).
    Unsupported,
    /// The system refused: permission, space, a file in the way (exit code 74).
    Io,
    /// Interrupted; run it again (exit code 75).
    Interrupted,
    /// The reader of an output pipe went away: the program ends quietly (exit code 0).
    Closed,
}

/// An error: where, then what, then what would do.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Error {
    kind: Kind,
    place: Box<Place>,
    what: String,
    remedy: Option<String>,
}

/// The result of everything that can fail here.
pub type Result<T> = std::result::Result<T, Error>;

impl Error {
    /// A new error of a kind; `what` says what was found, without a final stop.
    pub fn new(kind: Kind, what: impl Into<String>) -> Self {
        Self { kind, place: Box::default(), what: what.into(), remedy: None }
    }

    /// The request is at fault.
    pub fn usage(what: impl Into<String>) -> Self {
        Self::new(Kind::Usage, what)
    }

    /// The input is at fault.
    pub fn malformed(what: impl Into<String>) -> Self {
        Self::new(Kind::Malformed, what)
    }

    /// The data cannot support the request.
    pub fn unsupported(what: impl Into<String>) -> Self {
        Self::new(Kind::Unsupported, what)
    }

    /// The system refused.
    pub fn io(what: impl Into<String>) -> Self {
        Self::new(Kind::Io, what)
    }

    /// Adds where it happened; what is already known wins.
    #[must_use]
    pub fn at(mut self, place: Place) -> Self {
        *self.place = std::mem::take(&mut *self.place).within(&place);
        self
    }

    /// Adds what would settle it.
    #[must_use]
    pub fn remedy(mut self, remedy: impl Into<String>) -> Self {
        self.remedy = Some(remedy.into());
        self
    }

    /// The kind, which decides the exit code.
    pub fn kind(&self) -> Kind {
        self.kind
    }

    /// Where it happened.
    pub fn place(&self) -> &Place {
        &self.place
    }

    /// What was found.
    pub fn what(&self) -> &str {
        &self.what
    }

    /// What would settle it, where something would.
    pub fn advice(&self) -> Option<&str> {
        self.remedy.as_deref()
    }
}

impl fmt::Display for Error {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        if !self.place.is_nowhere() {
            write!(f, "{}: ", self.place)?;
        }
        f.write_str(&self.what)?;
        if let Some(remedy) = &self.remedy {
            write!(f, "; {remedy}")?;
        }
        Ok(())
    }
}

impl std::error::Error for Error {}

impl From<std::io::Error> for Error {
    fn from(error: std::io::Error) -> Self {
        // A stream of ours that tells what is wrong with its contents.
        let error = match error.downcast::<Error>() {
            Ok(own) => return own,
            Err(error) => error,
        };
        let kind = if error.kind() == std::io::ErrorKind::BrokenPipe { Kind::Closed } else { Kind::Io };
        Self::new(kind, error.to_string())
    }
}

/// A remark with a place. It travels beside the value; `--strict` turns it into an error.
#[derive(Debug, Clone, PartialEq, Eq, Serialize)]
pub struct Finding {
    /// A short stable name, such as `epoch_unit`: JSON readers may match on it.
    pub code: &'static str,
    /// One sentence for people.
    pub text: String,
    /// Where, as far as it is known.
    pub place: Place,
}

impl Finding {
    /// A remark without a place.
    pub fn new(code: &'static str, text: impl Into<String>) -> Self {
        Self { code, text: text.into(), place: Place::default() }
    }

    /// Adds where; what is already known wins.
    #[must_use]
    pub fn at(mut self, place: Place) -> Self {
        self.place = std::mem::take(&mut self.place).within(&place);
        self
    }
}

impl fmt::Display for Finding {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        if self.place.is_nowhere() { f.write_str(&self.text) } else { write!(f, "{}: {}", self.place, self.text) }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn an_error_tells_where_then_what_then_what_would_do() {
        let error = Error::malformed("not a number: \"x\"")
            .at(Place::field(3, 7))
            .at(Place::file("bad.csv"))
            .remedy("declare it with --missing x");
        assert_eq!(error.to_string(), "bad.csv:3:7: not a number: \"x\"; declare it with --missing x");
    }
}
