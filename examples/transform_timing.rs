//! Times one transform for a driver: prints processor seconds, one run per line that it reads.
//!
//! Usage: `transform_timing KIND INPUT OUTPUT`, with KIND one of dct2, dct3, dct4, dst2, dst3, dst4, dct1, dst1 and INPUT a
//! file of little-endian doubles. The first line out holds the seconds of planning and those of planning with the first
//! transform, whose result goes to OUTPUT.

use endgrain::basis::Plan;
use endgrain::ends::{Ends, Seat};
use std::error::Error;
use std::io::BufRead;

fn main() -> Result<(), Box<dyn Error>> {
    let arguments: Vec<String> = std::env::args().collect();
    let [_, kind, input, output] = arguments.as_slice() else { return Err("usage: KIND INPUT OUTPUT".into()) };
    let (ends, inverse) = match kind.as_str() {
        "dct1" => (Ends::EVEN.seated(Seat::Whole), false),
        "dct2" => (Ends::EVEN, false),
        "dct3" => (Ends::EVEN, true),
        "dct4" => (Ends::EVEN_ODD, false),
        "dst1" => (Ends::ODD.seated(Seat::Whole), false),
        "dst2" => (Ends::ODD, false),
        "dst3" => (Ends::ODD, true),
        "dst4" => (Ends::ODD_EVEN, false),
        other => return Err(format!("unknown transform: {other}").into()),
    };
    let bytes = std::fs::read(input)?;
    let x: Vec<f64> = bytes.as_chunks::<8>().0.iter().map(|b| f64::from_le_bytes(*b)).collect();
    let mut y = x.clone();

    let start = seconds();
    let plan = Plan::new(ends, x.len())?;
    let planned = seconds();
    let mut scratch = vec![0.0; plan.scratch_len()];
    let run = |y: &mut [f64], scratch: &mut [f64]| {
        if inverse { plan.inverse(y, scratch) } else { plan.forward(y, scratch) }
    };
    run(&mut y, &mut scratch);
    let first = seconds();
    std::fs::write(output, y.iter().flat_map(|v| v.to_le_bytes()).collect::<Vec<u8>>())?;
    println!("{:e} {:e} {}", planned - start, first - start, plan.scratch_len());

    for line in std::io::stdin().lock().lines() {
        line?;
        y.copy_from_slice(&x);
        let start = seconds();
        run(&mut y, &mut scratch);
        println!("{:e}", seconds() - start);
    }
    Ok(())
}

/// Processor time of this thread.
fn seconds() -> f64 {
    let time = rustix::time::clock_gettime(rustix::time::ClockId::ThreadCPUTime);
    time.tv_sec as f64 + time.tv_nsec as f64 * 1e-9
}
