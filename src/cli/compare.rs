//! `compare`: every extension side by side for the wanted operators.

use std::io::Write;
use std::path::{Path, PathBuf};
use std::process::ExitCode;

use clap::{Arg, ArgMatches, Command};
use endgrain::error::{Error, Result};
use endgrain::job::PageFiles;
use endgrain::place::Place;
use endgrain::settings::Group;
use endgrain::write::{Durability, Pending, finish_together, refuse_twins};
use endgrain::{job, report};

use crate::cli::{args, exit, stream};

const GROUPS: &[Group] = Group::COMPARE;

const EXAMPLES: &str = "\
Examples:
  endgrain compare log.csv --lowpass 40Hz
  endgrain compare log.csv --channel ax --bandpass 2Hz..40Hz --tolerance 5%
  endgrain compare profile.csv --lowpass 0.8mm --shape gaussian --plot ends.svg
  endgrain compare log.csv --lowpass 40Hz --html ends.html
  endgrain compare log.csv --lowpass 40Hz --require within --json
";

/// The subcommand.
pub fn command() -> Command {
    args::subcommand(
        "compare",
        "Compare the extensions of a record: what each costs at the ends, and which the record supports",
        EXAMPLES,
        GROUPS,
    )
    .arg(Arg::new("input").value_name("FILE").required(true).help("The record: CSV or WAV, '-' for standard input"))
    .arg(
        Arg::new("plot")
            .long("plot")
            .value_name("FILE")
            .help_heading("Report")
            .help("Draw the continuations past both ends and the outputs over the edges, as SVG"),
    )
    .arg(args::json())
    .arg(args::force("Report"))
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
    let plot = matches.get_one::<String>("plot").map(PathBuf::from);
    let json = matches.get_one::<String>("json").map(PathBuf::from);
    let json_path = json.as_deref().filter(|path| !stream::is_stdout(path));
    let page = matches.get_one::<String>("html").map(Path::new);
    let (input, overwrite) = ([Path::new(file)], args::overwrite(matches));
    let open = |path: &Path| Pending::create(path, &input, overwrite);
    refuse_twins(&plot.as_deref().into_iter().chain(json_path).chain(page).collect::<Vec<_>>())?;
    let plot = plot.as_deref().map(open).transpose()?;
    let json_file = json_path.map(open).transpose()?;
    let page = page.map(|path| PageFiles::create(path, &input, overwrite)).transpose()?;
    let wanted = plot.is_some() || page.is_some();
    let (comparison, pictures) = job::compare(stream::input(file)?, &settings, wanted)?;
    let mut outputs = Vec::new();
    if let Some(page) = page {
        outputs.extend(page.fill(&comparison, &report::page::comparison_page(&comparison, &pictures))?);
    }
    if let Some(mut plot) = plot {
        plot.write_all(report::svg(&pictures)?.as_bytes())
            .map_err(|error| Error::from(error).at(Place::file(plot.label())))?;
        outputs.push(plot);
    }
    if let Some(mut json) = json_file {
        json.write_all(report::to_json(&comparison)?.as_bytes())
            .map_err(|error| Error::from(error).at(Place::file(json.label())))?;
        outputs.push(json);
    }
    finish_together(outputs, Durability::Handed)?;
    if json.as_deref().is_some_and(stream::is_stdout) {
        stream::print(&report::to_json(&comparison)?)?;
    } else if !matches.get_flag("quiet") {
        stream::print(&report::comparison_text(&comparison))?;
    }
    Ok(if comparison.requirement_met { ExitCode::SUCCESS } else { ExitCode::from(exit::NOT_MET) })
}
