//! `spectrum`: densities with confidence limits, lines, band levels, road classes, coefficients.

use std::io::Write;
use std::path::{Path, PathBuf};
use std::process::ExitCode;

use clap::{Arg, ArgMatches, Command};
use endgrain::error::{Error, Result};
use endgrain::job::{self, PageFiles};
use endgrain::place::Place;
use endgrain::report::{self, OutputReport};
use endgrain::settings::Group;
use endgrain::write::{self, Durability, Pending, finish_together, refuse_twins};

use crate::cli::{args, exit, stream};

const GROUPS: &[Group] = Group::SPECTRUM;

const EXAMPLES: &str = "\
Examples:
  endgrain spectrum log.csv
  endgrain spectrum log.csv --channel ax --segment 0.5Hz --band 2Hz..40Hz --plot spectrum.svg
  endgrain spectrum log.csv --method sine --octaves third -o spectrum.csv
  endgrain spectrum before.csv after.csv --segment 2s --plot both.svg
  endgrain spectrum log.csv --lowpass 40Hz --plot before_and_after.svg
  endgrain spectrum log.csv --method basis --extension even --against odd+line
  endgrain spectrum log.csv --segment 0.5Hz --html spectrum.html
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
    let overwrite = args::overwrite(matches);
    let inputs: Vec<&Path> = [Some(file), second].into_iter().flatten().map(Path::new).collect();
    // Opened before any work, so that a refusal costs nothing.
    let open = |path: &Path| Pending::create(path, &inputs, overwrite);
    let output_path = output.as_deref().filter(|_| !to_stdout);
    let json_path = json.as_deref().filter(|_| !json_to_stdout);
    let sidecar_path = output_path.map(sidecar_of);
    let page = matches.get_one::<String>("html").map(Path::new);
    let named = [output_path, sidecar_path.as_deref(), plot.as_deref(), json_path, page];
    refuse_twins(&named.into_iter().flatten().collect::<Vec<_>>())?;
    let sidecar = sidecar_path.as_deref().map(open).transpose()?;
    let series = match output_path {
        None if to_stdout => Some(Pending::stream("-", std::io::stdout())),
        None => None,
        Some(path) => Some(open(path)?),
    };
    let plot = plot.as_deref().map(open).transpose()?;
    let json_file = json_path.map(open).transpose()?;
    let page = page.map(|path| PageFiles::create(path, &inputs, overwrite)).transpose()?;

    let second = second.map(|second| stream::input(second)).transpose()?;
    let mut found = job::spectrum(stream::input(file)?, second, &settings)?;
    let mut outputs = Vec::new();
    if let Some(plot) = plot {
        outputs.push(filled(plot, report::spectrum_svg(&found)?.as_bytes())?);
    }
    if let Some(page) = page {
        outputs.extend(page.fill(&found.clone().without_series(), &report::page::spectrum_page(&found))?);
    }
    if let Some(series) = series {
        outputs.push(filled(series, &write::spectrum_csv(&found))?);
    }
    found.outputs.extend(
        outputs.iter_mut().map(|output| OutputReport { path: output.label().to_owned(), sha256: output.fingerprint() }),
    );
    if let Some(json) = json_file {
        outputs.push(filled(json, report::to_json(&found)?.as_bytes())?);
    }
    if let Some(sidecar) = sidecar {
        outputs.push(filled(sidecar, report::to_json(&found.clone().without_series())?.as_bytes())?);
    }
    finish_together(outputs, Durability::Handed)?;
    if json_to_stdout {
        stream::print(&report::to_json(&found)?)?;
    } else if !matches.get_flag("quiet") {
        let text = report::spectrum_text(&found);
        if to_stdout { stream::tell(&text) } else { stream::print(&text)? }
    }
    Ok(ExitCode::SUCCESS)
}

fn filled<'a>(mut output: Pending<'a>, bytes: &[u8]) -> Result<Pending<'a>> {
    output.write_all(bytes).map_err(|error| Error::from(error).at(Place::file(output.label())))?;
    Ok(output)
}

/// `spectrum.csv` has the sidecar `spectrum.csv.json`.
fn sidecar_of(path: &Path) -> PathBuf {
    let mut name = path.as_os_str().to_owned();
    name.push(".json");
    PathBuf::from(name)
}
