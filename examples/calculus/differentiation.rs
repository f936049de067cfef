//! Slope and curvature of an invented profile, with and without noise, by extensions and by a plain script.

use std::f64::consts::TAU;

use endgrain::baseline::BaselineKind;
use endgrain::basis::Planner;
use endgrain::condition::condition;
use endgrain::ends::Ends;
use endgrain::operator::{Chain, Request, Shape};
use endgrain::record::{Axis, Channel, RateSource};
use endgrain::unit::Unit;

use crate::plain::{self, Pass};
use crate::{Random, median, short};

const COUNT: usize = 1000;
const RATE: f64 = 100.0;
/// Corner of the low-pass where there is noise.
const CORNER: f64 = 2.5;

/// Value, slope and curvature: tones of about unit RMS on a slow rise, 10 s.
fn truth(t: f64) -> [f64; 3] {
    let tones = [(0.9, 0.23, 0.4), (0.7, 0.61, 2.0), (0.5, 1.07, 4.1)];
    tones.iter().fold([0.2 * t, 0.2, 0.0], |sum, &(size, f, phase)| {
        let (sine, cosine) = (TAU * f * t + phase).sin_cos();
        let w = TAU * f;
        [sum[0] + size * sine, sum[1] + size * w * cosine, sum[2] - size * w * w * sine]
    })
}

struct Way {
    name: &'static str,
    form: fn(&[f64], u8, bool) -> Option<Vec<f64>>,
}

static WAYS: [Way; 7] = [
    Way { name: "periodic", form: |x, times, noisy| library(x, times, noisy, Ends::Periodic, BaselineKind::None) },
    Way { name: "even", form: |x, times, noisy| library(x, times, noisy, Ends::EVEN, BaselineKind::None) },
    Way {
        name: "periodic, line off",
        form: |x, times, noisy| library(x, times, noisy, Ends::Periodic, BaselineKind::Line),
    },
    Way { name: "odd, line off", form: |x, times, noisy| library(x, times, noisy, Ends::ODD, BaselineKind::Line) },
    Way {
        name: "even, slopes off",
        form: |x, times, noisy| library(x, times, noisy, Ends::EVEN, BaselineKind::Slopes),
    },
    Way {
        name: "even, tangents off",
        form: |x, times, noisy| library(x, times, noisy, Ends::EVEN, BaselineKind::Tangents),
    },
    Way {
        name: "script: zero-phase low-pass, gradient",
        form: |x, times, noisy| {
            let smooth = if noisy { plain::zero_phase(x, CORNER, 1.0 / RATE, Pass::Low) } else { x.to_vec() };
            let slope = plain::gradient(&smooth, 1.0 / RATE);
            Some(if times == 1 { slope } else { plain::gradient(&slope, 1.0 / RATE) })
        },
    },
];

fn library(samples: &[f64], times: u8, noisy: bool, ends: Ends, baseline: BaselineKind) -> Option<Vec<f64>> {
    let axis = Axis::from_rate_hz(RATE, samples.len(), RateSource::Given).ok()?;
    let mut requests = vec![Request::parse("differentiate", &times.to_string()).ok()?];
    if noisy {
        requests.push(Request::parse("lowpass", &format!("{CORNER}Hz")).ok()?);
    }
    let (chain, _) = Chain::resolve(&requests, &Shape::Gaussian, &axis, samples.len()).ok()?;
    let unit = Unit::parse("m");
    let channel = Channel { name: "z", unit: &unit, axis: &axis, samples };
    Some(condition(channel, &chain, ends, baseline, &Planner::new()).ok()?.output)
}

pub fn table() {
    println!(
        "Slope and curvature, % of their RMS: largest within 3 % of the ends | inner RMS; {COUNT} samples, noise of the RMS value"
    );
    print!("{:<40}", "");
    for noise in ["0", ".002", ".02"] {
        print!("{:>20}{:>20}", format!("slope, {noise}"), format!("curvature, {noise}"));
    }
    println!();
    for way in &WAYS {
        print!("{:<40}", way.name);
        for noise in [0.0, 0.002, 0.02] {
            for times in [1, 2] {
                let found: Vec<[f64; 2]> =
                    (0..if noise > 0.0 { 12 } else { 1 }).filter_map(|seed| trial(way, times, noise, seed)).collect();
                let column = |k: usize| short(median(found.iter().map(|errors| errors[k]).collect()));
                print!("{:>20}", format!("{} | {}", column(0), column(1)));
            }
        }
        println!();
    }
}

fn trial(way: &Way, times: u8, noise: f64, seed: u64) -> Option<[f64; 2]> {
    let mut random = Random(500 + seed);
    let time = |n: usize| (n as f64 + 0.5) / RATE;
    let record: Vec<f64> = (0..COUNT).map(|n| truth(time(n))[0] + noise * random.normal()).collect();
    let wanted: Vec<f64> = (0..COUNT).map(|n| truth(time(n))[usize::from(times)]).collect();
    let found = (way.form)(&record, times, noise > 0.0)?;
    let rms = |x: &mut dyn Iterator<Item = f64>| {
        let (sum, count) = x.fold((0.0, 0.0), |(sum, count), v| (sum + v * v, count + 1.0));
        (sum / count).sqrt()
    };
    let whole = rms(&mut wanted.iter().copied());
    let edge = COUNT * 3 / 100;
    let apart: Vec<f64> = found.iter().zip(&wanted).map(|(f, w)| f - w).collect();
    let largest = apart[..edge].iter().chain(&apart[COUNT - edge..]).fold(0.0_f64, |m, v| m.max(v.abs()));
    let inner = rms(&mut apart[COUNT / 10..COUNT - COUNT / 10].iter().copied());
    Some([100.0 * largest / whole, 100.0 * inner / whole])
}
