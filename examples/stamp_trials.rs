//! Reads invented time columns and counts what went wrong: `cargo run --release --example stamp_trials -- 2000 SEED`.

#[path = "../tests/columns/mod.rs"]
mod columns;
#[path = "../tests/random/mod.rs"]
mod random;

use std::collections::BTreeMap;
use std::time::Instant;

use columns::{Column, read, stamps};
use random::Random;

fn main() {
    let mut arguments = std::env::args().skip(1).map(|a| a.parse::<u64>());
    let trials = arguments.next().and_then(Result::ok).unwrap_or(2000);
    let mut random = Random(arguments.next().and_then(Result::ok).unwrap_or(1));
    let mut counts: BTreeMap<&str, u64> = BTreeMap::new();
    let mut kinds: BTreeMap<String, u64> = BTreeMap::new();
    let mut right = 0;
    for trial in 0..trials {
        let column = Column::draw(&mut random);
        let reading = read(&column.stamps);
        let faults = column.faults(&reading);
        *kinds.entry(format!("jitter {} -> {:?}", column.jitter > 0.0, reading.spacing)).or_default() += 1;
        for fault in &faults {
            *counts.entry(fault).or_default() += 1;
        }
        if faults.is_empty() {
            right += 1;
        } else {
            println!(
                "column {trial}: {faults:?}: q/h {:.4}, jitter {:.4}, {} rows, {} missing, {}: read {:?}, {} missing, {:?}",
                column.resolution / column.step,
                column.jitter,
                column.stamps.ticks.len(),
                column.missing,
                if column.truncated { "truncated" } else { "rounded" },
                reading.spacing,
                reading.missing,
                reading.scatter,
            );
        }
    }
    println!("{right} of {trials} columns wholly right; faults {counts:?}; kinds {kinds:?}");
    speed();
}

/// Five million stamps of each kind.
fn speed() {
    let mut random = Random(5);
    for (name, jitter, step) in [("whole steps", 0.0, 100.0), ("rounded steps", 0.0, 39.0625), ("jitter", 0.05, 1000.0)]
    {
        let ticks = (0..5_000_000).map(|n| ((f64::from(n) + jitter * random.normal()) * step).round() as i64).collect();
        let column = stamps(1e-6, 1e-6, ticks);
        let timed = (0..5).map(|_| {
            let start = Instant::now();
            let reading = read(&column);
            (start.elapsed().as_secs_f64() * 1e3, reading.spacing)
        });
        let Some((fastest, spacing)) = timed.min_by(|a, b| a.0.total_cmp(&b.0)) else { continue };
        println!("5,000,000 stamps, {name}: {spacing:?} in {fastest:.0} ms, fastest of five");
    }
}
