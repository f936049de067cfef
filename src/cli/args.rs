//! The command line, built from the library's table of options.

use std::path::{Path, PathBuf};

use clap::builder::{PossibleValuesParser, StyledStr};
use clap::{Arg, ArgAction, ArgMatches, Command};
use endgrain::error::{Error, Result};
use endgrain::fleet::Recipe;
use endgrain::place::Place;
use endgrain::settings::{Arity, Group, Layer, Settings, find, rows};
use endgrain::write::Overwrite;

use crate::cli::{audit, batch, compare, compress, condition, exit, generate, merge, restore, spectrum};

/// Lays a help page out with the examples first.
const TEMPLATE: &str = "{before-help}{about-with-newline}\n{usage-heading} {usage}\n\n{all-args}{after-help}";

/// The whole command line.
pub fn command() -> Command {
    Command::new("endgrain")
        .version(env!("CARGO_PKG_VERSION"))
        .about("Conditions finite vibration records with the assumption at their two ends made explicit and testable")
        .before_help(StyledStr::from(
            "Examples:
  endgrain audit log.csv
  endgrain compare log.csv --lowpass 40Hz --plot ends.svg
  endgrain condition log.csv --lowpass 40Hz -o clean.csv
  endgrain spectrum log.csv --segment 0.5Hz --plot spectrum.svg
  endgrain condition log.wav --bandpass 2Hz..40Hz --extension odd --baseline line -o clean.wav
  endgrain compress log.csv --max-error 0.001g -o log.grain
  endgrain restore log.grain -o log2.csv
  endgrain batch --recipe clean.toml --into cleaned logs/*.csv
",
        ))
        .after_help(exit::HELP)
        .help_template(TEMPLATE)
        .subcommand_required(true)
        .arg_required_else_help(true)
        .disable_help_subcommand(true)
        .subcommand(condition::command())
        .subcommand(compare::command())
        .subcommand(spectrum::command())
        .subcommand(audit::command())
        .subcommand(compress::command())
        .subcommand(restore::command())
        .subcommand(batch::command())
        .subcommand(merge::command())
        .subcommand(generate::command())
}

/// A subcommand with its examples and nothing else.
pub fn bare(name: &'static str, about: &'static str, examples: &'static str) -> Command {
    Command::new(name).about(about).before_help(examples).help_template(TEMPLATE)
}

/// A subcommand with its examples, the options of the given groups, and what every command has.
pub fn subcommand(name: &'static str, about: &'static str, examples: &'static str, groups: &[Group]) -> Command {
    let mut command = bare(name, about, examples);
    for row in rows().into_iter().filter(|row| groups.contains(&row.group)) {
        let arg = Arg::new(row.key).long(row.key).help(row.help).help_heading(row.group.heading());
        command = command.arg(match row.arity {
            Arity::Switch => arg.action(ArgAction::SetTrue),
            Arity::Once => arg.value_name(row.value).action(ArgAction::Set).allow_hyphen_values(true),
            Arity::Many => arg.value_name(row.value).action(ArgAction::Append).allow_hyphen_values(true),
        });
    }
    command.arg(recipe()).arg(quiet()).arg(
        Arg::new("color")
            .long("color")
            .value_name("WHEN")
            .value_parser(PossibleValuesParser::new(["auto", "always", "never"]))
            .default_value("auto")
            .help_heading("Report")
            .help("Colour in the summary; NO_COLOR and TERM=dumb are honoured"),
    )
}

/// `--html`, for the commands that make a page.
pub fn page() -> Arg {
    Arg::new("html")
        .long("html")
        .value_name("FILE")
        .help_heading("Report")
        .help("Also write a report page: one file that opens anywhere, offline. Its figures stand beside it as FILE.json and FILE.csv")
}

/// `--quiet`, for every command.
pub fn quiet() -> Arg {
    Arg::new("quiet").long("quiet").short('q').action(ArgAction::SetTrue).help_heading("Report").help("No summary")
}

/// `--json`, for the commands with one result.
pub fn json() -> Arg {
    Arg::new("json")
        .long("json")
        .value_name("FILE")
        .num_args(0..=1)
        .default_missing_value("-")
        .help_heading("Report")
        .help("Also write the result as JSON; '-' (the default) is standard output")
}

/// `--force`, for every command that writes files.
pub fn force(heading: &'static str) -> Arg {
    Arg::new("force")
        .long("force")
        .action(ArgAction::SetTrue)
        .help_heading(heading)
        .help("Replace files that are in the way; an input is never replaced")
}

/// What `--force` says.
pub fn overwrite(matches: &ArgMatches) -> Overwrite {
    if matches.get_flag("force") { Overwrite::Force } else { Overwrite::Refuse }
}

fn recipe() -> Arg {
    Arg::new("recipe")
        .long("recipe")
        .value_name("FILE")
        .value_parser(clap::value_parser!(PathBuf))
        .help_heading("Recipe")
        .help("Options from a file: TOML with the same keys, or any JSON result. The command line wins over it")
}

/// The recipe that the command line names; an empty one without.
///
/// # Errors
/// `Usage` for what is no recipe, `Malformed` where it cannot be read.
pub fn recipe_of(matches: &ArgMatches) -> Result<Recipe> {
    let Some(path) = matches.get_one::<PathBuf>("recipe") else { return Ok(Recipe::default()) };
    let label = path.display().to_string();
    let text = std::fs::read_to_string(path)
        .map_err(|error| Error::malformed(format!("cannot read the recipe: {error}")).at(Place::file(&label)))?;
    Recipe::parse(&text, &label)
}

/// The options that the command line gives.
///
/// # Errors
/// None that the parser did not find.
pub fn layer(matches: &ArgMatches, groups: &[Group]) -> Result<Layer> {
    let mut layer = Layer::default();
    for row in rows().into_iter().filter(|row| groups.contains(&row.group)) {
        match row.arity {
            Arity::Switch if matches.get_flag(row.key) => layer.add(row.key, ["true".to_owned()])?,
            Arity::Switch => {}
            Arity::Once | Arity::Many => {
                if let Some(values) = matches.get_many::<String>(row.key) {
                    layer.add(row.key, values.cloned())?;
                }
            }
        }
    }
    Ok(layer)
}

/// The settings of one record, from the recipe and the command line. Of a recipe, a command takes the options it has.
///
/// # Errors
/// `Usage` with the option's name for a value that does not parse; and for a file that cannot be a recipe.
pub fn settings(matches: &ArgMatches, groups: &[Group], input: Option<&str>) -> Result<Settings> {
    let recipe = recipe_of(matches)?;
    let overrides = input.map(|path| recipe.overrides_of(Path::new(path))).unwrap_or_default();
    let own = |key: &str| find(key).is_some_and(|row| groups.contains(&row.group));
    layer(matches, groups)?.over(&recipe.layer(&overrides).only(own)).settings()
}
