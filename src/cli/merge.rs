//! `merge`: joins the results of all shards and attempts of a batch.

use std::path::{Path, PathBuf};
use std::process::ExitCode;

use clap::{Arg, ArgAction, ArgMatches, Command, value_parser};
use endgrain::error::{Error, Result};
use endgrain::fleet::{self, Order, Stale};
use endgrain::job::PageFiles;
use endgrain::write::{Durability, finish_together};

use crate::cli::{args, exit, stream};

const EXAMPLES: &str = "\
Examples:
  endgrain merge cleaned
  endgrain merge cleaned --worst-first
  endgrain merge cleaned --html cleaned.html
  endgrain merge cleaned --clear-stale
";

/// The subcommand.
pub fn command() -> Command {
    args::bare(
        "merge",
        "Join the results of a batch, check that none is missing or doubled, and tell how it went",
        EXAMPLES,
    )
    .arg(
        Arg::new("into")
            .value_name("OUT")
            .required(true)
            .value_parser(value_parser!(PathBuf))
            .help("The folder that batch wrote --into: results/merged.jsonl and results/merged.csv are made in it"),
    )
    .arg(
        Arg::new("worst-first")
            .long("worst-first")
            .action(ArgAction::SetTrue)
            .help("Failures first, then the largest edge error for its tolerance, instead of the order of the list"),
    )
    .arg(
        Arg::new("clear-stale")
            .long("clear-stale")
            .action(ArgAction::SetTrue)
            .help("Remove temporary files that killed attempts have left. No attempt may be running"),
    )
    .arg(args::page())
    .arg(args::force("Report"))
    .arg(args::quiet())
    .after_help(exit::HELP)
}

/// Runs it.
///
/// # Errors
/// `Malformed` where no batch has run; `Io` where results cannot be read or written.
pub fn run(matches: &ArgMatches) -> Result<ExitCode> {
    let Some(into) = matches.get_one::<PathBuf>("into") else { return Err(Error::usage("no folder")) };
    let order = if matches.get_flag("worst-first") { Order::WorstFirst } else { Order::List };
    let stale = if matches.get_flag("clear-stale") { Stale::Remove } else { Stale::Report };
    let page = matches.get_one::<String>("html").map(Path::new);
    let kept = if page.is_some() { fleet::files_of(into)? } else { Vec::new() };
    let kept: Vec<&Path> = kept.iter().map(PathBuf::as_path).collect();
    let open = |page| PageFiles::create(page, &kept, args::overwrite(matches));
    // Tried before the work and dropped again: its temporary file inside OUT would count as one of a killed attempt.
    page.map(open).transpose()?;
    let overview = fleet::merge(into, order, stale)?;
    if let Some(page) = page.map(open).transpose()? {
        let content = fleet::overview_page(&overview, &into.display().to_string());
        finish_together(page.fill(&overview.summary(), &content)?.into(), Durability::Handed)?;
    }
    if !matches.get_flag("quiet") {
        stream::print(&overview.text())?;
    }
    Ok(if !overview.is_complete() {
        ExitCode::from(exit::INCOMPLETE)
    } else if overview.failed > 0 {
        ExitCode::from(exit::SOME_FAILED)
    } else if overview.below > 0 {
        ExitCode::from(exit::NOT_MET)
    } else {
        ExitCode::SUCCESS
    })
}
