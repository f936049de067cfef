//! Exit codes, one a kind of fault.

use std::process::ExitCode;

use endgrain::error::{Error, Kind};

/// Complete, but a requirement was not met.
pub const NOT_MET: u8 = 1;

/// A batch is complete, but some records failed.
pub const SOME_FAILED: u8 = 5;

/// A merge lacks results, or has some that do not fit.
pub const INCOMPLETE: u8 = 6;

/// Interrupted: run it again.
pub const INTERRUPTED: u8 = 75;

/// The exit code of an error.
pub fn code(error: &Error) -> ExitCode {
    ExitCode::from(match error.kind() {
        Kind::Closed => 0,
        Kind::Usage => 2,
        Kind::Malformed => 3,
        Kind::Unsupported => 4,
        Kind::Io => 74,
        Kind::Interrupted => 75,
    })
}

/// The table for help texts.
pub const HELP: &str = "\
Exit codes:
  0   done; notes may have been printed
  1   complete, but a --require was not met
  2   the request contradicts itself or asks for something unknown
  3   the input is unreadable or malformed
  4   the data cannot support the request
  5   a batch is complete, but some records failed
  6   a merge is incomplete: missing, mismatched or extra results
  74  input/output: disk full, permission, a file in the way
  75  interrupted or temporary: run it again";
