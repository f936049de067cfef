//! The command line, built from the library's table of options.

use clap::builder::{PossibleValuesParser, StyledStr};
use clap::{Arg, ArgAction, ArgMatches, Command};
use endgrain::error::{Error, Result};
use endgrain::settings::{Arity, Group, Settings, rows};

use crate::cli::{audit, compare, condition, exit};

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
  endgrain condition log.wav --bandpass 2Hz..40Hz --extension odd --baseline line -o clean.wav
",
        ))
        .after_help(exit::HELP)
        .help_template(TEMPLATE)
        .subcommand_required(true)
        .arg_required_else_help(true)
        .disable_help_subcommand(true)
        .subcommand(condition::command())
        .subcommand(compare::command())
        .subcommand(audit::command())
}

/// A subcommand with its examples, the options of the given groups, and what every command has.
pub fn subcommand(name: &'static str, about: &'static str, examples: &'static str, groups: &[Group]) -> Command {
    let mut command = Command::new(name).about(about).before_help(examples).help_template(TEMPLATE);
    for row in rows().into_iter().filter(|row| groups.contains(&row.group)) {
        let arg = Arg::new(row.key).long(row.key).help(row.help).help_heading(row.group.heading());
        command = command.arg(match row.arity {
            Arity::Switch => arg.action(ArgAction::SetTrue),
            Arity::Once => arg.value_name(row.value).action(ArgAction::Set).allow_hyphen_values(true),
            Arity::Many => arg.value_name(row.value).action(ArgAction::Append).allow_hyphen_values(true),
        });
    }
    command
        .arg(
            Arg::new("json")
                .long("json")
                .value_name("FILE")
                .num_args(0..=1)
                .default_missing_value("-")
                .help_heading("Report")
                .help("Also write the result as JSON; '-' (the default) is standard output"),
        )
        .arg(
            Arg::new("quiet")
                .long("quiet")
                .short('q')
                .action(ArgAction::SetTrue)
                .help_heading("Report")
                .help("No summary"),
        )
        .arg(
            Arg::new("color")
                .long("color")
                .value_name("WHEN")
                .value_parser(PossibleValuesParser::new(["auto", "always", "never"]))
                .default_value("auto")
                .help_heading("Report")
                .help("Colour in the summary; NO_COLOR and TERM=dumb are honoured"),
        )
}

/// The settings that the command line gives.
///
/// # Errors
/// `Usage` with the option's name for a value that does not parse.
pub fn settings(matches: &ArgMatches, groups: &[Group]) -> Result<Settings> {
    let mut settings = Settings::default();
    for row in rows().into_iter().filter(|row| groups.contains(&row.group)) {
        match row.arity {
            Arity::Switch => {
                if matches.get_flag(row.key) {
                    settings.set(row.key, "true")?;
                }
            }
            Arity::Once | Arity::Many => {
                for value in matches.get_many::<String>(row.key).into_iter().flatten() {
                    settings.set(row.key, value)?;
                }
            }
        }
    }
    if settings.fitness.is_some() && groups.contains(&Group::Judgement) {
        return Err(Error::usage("--require: \"clean\" is asked of an audit")
            .remedy("use within or borderline here, and audit FILE --require clean before"));
    }
    Ok(settings)
}
