//! `compare`: every extension side by side for the wanted operators.

use std::io::Write;
use std::path::{Path, PathBuf};
use std::process::ExitCode;

use clap::{Arg, ArgAction, ArgMatches, Command};
use endgrain::error::{Error, Result};
use endgrain::job::PageFiles;
use endgrain::settings::Group;
use endgrain::write::{Overwrite, Pending};
use endgrain::{job, report};

use crate::cli::{args, exit, stream};

const GROUPS: &[Group] = &[Group::Operators, Group::Stage, Group::Judgement, Group::Cut, Group::Repair, Group::Input];

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
    .arg(
        Arg::new("force")
            .long("force")
            .action(ArgAction::SetTrue)
            .help_heading("Report")
            .help("Replace files that are in the way"),
    )
    .arg(args::page())
    .after_help(exit::HELP)
}

/// Runs it.
///
/// # Errors
/// Whatever stops the job.
pub fn run(matches: &ArgMatches) -> Result<ExitCode> {
    let settings = args::settings(matches, GROUPS)?;
    let Some(file) = matches.get_one::<String>("input") else { return Err(Error::usage("no input file")) };
    let overwrite = if matches.get_flag("force") { Overwrite::Force } else { Overwrite::Refuse };
    let plot = matches.get_one::<String>("plot").map(PathBuf::from);
    let json = matches.get_one::<String>("json").map(PathBuf::from);
    let open = |path: &PathBuf| Pending::create(path, &[], overwrite);
    let plot = plot.as_ref().map(open).transpose()?;
    let json_file = json.as_ref().filter(|path| !stream::is_stdout(path)).map(open).transpose()?;
    let page =
        matches.get_one::<String>("html").map(|path| PageFiles::create(Path::new(path), &[], overwrite)).transpose()?;
    let wanted = plot.is_some() || page.is_some();
    let (comparison, pictures) = job::compare(stream::input(file)?, &settings, wanted)?;
    if let Some(page) = page {
        page.write(&comparison, &report::page::comparison_page(&comparison, &pictures))?;
    }
    let save = |output: Option<Pending<'_>>, text: &dyn Fn() -> Result<String>| {
        let Some(mut output) = output else { return Ok(()) };
        output.write_all(text()?.as_bytes()).map_err(Error::from)?;
        output.finish().map(|_| ())
    };
    save(plot, &|| report::svg(&pictures))?;
    save(json_file, &|| report::to_json(&comparison))?;
    if json.as_deref().is_some_and(stream::is_stdout) {
        stream::print(&report::to_json(&comparison)?)?;
    } else if !matches.get_flag("quiet") {
        stream::print(&report::comparison_text(&comparison))?;
    }
    Ok(if comparison.requirement_met { ExitCode::SUCCESS } else { ExitCode::from(exit::NOT_MET) })
}
