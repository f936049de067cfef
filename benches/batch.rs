//! Small logs through a batch: records a second by the clock, and by processor time, which a busy machine does not spoil.
//!
//! `cargo bench --bench batch [-- RECORDS]`: invented logs of 1,000 rows and three axes, two jobs, outputs and results made
//! safe in groups; with a low-pass and a named extension, then with `auto`; and the same again with everything done already.

use std::f64::consts::TAU;
use std::fmt::Write;
use std::num::NonZeroUsize;
use std::path::{Path, PathBuf};
use std::sync::atomic::AtomicBool;
use std::time::Instant;

use endgrain::fleet::{self, Batch, End, Item, Plan, Recipe, Shard, Template};
use endgrain::settings::Layer;
use rustix::time::{ClockId, clock_gettime};

const ROWS: usize = 1000;
const JOBS: usize = 2;

fn main() {
    let count = std::env::args().filter_map(|argument| argument.parse().ok()).next().unwrap_or(2000);
    let folder = tempfile::tempdir_in(env!("CARGO_TARGET_TMPDIR")).expect("a folder");
    let logs: Vec<PathBuf> = (0..count).map(|number| log(folder.path(), number)).collect();
    let named = [("lowpass", "12Hz"), ("extension", "odd"), ("baseline", "line")];
    let auto = [("lowpass", "12Hz")];
    for (label, options, into) in
        [("named extension", &named[..], "named"), ("done already", &named[..], "named"), ("auto", &auto[..], "auto")]
    {
        let (wall, processor) = timed(&logs, options, &folder.path().join(into));
        let rate = |seconds: f64| count as f64 / seconds;
        println!(
            "{label}: {:.0} records a second by the clock; {:.3} ms of processor time a record, so {:.0} a second on {JOBS} cores",
            rate(wall),
            1e3 * processor / count as f64,
            rate(processor / JOBS as f64),
        );
    }
}

fn timed(logs: &[PathBuf], options: &[(&str, &str)], into: &Path) -> (f64, f64) {
    let mut flags = Layer::default();
    for (key, value) in options {
        flags.add(key, [(*value).to_owned()]).expect("a key");
    }
    std::fs::create_dir_all(into).expect("a folder");
    let (start, before) = (Instant::now(), processor_time());
    let items = logs.iter().map(Item::new).collect();
    let plan = Plan::new(items, &Recipe::default(), &flags, &Template::default(), into).expect("a plan");
    let jobs = NonZeroUsize::new(JOBS).expect("jobs");
    let batch = Batch { plan, into: into.to_owned(), shard: Shard::WHOLE, jobs, memory: 1 << 30, max_failures: None };
    let (tally, end) = fleet::run(&batch, &AtomicBool::new(false), &|_| {}).expect("results");
    assert_eq!((end, tally.done + tally.kept), (End::Complete, logs.len() as u64));
    (start.elapsed().as_secs_f64(), processor_time() - before)
}

/// Of all threads of this process, user and system, in seconds.
fn processor_time() -> f64 {
    let time = clock_gettime(ClockId::ProcessCPUTime);
    time.tv_sec as f64 + time.tv_nsec as f64 * 1e-9
}

fn log(folder: &Path, number: usize) -> PathBuf {
    let mut state = number as u64 + 1;
    let mut noise = || {
        state = state.wrapping_mul(6364136223846793005).wrapping_add(1442695040888963407);
        (state >> 11) as f64 / (1u64 << 53) as f64 - 0.5
    };
    let mut text = "t [s],ax [g],ay [g],az [g]\n".to_owned();
    for row in 0..ROWS {
        let t = row as f64 / 200.0;
        let wave = |f: f64| 0.05 * (TAU * f * t + number as f64).sin();
        let axes = [wave(1.7) + wave(31.0), wave(3.1) + wave(23.0), 1.0 + wave(6.7)].map(|v| v + 0.03 * noise());
        writeln!(text, "{t:.3},{:.5},{:.5},{:.5}", axes[0], axes[1], axes[2]).expect("a string grows");
    }
    let path = folder.join(format!("log_{number:06}.csv"));
    std::fs::write(&path, text).expect("a log");
    path
}
