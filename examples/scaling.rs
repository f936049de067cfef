//! Conditions one channel of a given length: prints the seconds of planning and conditioning, and how it was worked on.
//!
//! Usage: `scaling SAMPLES low-pass|integral`. A low-pass of 50 Hz at 4 kHz dies away and is worked on in blocks; an integral
//! needs the transform of the whole length.

use endgrain::baseline::BaselineKind;
use endgrain::basis::Planner;
use endgrain::condition::{Layout, condition};
use endgrain::ends::Ends;
use endgrain::operator::{Chain, Request, Shape};
use endgrain::record::{Axis, Channel, RateSource};
use endgrain::unit::Unit;
use std::error::Error;
use std::time::Instant;

fn main() -> Result<(), Box<dyn Error>> {
    let arguments: Vec<String> = std::env::args().collect();
    let [_, len, operator] = arguments.as_slice() else { return Err("usage: SAMPLES low-pass|integral".into()) };
    let len: usize = len.parse()?;
    let request = match operator.as_str() {
        "low-pass" => Request::parse("lowpass", "50Hz")?,
        "integral" => Request::parse("integrate", "1")?,
        other => return Err(format!("unknown operator: {other}").into()),
    };
    let axis = Axis::from_rate_hz(4000.0, len, RateSource::Given)?;
    let (chain, _) = Chain::resolve(&[request], &Shape::parse("butterworth:4")?, &axis, len)?;
    let samples: Vec<f64> = (0..len).map(|n| (n as f64 * 0.021).sin() + (n * n % 97) as f64 * 0.01).collect();
    let unit = Unit::parse("m/s2");
    let channel = Channel { name: "a", unit: &unit, axis: &axis, samples: &samples };
    let start = Instant::now();
    let outcome = condition(channel, &chain, Ends::EVEN, BaselineKind::None, &Planner::new())?;
    let seconds = start.elapsed().as_secs_f64();
    let way = if Layout::of(&chain.passes()[0], len).is_some() { "blocks" } else { "whole" };
    println!("{seconds:e} {way} {}", outcome.output.len());
    Ok(())
}
