//! The commands of the program; each sees only the public library.

mod args;
mod audit;
mod batch;
mod compare;
mod compress;
mod condition;
mod exit;
mod generate;
mod machine;
mod merge;
mod progress;
mod restore;
mod spectrum;
mod stream;

use std::process::ExitCode;

use endgrain::error::Kind;

/// Reads the command line and runs one command.
pub fn run() -> ExitCode {
    stream::discard_partial_files_on_interrupt();
    let matches = args::command().get_matches();
    let outcome = match matches.subcommand() {
        Some(("condition", matches)) => condition::run(matches),
        Some(("compare", matches)) => compare::run(matches),
        Some(("spectrum", matches)) => spectrum::run(matches),
        Some(("audit", matches)) => audit::run(matches),
        Some(("compress", matches)) => compress::run(matches),
        Some(("restore", matches)) => restore::run(matches),
        Some(("batch", matches)) => batch::run(matches),
        Some(("merge", matches)) => merge::run(matches),
        Some(("generate", matches)) => generate::run(matches),
        _ => unreachable!("the parser requires a known command"),
    };
    match outcome {
        Ok(code) => code,
        // Whoever read our output has gone: there is nobody left to tell.
        Err(error) if error.kind() == Kind::Closed => ExitCode::SUCCESS,
        Err(error) => {
            stream::complain(&error);
            exit::code(&error)
        }
    }
}
