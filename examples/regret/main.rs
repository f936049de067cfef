//! How much each choice of extension costs at the edges, over a folder of records whose true continuation is known.
//!
//! `cargo run --release --example regret -- FOLDER`: FOLDER holds one-column CSV files, `manifest.json` and `windows.json`.

mod operators;
mod output;
mod records;
mod rules;
mod table;

use std::process::ExitCode;

fn main() -> ExitCode {
    match run() {
        Ok(()) => ExitCode::SUCCESS,
        Err(message) => {
            eprintln!("{message}");
            ExitCode::FAILURE
        }
    }
}

fn run() -> Result<(), String> {
    let arguments: Vec<String> = std::env::args().skip(1).collect();
    let folder = arguments
        .iter()
        .find(|a| !a.starts_with("--"))
        .ok_or("usage: regret FOLDER [--operator NAME] [--fine] [--cases]")?;
    let wanted = arguments.iter().position(|a| a == "--operator").and_then(|at| arguments.get(at + 1));
    let cases = records::load(std::path::Path::new(folder))?;
    let scores = rules::score_all(&cases, wanted.map(String::as_str), arguments.iter().any(|a| a == "--fine"));
    if arguments.iter().any(|a| a == "--cases") {
        table::print_cases(&scores);
    } else {
        table::print(&scores);
    }
    Ok(())
}
