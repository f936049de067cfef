//! Standard streams and interrupts.

use std::io::{self, IsTerminal, Read, Write};
use std::path::{Path, PathBuf};
use std::sync::atomic::{AtomicBool, Ordering};

use endgrain::error::{Error, Result};
use endgrain::read::Input;
use endgrain::write;

/// The input that a FILE argument names; `-` is standard input.
///
/// # Errors
/// `Usage` when standard input is a terminal: waiting for someone to type a record would look like a hang.
pub fn input(argument: &str) -> Result<Input> {
    if argument != "-" {
        return Ok(Input::Path(PathBuf::from(argument)));
    }
    if io::stdin().is_terminal() {
        return Err(
            Error::usage("'-' reads standard input, which is a terminal").remedy("pipe a record in, or name a file")
        );
    }
    let stdin: Box<dyn Read + Send> = Box::new(io::stdin());
    Ok(Input::Stream(stdin))
}

/// True when the path means standard output.
pub fn is_stdout(path: &Path) -> bool {
    path.as_os_str() == "-"
}

/// Writes to standard output.
///
/// # Errors
/// `Closed` when the reader has gone, `Io` otherwise.
pub fn print(text: &str) -> Result<()> {
    let mut stdout = io::stdout().lock();
    stdout.write_all(text.as_bytes())?;
    Ok(stdout.flush()?)
}

/// Writes a message for people to standard error; nobody is told when that fails.
pub fn tell(text: &str) {
    let _ = io::stderr().lock().write_all(text.as_bytes());
}

/// Tells an error.
pub fn complain(error: &Error) {
    tell(&format!("endgrain: {error}\n"));
}

/// Set by the first interrupt of a batch: it ends after the records in work.
pub static STOP: AtomicBool = AtomicBool::new(false);

/// True while an interrupt means to end in good order.
static ORDERLY: AtomicBool = AtomicBool::new(false);

/// From now on the first interrupt sets `STOP`; a second one ends at once.
pub fn end_orderly_on_interrupt() {
    ORDERLY.store(true, Ordering::SeqCst);
}

/// On an interrupt or a request to end: remove what is half written, then stop with 75 (run it again).
pub fn discard_partial_files_on_interrupt() {
    // Without a handler the default action ends the program too, only less tidily: a failure here changes no result.
    let _ = ctrlc::set_handler(|| {
        if ORDERLY.load(Ordering::SeqCst) && !STOP.swap(true, Ordering::SeqCst) {
            tell("endgrain: interrupted; ending after the records in work (again: at once)\n");
            return;
        }
        write::discard_pending();
        tell("endgrain: interrupted; no partial file is left\n");
        std::process::exit(75);
    });
}
