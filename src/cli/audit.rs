//! `audit`: what is in a record and whether it is fit.

use std::io::Write;
use std::path::{Path, PathBuf};
use std::process::ExitCode;

use clap::builder::PossibleValuesParser;
use clap::{Arg, ArgMatches, Command};
use endgrain::error::{Error, Result};
use endgrain::job::Examined;
use endgrain::place::Place;
use endgrain::settings::Group;
use endgrain::write::Pending;
use endgrain::{job, report};

use crate::cli::{args, exit, stream};

const GROUPS: &[Group] = &[Group::Cut, Group::Repair, Group::Input];

const EXAMPLES: &str = "\
Examples:
  endgrain audit log.csv
  endgrain audit log.wav --json
  endgrain audit log.csv --channel ax --rate 200
  endgrain audit log.grain
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
                .help("Records: CSV, WAV (packed by gzip or Zstandard or not) or archives, '-' for standard input"),
        )
        .arg(
            Arg::new("require")
                .long("require")
                .value_name("WHAT")
                .value_parser(PossibleValuesParser::new(["clean"]))
                .help_heading(Group::Judgement.heading())
                .help("Exit with 1 unless nothing at all was noted: no gap, guess, clipping, spike or dead channel"),
        )
        .arg(args::json())
        .arg(args::force("Report"))
        .after_help(exit::HELP)
}

/// Runs it: one block a file. A file that cannot be audited is told and passed over; the first such fault decides the exit
/// code.
///
/// # Errors
/// Whatever stops the report from being written.
pub fn run(matches: &ArgMatches) -> Result<ExitCode> {
    let files: Vec<&String> = matches.get_many::<String>("input").into_iter().flatten().collect();
    let inputs: Vec<&Path> = files.iter().map(Path::new).collect();
    let json = matches.get_one::<String>("json").map(PathBuf::from);
    let mut output = match &json {
        Some(path) if !stream::is_stdout(path) => Some(Pending::create(path, &inputs, args::overwrite(matches))?),
        _ => None,
    };
    let (mut reports, mut outcome, mut met) = (Vec::new(), ExitCode::SUCCESS, true);
    for file in files {
        let mut settings = args::settings(matches, GROUPS, Some(file))?;
        if let Some(what) = matches.get_one::<String>("require") {
            settings.set("require", what)?;
        }
        match stream::input(file).and_then(|input| job::examine(input, &settings)) {
            Ok(report) => {
                if json.is_none() && !matches.get_flag("quiet") {
                    stream::print(&match &report {
                        Examined::Record(report) => report::audit_text(report),
                        Examined::Archive(listing) => report::listing_text(listing),
                    })?;
                }
                met &= match &report {
                    Examined::Record(report) => report.requirement_met,
                    Examined::Archive(listing) => listing.notes.is_empty(),
                };
                reports.push(report);
            }
            Err(error) => {
                stream::complain(&error);
                if outcome == ExitCode::SUCCESS {
                    outcome = exit::code(&error);
                }
            }
        }
    }
    match output.take() {
        Some(mut output) => {
            let text = report::to_json(&reports)?;
            output.write_all(text.as_bytes()).map_err(|error| Error::from(error).at(Place::file(output.label())))?;
            output.finish()?;
        }
        None if json.is_some() => stream::print(&report::to_json(&reports)?)?,
        None => {}
    }
    Ok(if met || outcome != ExitCode::SUCCESS { outcome } else { ExitCode::from(exit::NOT_MET) })
}
