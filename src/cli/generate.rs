//! `generate`: a commented recipe, the manual, completions for shells, and the schema of recipes; all from the same table.

use std::fmt::Write;
use std::path::PathBuf;
use std::process::ExitCode;

use clap::{Arg, ArgAction, ArgMatches, Command, value_parser};
use clap_complete::Shell;
use endgrain::error::{Error, Result};
use endgrain::place::Place;
use endgrain::settings::{Arity, OptionRow, Settings, rows};
use endgrain::write::Pending;
use serde_json::{Map, Value, json};

use crate::cli::{args, exit, stream};

const EXAMPLES: &str = "\
Examples:
  endgrain generate recipe > clean.toml
  endgrain generate man --into ~/.local/share/man/man1
  endgrain generate completions bash > ~/.local/share/bash-completion/completions/endgrain
  endgrain generate schema > recipe.schema.json
";

/// The subcommand.
pub fn command() -> Command {
    args::bare(
        "generate",
        "Write a commented recipe, the manual, completions for a shell, or the schema of recipes",
        EXAMPLES,
    )
    .subcommand_required(true)
    .disable_help_subcommand(true)
    .subcommand(
        Command::new("recipe").about("A recipe with every key, its meaning and its default, to standard output"),
    )
    .subcommand(
        Command::new("man")
            .about("The manual: the main page to standard output, or all pages into a folder")
            .arg(
                Arg::new("into")
                    .long("into")
                    .value_name("FOLDER")
                    .value_parser(value_parser!(PathBuf))
                    .help("Folder for one page a command"),
            )
            .arg(args::force("Output").action(ArgAction::SetTrue)),
    )
    .subcommand(
        Command::new("completions").about("Completions for a shell, to standard output").arg(
            Arg::new("shell").value_name("SHELL").required(true).value_parser(value_parser!(Shell)).help("The shell"),
        ),
    )
    .subcommand(Command::new("schema").about("JSON Schema (2020-12) of a recipe, to standard output"))
    .after_help(exit::HELP)
}

/// Runs it.
///
/// # Errors
/// `Io` where pages cannot be written.
pub fn run(matches: &ArgMatches) -> Result<ExitCode> {
    match matches.subcommand() {
        Some(("recipe", _)) => stream::print(&recipe())?,
        Some(("man", matches)) => manual(matches)?,
        Some(("completions", matches)) => {
            let Some(shell) = matches.get_one::<Shell>("shell") else { return Err(Error::usage("no shell")) };
            let mut bytes = Vec::new();
            clap_complete::generate(*shell, &mut args::command(), env!("CARGO_BIN_NAME"), &mut bytes);
            stream::print(&String::from_utf8_lossy(&bytes))?;
        }
        Some(("schema", _)) => stream::print(&endgrain::report::to_json(&schema())?)?,
        _ => return Err(Error::usage("nothing to generate")),
    }
    Ok(ExitCode::SUCCESS)
}

fn manual(matches: &ArgMatches) -> Result<()> {
    let render = |command: &Command, title: &str| -> Result<Vec<u8>> {
        let mut bytes = Vec::new();
        clap_mangen::Man::new(command.clone()).title(title).render(&mut bytes)?;
        Ok(bytes)
    };
    let mut whole = args::command();
    whole.build();
    let own = whole.get_name().to_owned();
    let Some(folder) = matches.get_one::<PathBuf>("into") else {
        return stream::print(&String::from_utf8_lossy(&render(&whole, &own)?));
    };
    let pages = whole.get_subcommands().map(|command| (format!("{own}-{}", command.get_name()), command));
    for (title, command) in [(own.clone(), &whole)].into_iter().chain(pages) {
        let name = format!("{title}.1");
        let mut output = Pending::create(&folder.join(&name), &[], args::overwrite(matches))?;
        let page = render(command, &title)?;
        std::io::Write::write_all(&mut output, &page).map_err(|error| Error::from(error).at(Place::file(&name)))?;
        output.finish()?;
    }
    Ok(())
}

const HEAD: &str = "\
# A recipe for `endgrain batch --recipe FILE` (condition, compare and audit take it too). Every key is an option without its
# dashes. Take the '#' away from what is to be set; what stays commented keeps its default. The command line wins over the
# recipe. Where a list is shown, several values may stand in it.

# Names of the outputs: {name} {stem} {ext} {folder} {number}
#name = \"{folder}/{name}\"
";

const TAIL: &str = "
# Exceptions for some records. The pattern is for the path as given: * stands for anything, ? for one character, [ab] for one
# of these. A key here replaces the one above; where several exceptions are for a record, the last one wins.
#[[override]]
#match = \"*/tower_*.csv\"
#lowpass = [\"20Hz\"]
";

/// Every key with its help, commented out.
fn recipe() -> String {
    let defaults = Settings::default().to_map();
    let mut text = HEAD.to_owned();
    let mut group = None;
    for row in rows() {
        if group != Some(row.group) {
            group = Some(row.group);
            let _ = writeln!(text, "\n# {}", row.group.heading());
        }
        for line in wrapped(row.help, 118) {
            let _ = writeln!(text, "# {line}");
        }
        let _ = writeln!(text, "#{} = {}", row.key, example(&row, &defaults));
    }
    text.push_str(TAIL);
    text
}

/// The default where there is one, else what the value stands for.
fn example(row: &OptionRow, defaults: &Map<String, Value>) -> String {
    let quoted = |text: &str| Value::from(text).to_string();
    match (row.arity, defaults.get(row.key).and_then(Value::as_str)) {
        (Arity::Switch, _) => "false".to_owned(),
        (_, Some(default)) => quoted(default),
        (Arity::Once, None) => quoted(row.value),
        (Arity::Many, None) => format!("[{}]", quoted(row.value)),
    }
}

fn wrapped(text: &str, width: usize) -> Vec<String> {
    let mut lines = vec![String::new()];
    for word in text.split_whitespace() {
        let last = lines.len() - 1;
        if !lines[last].is_empty() && lines[last].chars().count() + 1 + word.chars().count() > width {
            lines.push(word.to_owned());
        } else {
            let line = &mut lines[last];
            if !line.is_empty() {
                line.push(' ');
            }
            line.push_str(word);
        }
    }
    lines
}

/// A recipe as JSON Schema: the keys with their help, and nothing else allowed.
fn schema() -> Value {
    let plain = || json!({"type": ["string", "number"]});
    let keys: Map<String, Value> = rows()
        .iter()
        .map(|row| {
            let mut shape = match row.arity {
                Arity::Switch => json!({"type": "boolean"}),
                Arity::Once => plain(),
                Arity::Many => json!({"anyOf": [plain(), {"type": "array", "items": plain()}]}),
            };
            shape["description"] = row.help.into();
            (row.key.to_owned(), shape)
        })
        .collect();
    let mut exception = keys.clone();
    exception.insert("match".to_owned(), json!({"type": "string", "description": "Pattern of the paths it is for"}));
    let mut whole = keys;
    whole.insert("name".to_owned(), json!({"type": "string", "description": "Template of output names"}));
    let exception =
        json!({"type": "object", "properties": exception, "required": ["match"], "additionalProperties": false});
    whole.insert("override".to_owned(), json!({"type": "array", "items": exception}));
    json!({
        "$schema": "https://json-schema.org/draft/2020-12/schema",
        "title": "Recipe",
        "description": "Options of a run; JSON results hold the same keys under \"settings\"",
        "type": "object",
        "properties": whole,
        "additionalProperties": false,
    })
}
