//! `batch`: many records by one recipe, resumable, in shards.

use std::fs;
use std::num::NonZeroUsize;
use std::path::{Path, PathBuf};
use std::process::ExitCode;

use clap::{Arg, ArgAction, ArgMatches, Command, value_parser};
use endgrain::error::{Error, Result};
use endgrain::fleet::{self, Batch, End, Item, Plan, Separator, Shard, Tally, Template};
use endgrain::place::Place;
use endgrain::settings::{self, Group};

use crate::cli::progress::Progress;
use crate::cli::{args, exit, machine, stream};

const GROUPS: &[Group] = settings::CONDITION;

const EXAMPLES: &str = "\
Examples:
  endgrain generate recipe > clean.toml
  endgrain batch --recipe clean.toml --into cleaned logs/*.csv
  find logs -name '*.csv' -print0 | endgrain batch --lowpass 40Hz --name '{folder}/{name}' --into cleaned --null --files-from -
  endgrain batch --recipe clean.toml --manifest sensors.csv --require within --into cleaned
  endgrain batch --recipe clean.toml --files-from list.txt --into cleaned --shard 0/4
  endgrain merge cleaned
";

const HEADING: &str = "Batch";

/// The subcommand.
pub fn command() -> Command {
    let arg = |name: &'static str| Arg::new(name).long(name).help_heading(HEADING);
    let path =
        |name: &'static str, value: &'static str| arg(name).value_name(value).value_parser(value_parser!(PathBuf));
    args::subcommand(
        "batch",
        "Condition many records by one recipe. Run it again after a kill: what is whole is not done again",
        EXAMPLES,
        GROUPS,
    )
    .arg(Arg::new("input").value_name("FILE").num_args(0..).value_parser(value_parser!(PathBuf)).help("Records: CSV or WAV"))
    .arg(
        path("into", "OUT")
            .required(true)
            .help("Folder of the outputs, made where it is missing; results go to its folder 'results'"),
    )
    .arg(
        path("files-from", "LIST")
            .conflicts_with("input")
            .help("Names of the records from a file, one a line; '-' is standard input"),
    )
    .arg(arg("null").action(ArgAction::SetTrue).requires("files-from").help("Names in the list end with a NUL byte, as from find -print0"))
    .arg(path("manifest", "FILE").conflicts_with_all(["input", "files-from"]).help(
        "Records from a table (CSV, or JSON Lines): columns path, output, and any option for one record, such as channel, \
         calibrate, assert; several values with ';' between them",
    ))
    .arg(arg("name").value_name("TEMPLATE").help(
        "Names of the outputs inside OUT: {name} (the default: the input's), {stem}, {ext}, {folder}, {number}, such as \
         {folder}/{stem}_clean.{ext}. No two records may have one",
    ))
    .arg(arg("jobs").short('j').value_name("COUNT").value_parser(value_parser!(NonZeroUsize)).help(
        "Records worked on at once. Default: the processors that this process may use, limits of a container included. \
         Results do not depend on it",
    ))
    .arg(arg("shard").value_name("K/N").help("Only records K, K+N, K+2N, ... of the list, with K from 0 to N-1; merge joins the shards"))
    .arg(arg("max-failures").value_name("COUNT").value_parser(value_parser!(u64).range(1..)).help("Begin no further record after that many have failed"))
    .arg(arg("fail-fast").action(ArgAction::SetTrue).conflicts_with("max-failures").help("The same as --max-failures 1"))
    .arg(arg("die-with-parent").action(ArgAction::SetTrue).help(
        "End as by an interrupt when the process that started this one ends (Linux): no orphan runs on beside a retry",
    ))
    .arg(arg("force").action(ArgAction::SetTrue).help("Use a folder OUT that holds files which no batch made; they may be replaced"))
    .arg(arg("dry-run").action(ArgAction::SetTrue).help("Check the list, the options and the names of the outputs; print them; write nothing"))
    .after_help(exit::HELP)
}

/// Runs it.
///
/// # Errors
/// `Usage` for a batch that contradicts itself, `Io` where results cannot be written. Records that fail are no error.
pub fn run(matches: &ArgMatches) -> Result<ExitCode> {
    if matches.get_flag("die-with-parent") {
        machine::die_with_parent()?;
    }
    let Some(into) = matches.get_one::<PathBuf>("into") else { return Err(Error::usage("no --into")) };
    let text = |name: &str| matches.get_one::<String>(name).map(String::as_str);
    let shard = text("shard").map_or(Ok(Shard::WHOLE), str::parse)?;
    let memory = text("memory").map_or_else(|| Ok(machine::half_of_free_memory()), settings::bytes)?;
    let jobs = matches.get_one::<NonZeroUsize>("jobs").copied();
    let recipe = args::recipe_of(matches)?;
    let template = text("name").map(Template::parse).transpose()?.or_else(|| recipe.name.clone()).unwrap_or_default();
    let plan = Plan::new(items(matches)?, &recipe, &args::layer(matches, GROUPS)?, &template, into)?;
    if matches.get_flag("dry-run") {
        return preview(&plan, into);
    }
    own_folder(into, matches.get_flag("force"))?;
    stream::end_orderly_on_interrupt();
    let batch = Batch {
        plan,
        into: into.clone(),
        shard,
        jobs: jobs.or_else(|| std::thread::available_parallelism().ok()).unwrap_or(NonZeroUsize::MIN),
        memory,
        max_failures: matches.get_one::<u64>("max-failures").copied().or(matches.get_flag("fail-fast").then_some(1)),
    };
    // The place of a panic goes into the record's result; a trace between progress lines would help nobody.
    std::panic::set_hook(Box::new(|_| {}));
    let quiet = matches.get_flag("quiet");
    let progress = Progress::new(shard.share_of(batch.plan.records.len() as u64), quiet);
    let outcome = fleet::run(&batch, &stream::STOP, &|tally| progress.show(tally));
    let seconds = progress.end();
    let (tally, end) = outcome?;
    if !quiet {
        stream::tell(&summary(&tally, end, seconds, into));
    }
    Ok(match end {
        End::Interrupted => ExitCode::from(exit::INTERRUPTED),
        End::TooManyFailures => ExitCode::from(exit::SOME_FAILED),
        End::Complete if tally.failed > 0 => ExitCode::from(exit::SOME_FAILED),
        End::Complete if tally.below > 0 => ExitCode::from(exit::NOT_MET),
        End::Complete => ExitCode::SUCCESS,
    })
}

fn items(matches: &ArgMatches) -> Result<Vec<Item>> {
    let open = |path: &Path| -> Result<Box<dyn std::io::Read>> {
        if stream::is_stdout(path) {
            return Ok(Box::new(std::io::stdin()));
        }
        let opened = fs::File::open(path);
        Ok(Box::new(
            opened.map_err(|error| Error::malformed(error.to_string()).at(Place::file(path.display().to_string())))?,
        ))
    };
    if let Some(path) = matches.get_one::<PathBuf>("manifest") {
        return fleet::read_manifest(open(path)?, &path.display().to_string());
    }
    if let Some(path) = matches.get_one::<PathBuf>("files-from") {
        let separator = if matches.get_flag("null") { Separator::Nul } else { Separator::Line };
        return fleet::read_list(open(path)?, separator, &path.display().to_string());
    }
    Ok(matches.get_many::<PathBuf>("input").into_iter().flatten().map(Item::new).collect())
}

/// Makes the folder of outputs, or checks that it is one of a batch.
fn own_folder(into: &Path, force: bool) -> Result<()> {
    let place = || Place::file(into.display().to_string());
    fs::create_dir_all(into).map_err(|error| Error::from(error).at(place()))?;
    let mut entries = fs::read_dir(into).map_err(|error| Error::from(error).at(place()))?;
    if force || entries.next().is_none() || fleet::results_of(into).is_dir() {
        return Ok(());
    }
    Err(Error::io("the folder holds files which no batch made").remedy("give another folder, or --force").at(place()))
}

fn preview(plan: &Plan, into: &Path) -> Result<ExitCode> {
    let mut text = String::new();
    let shown = |path: &Path| endgrain::place::escape(&path.to_string_lossy());
    for record in &plan.records {
        let twin = record.same_as.map_or(String::new(), |number| format!(" (the same file as record {number})"));
        text.push_str(&format!("{} -> {}{twin}\n", shown(&record.path), shown(&into.join(&record.output))));
    }
    text.push_str(&format!("{} records; nothing was written\n", plan.records.len()));
    stream::print(&text)?;
    Ok(ExitCode::SUCCESS)
}

/// One line: what became of the records.
fn summary(tally: &Tally, end: End, seconds: f64, into: &Path) -> String {
    let mut parts = vec![format!("{} done", tally.done)];
    for (count, what) in [
        (tally.kept, "kept from before"),
        (tally.repeated, "repeated names"),
        (tally.failed, "failed"),
        (tally.below, "below --require"),
        (tally.total - tally.settled(), "not begun"),
    ] {
        if count > 0 {
            parts.push(format!("{count} {what}"));
        }
    }
    let rate = (tally.settled() as f64 / seconds.max(1e-3)).round();
    let ended = match end {
        End::Complete => "",
        End::Interrupted => "interrupted: run it again for the rest; ",
        End::TooManyFailures => "stopped after too many failures; ",
    };
    let into = endgrain::place::escape(&into.to_string_lossy());
    format!(
        "{ended}{} records: {}; {seconds:.1} s, {rate} a second; results in {into}/results\n",
        tally.total,
        parts.join(", ")
    )
}
