//! `spectrum`: densities with confidence limits, lines, band levels, road classes, coefficients.

use std::io::Write;
use std::path::{Path, PathBuf};
use std::process::ExitCode;

use clap::{Arg, ArgAction, ArgMatches, Command};
use endgrain::error::{Error, Result};
use endgrain::job;
use endgrain::report::{self, OutputReport};
use endgrain::settings::Group;
use endgrain::write::{self, Overwrite, Pending};

use crate::cli::{args, exit, stream};

const GROUPS: &[Group] = &[Group::Spectrum, Group::Operators, Group::Stage, Group::Cut, Group::Repair, Group::Input];

const EXAMPLES: &str = "\
Examples:
  endgrain spectrum log.csv
  endgrain spectrum log.csv --channel ax --segment 0.5Hz --band 2Hz..40Hz --plot spectrum.svg
  endgrain spectrum log.csv --method sine --octaves third -o spectrum.csv
  endgrain spectrum before.csv after.csv --segment 2s --plot both.svg
  endgrain spectrum log.csv --lowpass 40Hz --plot before_and_after.svg
  endgrain spectrum log.csv --method basis --extension even --against odd+line
  endgrain spectrum road.csv --segment 100m --road
";

/// The subcommand.
pub fn command() -> Command {
    args::subcommand(
        "spectrum",
        "Tell what a record holds at every frequency, with confidence limits",
        EXAMPLES,
        GROUPS,
    )
    .arg(Arg::new("input").value_name("FILE").required(true).help("The record: CSV or WAV, '-' for standard input"))
    .arg(Arg::new("second").value_name("SECOND").help("A second record to lay over the first, channel by channel"))
    .arg(
        Arg::new("output")
            .short('o')
            .long("output")
            .value_name("OUT")
            .help_heading("Report")
            .help("Write the series as CSV, '-' for standard output; the JSON sidecar is OUT with .json appended"),
    )
    .arg(
        Arg::new("plot")
            .long("plot")
            .value_name("FILE")
            .help_heading("Report")
            .help("Draw the spectra with their limits, as SVG"),
    )
    .arg(
        Arg::new("force")
            .long("force")
            .action(ArgAction::SetTrue)
            .help_heading("Report")
            .help("Replace files that are in the way"),
    )
    .after_help(exit::HELP)
}

/// Runs it.
///
/// # Errors
/// Whatever stops the job.
pub fn run(matches: &ArgMatches) -> Result<ExitCode> {
    let settings = args::settings(matches, GROUPS)?;
    let Some(file) = matches.get_one::<String>("input") else { return Err(Error::usage("no input file")) };
    let second = matches.get_one::<String>("second");
    if file == "-" && second.is_some_and(|second| second == "-") {
        return Err(Error::usage("both records cannot come from standard input").remedy("name one of them"));
    }
    let path_of = |key: &str| matches.get_one::<String>(key).map(PathBuf::from);
    let (output, json, plot) = (path_of("output"), path_of("json"), path_of("plot"));
    let to_stdout = output.as_deref().is_some_and(stream::is_stdout);
    let json_to_stdout = json.as_deref().is_some_and(stream::is_stdout);
    if to_stdout && json_to_stdout {
        return Err(Error::usage("the series and the JSON cannot both go to standard output")
            .remedy("give one of them a file name"));
    }
    let overwrite = if matches.get_flag("force") { Overwrite::Force } else { Overwrite::Refuse };
    let inputs: Vec<&Path> = [Some(file), second].into_iter().flatten().map(Path::new).collect();
    // Opened before any work, so that a refusal costs nothing.
    let open = |path: &Path| Pending::create(path, &inputs, overwrite);
    let sidecar = output.as_deref().filter(|_| !to_stdout).map(|path| open(&sidecar_of(path))).transpose()?;
    let series = match &output {
        Some(_) if to_stdout => Some(Pending::stream("-", std::io::stdout())),
        Some(path) => Some(open(path)?),
        None => None,
    };
    let plot = plot.as_deref().map(open).transpose()?;
    let json_file = json.as_deref().filter(|_| !json_to_stdout).map(open).transpose()?;

    let second = second.map(|second| stream::input(second)).transpose()?;
    let mut found = job::spectrum(stream::input(file)?, second, &settings)?;
    if let Some(plot) = plot {
        let written = written(plot, report::spectrum_svg(&found)?.as_bytes())?;
        found.outputs.push(written);
    }
    if let Some(series) = series {
        let written = written(series, &write::spectrum_csv(&found))?;
        found.outputs.push(written);
    }
    if let Some(json) = json_file {
        written(json, report::to_json(&found)?.as_bytes())?;
    }
    if json_to_stdout {
        stream::print(&report::to_json(&found)?)?;
    } else if !matches.get_flag("quiet") {
        let text = report::spectrum_text(&found);
        if to_stdout { stream::tell(&text) } else { stream::print(&text)? }
    }
    if let Some(sidecar) = sidecar {
        written(sidecar, report::to_json(&found.without_series())?.as_bytes())?;
    }
    Ok(ExitCode::SUCCESS)
}

fn written(mut output: Pending<'_>, bytes: &[u8]) -> Result<OutputReport> {
    output.write_all(bytes).map_err(Error::from)?;
    let written = output.finish()?;
    Ok(OutputReport { path: written.path, sha256: written.sha256 })
}

/// `spectrum.csv` has the sidecar `spectrum.csv.json`.
fn sidecar_of(path: &Path) -> PathBuf {
    let mut name = path.as_os_str().to_owned();
    name.push(".json");
    PathBuf::from(name)
}
