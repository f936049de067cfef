//! Three core paths for counting instructions: `core_paths read|transform|condition`, always the same work on one thread.

use endgrain::basis::Plan;
use endgrain::ends::Ends;
use endgrain::job::{self, Target};
use endgrain::read::{self, Input, ReadOptions};
use endgrain::settings::Settings;
use endgrain::write::Overwrite;
use std::error::Error;
use std::hint::black_box;
use std::io::Cursor;

fn main() -> Result<(), Box<dyn Error>> {
    rayon::ThreadPoolBuilder::new().num_threads(1).build_global()?;
    match std::env::args().nth(1).as_deref() {
        Some("read") => {
            let input = Input::Stream(Box::new(Cursor::new(text(50_000))));
            black_box(read::read(input, &ReadOptions::default())?);
        }
        Some("transform") => {
            let plan = Plan::new(Ends::EVEN, 65_536)?;
            let mut scratch = vec![0.0; plan.scratch_len()];
            let mut x: Vec<f64> = (0..plan.len()).map(|n| (n as f64 * 0.07).sin()).collect();
            for _ in 0..4 {
                plan.forward(&mut x, &mut scratch);
                plan.inverse(&mut x, &mut scratch);
            }
            black_box(x);
        }
        Some("condition") => {
            let mut settings = Settings::default();
            settings.set("lowpass", "20Hz")?;
            let input = Input::Stream(Box::new(Cursor::new(text(1000))));
            let target = Target::stream(Box::new(std::io::sink()), None, Overwrite::Force);
            black_box(job::condition(input, target, &settings)?);
        }
        _ => return Err("usage: read|transform|condition".into()),
    }
    Ok(())
}

/// A log at 1 kHz with one axis.
fn text(rows: usize) -> String {
    let value = |n: usize| (n as f64 * 0.07).sin() + 0.2 * (n as f64 * 1.9).sin();
    let rows = (0..rows).map(|n| format!("{:.3},{:.5}\n", n as f64 / 1000.0, value(n)));
    std::iter::once("t [s],a [g]\n".to_owned()).chain(rows).collect()
}
