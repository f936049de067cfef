//! Times reading or writing of one file for a driver: wall and processor seconds, one run per line that it reads.
//!
//! Usage: `file_timing read FILE` or `file_timing write FILE OUTPUT`. Reading takes the SHA-256 of the file in passing, and
//! writing that of the output; the disk is not waited for. A line that names a file gets the columns read, stamps first,
//! as little-endian doubles.

use endgrain::read::{self, Input, ReadOptions};
use endgrain::record::RawRecord;
use endgrain::regularise::{self, RegulariseOptions};
use endgrain::write::{self, Content, Digits, Pending};
use std::error::Error;
use std::fs::File;
use std::io::BufRead;
use std::time::Instant;

fn main() -> Result<(), Box<dyn Error>> {
    let arguments: Vec<String> = std::env::args().collect();
    match arguments.iter().map(String::as_str).collect::<Vec<_>>()[1..] {
        ["read", file] => timed(|| taken(file), |raw, path| std::fs::write(path, doubles(raw))),
        ["write", file, output] => {
            let (record, _) = regularise::regularise(taken(file)?, &RegulariseOptions::default())?;
            let content = Content { digits: Digits::Shortest, ..Content::new(&record) };
            let run = || -> endgrain::error::Result<()> {
                let sink = Pending::stream(output, File::create(output)?);
                write::save(&write::WRITERS[0], &content, sink).map(|_| ())
            };
            timed(run, |(), _| Ok(()))
        }
        _ => Err("usage: read FILE | write FILE OUTPUT".into()),
    }
}

fn taken(file: &str) -> endgrain::error::Result<RawRecord> {
    read::read(Input::Path(file.into()), &ReadOptions::default())
}

fn timed<T>(
    work: impl Fn() -> endgrain::error::Result<T>,
    keep: impl Fn(&T, &str) -> std::io::Result<()>,
) -> Result<(), Box<dyn Error>> {
    for line in std::io::stdin().lock().lines() {
        let (start, busy) = (Instant::now(), processor_seconds());
        let made = work()?;
        println!("{:e} {:e}", start.elapsed().as_secs_f64(), processor_seconds() - busy);
        let path = line?;
        if !path.trim().is_empty() {
            keep(&made, path.trim())?;
        }
    }
    Ok(())
}

fn doubles(raw: &RawRecord) -> Vec<u8> {
    let stamps = raw.stamps.iter().flat_map(|s| s.ticks.iter().map(|&tick| s.first + tick as f64 * s.tick));
    let values = raw.channels.iter().flat_map(|channel| channel.values.iter().copied());
    stamps.chain(values).flat_map(f64::to_le_bytes).collect()
}

/// Processor time of all threads.
fn processor_seconds() -> f64 {
    let time = rustix::time::clock_gettime(rustix::time::ClockId::ProcessCPUTime);
    time.tv_sec as f64 + time.tv_nsec as f64 * 1e-9
}
