//! Conditions many small logs in one process, one thread, and tells how many a second: with and without waits for the disk.
//!
//! Usage: `small_logs [COUNT] [FOLDER]`, by default 2000 logs of 1000 rows in a folder under the system's temporary one.
//! Four figures: reading and filtering alone; read, filter and write without a wait for the disk; the same as `condition`
//! does it (temporary name, sidecar, waits for the disk); and the disk's own share, files of that size made, waited for and
//! renamed.

use endgrain::job::{self, Target};
use endgrain::read::Input;
use endgrain::settings::Settings;
use endgrain::write::Overwrite;
use std::error::Error;
use std::fs::{self, File};
use std::io::Write;
use std::path::{Path, PathBuf};
use std::time::Instant;

type Outcome = Result<(), Box<dyn Error>>;

fn main() -> Outcome {
    let mut arguments = std::env::args().skip(1);
    let count: usize = arguments.next().map_or(Ok(2000), |text| text.parse())?;
    let folder = arguments.next().map_or_else(|| std::env::temp_dir().join("endgrain-small-logs"), PathBuf::from);
    fs::create_dir_all(&folder)?;
    let log = folder.join("log.csv");
    fs::write(&log, text())?;
    let mut settings = Settings::default();
    for (key, value) in [("lowpass", "20Hz"), ("extension", "even")] {
        settings.set(key, value)?;
    }
    rayon::ThreadPoolBuilder::new().num_threads(1).build_global()?;

    let run = |target: Target<'_>| job::condition(Input::Path(log.clone()), target, &settings).map(|_| ());
    let sink = |_: usize| -> Outcome { Ok(run(Target::stream(Box::new(std::io::sink()), None, Overwrite::Force))?) };
    rate("read, filter, format", count, &sink)?;
    let output = |n: usize| folder.join(format!("{n}.csv"));
    let plain = |n: usize| -> Outcome {
        let file = File::create(output(n))?;
        Ok(run(Target::stream(Box::new(file), None, Overwrite::Force))?)
    };
    rate("read, filter, write", count, &plain)?;
    let whole = |n: usize| -> Outcome { Ok(run(Target::file(&output(n), None, Overwrite::Force))?) };
    rate("as condition writes, with sidecar and waits for the disk", count, &whole)?;
    let made = fs::read(output(0))?;
    let waited = |n: usize| -> Outcome { Ok(renamed(&made, &output(n))?) };
    rate("the waits alone: two files written, waited for and renamed", count, &waited)?;
    fs::remove_dir_all(&folder)?;
    Ok(())
}

/// A log of a thousand rows at 1 kHz, one axis.
fn text() -> String {
    let value = |n: usize| (n as f64 * 0.07).sin() + 0.2 * (n as f64 * 1.9).sin();
    let rows = (0..1000).map(|n| format!("{:.3},{:.5}\n", n as f64 / 1000.0, value(n)));
    std::iter::once("t [s],a [g]\n".to_owned()).chain(rows).collect()
}

fn rate(what: &str, count: usize, work: &dyn Fn(usize) -> Outcome) -> Outcome {
    work(0)?;
    let (start, busy) = (Instant::now(), processor_seconds());
    for n in 0..count {
        work(n)?;
    }
    let (wall, busy) = (start.elapsed().as_secs_f64(), processor_seconds() - busy);
    println!("{what}: {:.0} a second, {:.0} a second of processor time", count as f64 / wall, count as f64 / busy);
    Ok(())
}

fn renamed(bytes: &[u8], path: &Path) -> std::io::Result<()> {
    for suffix in ["", ".json"] {
        let mut name = path.as_os_str().to_owned();
        name.push(suffix);
        let part = path.with_extension("part");
        let mut file = File::create(&part)?;
        file.write_all(bytes)?;
        file.sync_all()?;
        fs::rename(&part, &name)?;
        if let Some(folder) = path.parent() {
            File::open(folder)?.sync_all()?;
        }
    }
    Ok(())
}

/// Processor time of all threads.
fn processor_seconds() -> f64 {
    let time = rustix::time::clock_gettime(rustix::time::ClockId::ProcessCPUTime);
    time.tv_sec as f64 + time.tv_nsec as f64 * 1e-9
}
