//! `restore`: an archive back as a record.

use std::process::ExitCode;

use clap::{Arg, ArgAction, ArgMatches, Command};
use endgrain::error::{Error, Result};
use endgrain::settings::Group;
use endgrain::{job, report};

use crate::cli::compress::{output, outputs, tell};
use crate::cli::{args, exit, stream};

const GROUPS: &[Group] = &[Group::Cut, Group::Output];

const EXAMPLES: &str = "\
Examples:
  endgrain restore log.grain -o log.csv
  endgrain restore log.grain --from 2s --to 3s -o part.csv
  endgrain restore log.grain -o log.wav
  endgrain restore damaged.grain --recover -o rest.csv
";

/// The subcommand.
pub fn command() -> Command {
    args::subcommand("restore", "Bring an archived record, or a stretch of it, back", EXAMPLES, GROUPS)
        .arg(Arg::new("input").value_name("FILE").required(true).help("The archive, '-' for standard input"))
        .arg(output())
        .arg(
            Arg::new("recover")
                .long("recover")
                .action(ArgAction::SetTrue)
                .help_heading(Group::Repair.heading())
                .help("Restore the undamaged blocks of a damaged archive; what is lost is named, and stays blank"),
        )
        .arg(args::json())
        .arg(args::force("Report"))
        .after_help(exit::HELP)
}

/// Runs it.
///
/// # Errors
/// Whatever stops the job.
pub fn run(matches: &ArgMatches) -> Result<ExitCode> {
    let Some(file) = matches.get_one::<String>("input") else { return Err(Error::usage("no input file")) };
    let settings = args::settings(matches, GROUPS, Some(file))?;
    let (output, json) = outputs(matches, file, None)?;
    let damage = if matches.get_flag("recover") { job::Damage::Recover } else { job::Damage::Refuse };
    let result = job::restore(stream::input(file)?, output, &settings, damage)?;
    tell(matches, json, &report::to_json(&result)?, &report::restore_text(&result))?;
    Ok(ExitCode::SUCCESS)
}
