//! `audit`: what is in a record and whether it is fit.

use std::io::Write;
use std::path::PathBuf;
use std::process::ExitCode;

use clap::builder::PossibleValuesParser;
use clap::{Arg, ArgAction, ArgMatches, Command};
use endgrain::error::{Error, Kind, Result};
use endgrain::settings::Group;
use endgrain::write::{Overwrite, Pending};
use endgrain::{job, report};

use crate::cli::{args, exit, stream};

const GROUPS: &[Group] = &[Group::Cut, Group::Repair, Group::Input];

const EXAMPLES: &str = "\
Examples:
  endgrain audit log.csv
  endgrain audit log.wav --json
  endgrain audit log.csv --channel ax --rate 200
  endgrain audit *.csv --require clean --quiet || echo 'look at them first'
";

/// The subcommand.
pub fn command() -> Command {
    args::subcommand("audit", "Tell what is in a record and whether it is fit", EXAMPLES, GROUPS)
        .arg(
            Arg::new("input")
                .value_name("FILE")
                .required(true)
                .num_args(1..)
                .help("Records: CSV or WAV, packed by gzip or Zstandard or not, '-' for standard input"),
        )
        .arg(
            Arg::new("require")
                .long("require")
                .value_name("WHAT")
                .value_parser(PossibleValuesParser::new(["clean"]))
                .help_heading(Group::Judgement.heading())
                .help("Exit with 1 unless nothing at all was noted: no gap, guess, clipping, spike or dead channel"),
        )
        .arg(
            Arg::new("force")
                .long("force")
                .action(ArgAction::SetTrue)
                .help_heading("Report")
                .help("Replace the JSON file that is in the way"),
        )
        .after_help(exit::HELP)
}

/// Runs it: one block a file. A file that cannot be read is told and left out; the exit code is that of the first.
///
/// # Errors
/// Whatever stops the outputs.
pub fn run(matches: &ArgMatches) -> Result<ExitCode> {
    let mut settings = args::settings(matches, GROUPS)?;
    if let Some(what) = matches.get_one::<String>("require") {
        settings.set("require", what)?;
    }
    let json = matches.get_one::<String>("json").map(PathBuf::from);
    let overwrite = if matches.get_flag("force") { Overwrite::Force } else { Overwrite::Refuse };
    let to_file = json.as_ref().filter(|path| !stream::is_stdout(path));
    let file = to_file.map(|path| Pending::create(path, &[], overwrite)).transpose()?;
    let mut audited = Vec::new();
    let mut failed: Option<Error> = None;
    let mut met = true;
    for path in matches.get_many::<String>("input").into_iter().flatten() {
        match stream::input(path).and_then(|input| job::audit(input, &settings)) {
            Ok(report) => {
                if json.is_none() && !matches.get_flag("quiet") {
                    stream::print(&report::audit_text(&report))?;
                }
                met &= report.requirement_met;
                audited.push(report::Audited::Read(Box::new(report)));
            }
            Err(error) if error.kind() == Kind::Closed => return Err(error),
            Err(error) => {
                stream::complain(&error);
                audited.push(report::Audited::refused(path, &error));
                failed.get_or_insert(error);
            }
        }
    }
    match (file, &json) {
        (Some(mut out), _) => {
            out.write_all(report::to_json(&audited)?.as_bytes()).map_err(Error::from)?;
            out.finish()?;
        }
        (None, Some(_)) => stream::print(&report::to_json(&audited)?)?,
        (None, None) => {}
    }
    Ok(match failed {
        Some(error) => exit::code(&error),
        None if met => ExitCode::SUCCESS,
        None => ExitCode::from(exit::NOT_MET),
    })
}
