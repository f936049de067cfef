//! The program: reads the command line, runs one command, maps its outcome to an exit code.

mod cli;

use std::process::ExitCode;

fn main() -> ExitCode {
    cli::run()
}
