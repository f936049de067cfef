//! `audit`: what is in a record and whether it is fit.

use std::path::PathBuf;
use std::process::ExitCode;

use clap::{Arg, ArgMatches, Command};
use endgrain::error::{Error, Result};
use endgrain::settings::Group;
use endgrain::{job, report};

use crate::cli::{args, exit, stream};

const GROUPS: &[Group] = &[Group::Cut, Group::Repair, Group::Input];

const EXAMPLES: &str = "\
Examples:
  endgrain audit log.csv
  endgrain audit log.wav --json
  endgrain audit log.csv --channel ax --rate 200
";

/// The subcommand.
pub fn command() -> Command {
    args::subcommand("audit", "Tell what is in a record and whether it is fit", EXAMPLES, GROUPS)
        .arg(
            Arg::new("input")
                .value_name("FILE")
                .required(true)
                .num_args(1..)
                .help("Records: CSV or WAV, '-' for standard input"),
        )
        .after_help(exit::HELP)
}

/// Runs it: one block a file, the first error ends it.
///
/// # Errors
/// Whatever stops a reader.
pub fn run(matches: &ArgMatches) -> Result<ExitCode> {
    let settings = args::settings(matches, GROUPS)?;
    let json = matches.get_one::<String>("json").map(PathBuf::from);
    let mut reports = Vec::new();
    for file in matches.get_many::<String>("input").into_iter().flatten() {
        let report = job::audit(stream::input(file)?, &settings)?;
        if json.is_none() && !matches.get_flag("quiet") {
            stream::print(&report::audit_text(&report))?;
        }
        reports.push(report);
    }
    match json {
        Some(path) if stream::is_stdout(&path) => stream::print(&report::to_json(&reports)?)?,
        Some(path) => {
            let mut out = endgrain::write::Pending::create(&path, &[], endgrain::write::Overwrite::Refuse)?;
            std::io::Write::write_all(&mut out, report::to_json(&reports)?.as_bytes()).map_err(Error::from)?;
            out.finish()?;
        }
        None => {}
    }
    Ok(ExitCode::SUCCESS)
}
