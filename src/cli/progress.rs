//! How far a batch is: rate, time left and failures so far, on a terminal only.

use std::io::IsTerminal;
use std::time::{Duration, Instant};

use endgrain::fleet::Tally;
use indicatif::{ProgressBar, ProgressDrawTarget, ProgressStyle};

/// A line on a terminal, or nothing.
pub struct Progress {
    bar: Option<ProgressBar>,
    start: Instant,
}

impl Progress {
    /// A line for a batch of `total` records; none where nobody would see it.
    pub fn new(total: u64, quiet: bool) -> Progress {
        let start = Instant::now();
        if quiet || !std::io::stderr().is_terminal() || std::env::var_os("TERM").is_some_and(|term| term == "dumb") {
            return Progress { bar: None, start };
        }
        let bar = ProgressBar::with_draw_target(Some(total), ProgressDrawTarget::stderr_with_hz(5));
        let style = ProgressStyle::with_template("{pos} of {len} records, {per_sec}, {eta} left{msg}");
        bar.set_style(style.unwrap_or_else(|_| ProgressStyle::default_bar()));
        bar.enable_steady_tick(Duration::from_millis(200));
        Progress { bar: Some(bar), start }
    }

    /// Shows how far it is.
    pub fn show(&self, tally: &Tally) {
        if let Some(bar) = &self.bar {
            bar.set_position(tally.settled());
            if tally.failed > 0 {
                bar.set_message(format!(", {} failed", tally.failed));
            }
        }
    }

    /// Takes the line away; gives the seconds since the start.
    pub fn end(&self) -> f64 {
        if let Some(bar) = &self.bar {
            bar.finish_and_clear();
        }
        self.start.elapsed().as_secs_f64()
    }
}
