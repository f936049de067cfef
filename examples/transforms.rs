//! Serves the transforms to programs in other languages, so that they can be compared with other libraries.
//!
//! One request a line on the standard input: operation (`forward`, `inverse`, `turned`), ends (`periodic`, `even`, `odd`,
//! `even-odd`, `odd-even`), seat (`half`, `whole`), then the numbers, all separated by blanks. One line of numbers answers,
//! each with the fewest digits that read back to the same f64. A malformed request ends the program with code 2.

use std::fmt::Write as _;
use std::io::{BufRead, BufWriter, Write as _};
use std::process::ExitCode;

use endgrain::basis::Planner;
use endgrain::ends::{Ends, Seat};

fn main() -> ExitCode {
    match serve() {
        Ok(()) => ExitCode::SUCCESS,
        Err(message) => {
            eprintln!("transforms: {message}");
            ExitCode::from(2)
        }
    }
}

fn serve() -> Result<(), String> {
    let planner = Planner::new();
    let mut output = BufWriter::new(std::io::stdout().lock());
    for line in std::io::stdin().lock().lines() {
        let answer = answer(&planner, &line.map_err(|e| e.to_string())?)?;
        writeln!(output, "{answer}").and_then(|()| output.flush()).map_err(|e| e.to_string())?;
    }
    Ok(())
}

fn answer(planner: &Planner, request: &str) -> Result<String, String> {
    let mut words = request.split_ascii_whitespace();
    let (operation, name, seat) = (words.next(), words.next(), words.next());
    let seat = match seat {
        Some("half") => Seat::Half,
        Some("whole") => Seat::Whole,
        other => return Err(format!("seat: {other:?}")),
    };
    let ends =
        Ends::all().find(|ends| Some(ends.name()) == name).ok_or_else(|| format!("ends: {name:?}"))?.seated(seat);
    let mut values: Vec<f64> =
        words.map(|word| word.parse().map_err(|e| format!("{word:?}: {e}"))).collect::<Result<_, _>>()?;
    let plan = planner.plan(ends, values.len()).map_err(|e| e.to_string())?;
    let mut scratch = vec![f64::NAN; plan.scratch_len()];
    match operation {
        Some("forward") => plan.forward(&mut values, &mut scratch),
        Some("inverse") => plan.inverse(&mut values, &mut scratch),
        Some("turned") => plan.inverse_turned(&mut values, &mut scratch),
        other => return Err(format!("operation: {other:?}")),
    }
    let mut line = String::with_capacity(24 * values.len());
    for value in values {
        // Writing to a string cannot fail.
        let _ = write!(line, "{value:e} ");
    }
    Ok(line)
}
