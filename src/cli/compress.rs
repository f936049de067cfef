//! `compress`: a record as an archive with a guaranteed error.

use std::io::Write;
use std::path::{Path, PathBuf};
use std::process::ExitCode;

use clap::{Arg, ArgMatches, Command};
use endgrain::error::{Error, Result};
use endgrain::job::{self, PageFiles};
use endgrain::place::Place;
use endgrain::report;
use endgrain::settings::{self, Group};
use endgrain::write::{Durability, Pending, finish_together, refuse_twins};

use crate::cli::{args, exit, stream};

const GROUPS: &[Group] = settings::COMPRESS;

const EXAMPLES: &str = "\
Examples:
  endgrain compress log.csv --max-error 0.001g -o log.grain
  endgrain compress log.csv --max-error 0.1% --effort 3 -o log.grain
  endgrain compress log.wav --lossless -o log.grain
  endgrain compress profile.csv --rms-error 0.5x -o profile.grain
  endgrain compress log.csv --corner 40Hz -o slow.grain
  endgrain compress log.csv --max-error 0.1% -o log.grain --html lost.html
  endgrain audit log.grain
  endgrain restore log.grain --from 2s --to 3s -o part.csv
";

/// The subcommand.
pub fn command() -> Command {
    args::subcommand("compress", "Archive a record in few bytes, with an error that is guaranteed", EXAMPLES, GROUPS)
        .arg(Arg::new("input").value_name("FILE").required(true).help("The record: CSV or WAV, '-' for standard input"))
        .arg(output())
        .arg(args::json())
        .arg(args::force("Report"))
        .arg(args::page())
        .after_help(exit::HELP)
}

/// Where the result goes.
pub fn output() -> Arg {
    Arg::new("output")
        .short('o')
        .long("output")
        .value_name("OUT")
        .required(true)
        .help_heading(Group::Output.heading())
        .help("Where the result goes, '-' for standard output")
}

/// The output and, where the result goes to a file as JSON, that file; both checked before any work, also against a page.
///
/// # Errors
/// `Io` where a file is in the way, `Usage` where both are the same.
pub fn outputs(
    matches: &ArgMatches,
    input: &str,
    page: Option<&Path>,
) -> Result<(Pending<'static>, Option<Pending<'static>>)> {
    let Some(output) = matches.get_one::<String>("output").map(PathBuf::from) else {
        return Err(Error::usage("no output").remedy("name one with -o OUT"));
    };
    let json = matches.get_one::<String>("json").map(PathBuf::from);
    let json = json.filter(|path| !stream::is_stdout(path));
    let (inputs, overwrite) = ([Path::new(input)], args::overwrite(matches));
    refuse_twins(&[Some(output.as_path()), json.as_deref(), page].into_iter().flatten().collect::<Vec<_>>())?;
    let json = json.map(|path| Pending::create(&path, &inputs, overwrite)).transpose()?;
    if stream::is_stdout(&output) {
        if matches.get_one::<String>("json").is_some_and(|path| path == "-") {
            return Err(Error::usage("the result and the JSON cannot both go to standard output")
                .remedy("give one of them a file name"));
        }
        return Ok((Pending::stream("-", std::io::stdout()), json));
    }
    Ok((Pending::create(&output, &inputs, overwrite)?, json))
}

/// Tells the result: as JSON where asked, in words otherwise.
///
/// # Errors
/// Whatever stops the JSON from being written.
pub fn tell(matches: &ArgMatches, file: Option<Pending<'_>>, json: &str, words: &str) -> Result<()> {
    if let Some(mut file) = file {
        file.write_all(json.as_bytes()).map_err(|error| Error::from(error).at(Place::file(file.label())))?;
        file.finish()?;
    }
    if matches.get_one::<String>("json").is_some_and(|path| path == "-") {
        stream::print(json)?;
    }
    if !matches.get_flag("quiet") {
        stream::tell(words);
    }
    Ok(())
}

/// Runs it.
///
/// # Errors
/// Whatever stops the job.
pub fn run(matches: &ArgMatches) -> Result<ExitCode> {
    let Some(file) = matches.get_one::<String>("input") else { return Err(Error::usage("no input file")) };
    let settings = args::settings(matches, GROUPS, Some(file))?;
    let page = matches.get_one::<String>("html").map(Path::new);
    let (output, json) = outputs(matches, file, page)?;
    let page = page.map(|path| PageFiles::create(path, &[Path::new(file)], args::overwrite(matches))).transpose()?;
    let (result, restorations) = job::compress(stream::input(file)?, output, &settings, page.is_some())?;
    if let Some(page) = page {
        let filled = page.fill(&result, &report::page::archive_page(&result, &restorations))?;
        finish_together(filled.into(), Durability::Handed)?;
    }
    tell(matches, json, &report::to_json(&result)?, &report::archive_text(&result))?;
    Ok(ExitCode::SUCCESS)
}
