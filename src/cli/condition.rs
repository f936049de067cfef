//! `condition`: the main job on one record.

use std::path::{Path, PathBuf};
use std::process::ExitCode;

use clap::{Arg, ArgAction, ArgMatches, Command};
use endgrain::error::{Error, Result};
use endgrain::job::{self, Target};
use endgrain::regularise::Gaps;
use endgrain::report;
use endgrain::settings::Group;
use endgrain::write::Durability;

use crate::cli::{args, exit, stream};

const GROUPS: &[Group] = Group::CONDITION;

const EXAMPLES: &str = "\
Examples:
  endgrain condition log.csv --lowpass 40Hz -o clean.csv
  endgrain condition log.csv --bandpass 2Hz..40Hz --extension odd --baseline line -o clean.csv
  endgrain condition log.csv --channel ax --integrate 1 --conditions steady --highpass 0.5Hz -o velocity.csv
  endgrain condition lift.csv --integrate 2 --conditions rest-to=0.25m --beside sigma -o travel.csv
  endgrain condition profile.csv --split 0.8mm --extension odd --baseline line -o parts.csv
  endgrain condition profile.csv --lowpass 0.8mm --shape gaussian -o waviness.csv
  endgrain condition log.wav --notch 50Hz:2Hz --encoding pcm24 -o clean.wav
  logger | endgrain condition - --rate 200 --lowpass 40Hz -o - > clean.csv
  endgrain condition log.csv --lowpass 40Hz -o clean.csv --html report.html
  endgrain condition seat.csv --channel az --weighting Wk --running-rms 1s -o weighted.csv
  endgrain condition log.csv --response pickup.csv --notch 50Hz:2Hz:all --despike fill -o corrected.csv
  endgrain condition profile.csv --gaps smooth --smooth auto:robust -o smooth.csv
  endgrain condition log.csv --decimate 4 -o slow.csv
  endgrain condition outage.csv --gaps split --lowpass 40Hz -o clean.csv
  endgrain condition log.csv --lowpass 40Hz --dry-run
  endgrain condition log.csv --recipe clean.csv.json -o again.csv
";

/// The subcommand.
pub fn command() -> Command {
    args::subcommand(
        "condition",
        "Extend, transform, filter, reconstruct and write a record in its own format",
        EXAMPLES,
        GROUPS,
    )
    .arg(Arg::new("input").value_name("FILE").required(true).help("The record: CSV or WAV, '-' for standard input"))
    .arg(
        Arg::new("output")
            .short('o')
            .long("output")
            .value_name("OUT")
            .required_unless_present("dry-run")
            .help_heading(Group::Output.heading())
            .help("Where the result goes, '-' for standard output; the JSON sidecar is OUT with .json appended"),
    )
    .arg(args::json())
    .arg(args::force(Group::Output.heading()))
    .arg(
        Arg::new("sync")
            .long("sync")
            .action(ArgAction::SetTrue)
            .help_heading(Group::Output.heading())
            .help("Wait until the outputs are on the disk: a power failure right after then loses nothing"),
    )
    .arg(
        Arg::new("dry-run")
            .long("dry-run")
            .action(ArgAction::SetTrue)
            .conflicts_with("json")
            .help_heading(Group::Output.heading())
            .help("Print the resolved plan and the gain at and around each corner; write nothing"),
    )
    .arg(args::page())
    .after_help(exit::HELP)
}

/// Runs it.
///
/// # Errors
/// Whatever stops the job.
pub fn run(matches: &ArgMatches) -> Result<ExitCode> {
    let Some(file) = matches.get_one::<String>("input") else { return Err(Error::usage("no input file")) };
    let settings = args::settings(matches, GROUPS, Some(file))?;
    let json = matches.get_one::<String>("json").map(PathBuf::from);
    let quiet = matches.get_flag("quiet");
    if matches.get_flag("dry-run") {
        for plan in job::plan(stream::input(file)?, &settings)? {
            stream::print(&report::plan_text(&plan))?;
        }
        return Ok(ExitCode::SUCCESS);
    }
    let Some(output) = matches.get_one::<String>("output").map(PathBuf::from) else {
        return Err(Error::usage("no output").remedy("name one with -o OUT"));
    };
    let to_stdout = stream::is_stdout(&output);
    if to_stdout && json.as_deref().is_some_and(stream::is_stdout) {
        return Err(Error::usage("the record and the JSON cannot both go to standard output")
            .remedy("give one of them a file name"));
    }
    let overwrite = args::overwrite(matches);
    let durability = if matches.get_flag("sync") { Durability::OnDisk } else { Durability::Handed };
    let json_file = json.as_deref().filter(|path| !stream::is_stdout(path));
    let target = if to_stdout {
        Target::stream(Box::new(std::io::stdout()), json_file, overwrite)
    } else {
        Target::file(&output, json_file, overwrite)
    };
    let target = match matches.get_one::<String>("html") {
        Some(page) => target.with_page(Path::new(page)),
        None => target,
    };
    let target = target.durable(durability);
    let split = settings.regularise.gaps == Gaps::Split;
    let reports = if split {
        job::condition_parts(stream::input(file)?, target, &settings)?
    } else {
        vec![job::condition(stream::input(file)?, target, &settings)?]
    };
    if json.as_deref().is_some_and(stream::is_stdout) {
        // A list where gaps may split, whether they did or not.
        let text = if split { report::to_json(&reports) } else { report::to_json(&reports[0]) };
        stream::print(&text?)?;
    }
    if !quiet {
        reports.iter().for_each(|report| stream::tell(&report::summary(report)));
    }
    let met = reports.iter().all(|report| report.requirement_met);
    Ok(if met { ExitCode::SUCCESS } else { ExitCode::from(exit::NOT_MET) })
}
