//! Displacement from acceleration: four invented truths, noise, offset and drift, by scripts and by end conditions.

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

const RATE: f64 = 200.0;
const SEEDS: u64 = 12;
const NOISE: f64 = 0.02;
const OFFSET: f64 = 0.05;
const DRIFT: f64 = 0.002;

/// Acceleration and displacement of an invented motion.
struct Truth {
    name: &'static str,
    seconds: f64,
    /// Displacement from start to end.
    net: f64,
    form: fn(f64, &mut Random) -> Motion,
}

type Motion = Box<dyn Fn(f64) -> (f64, f64)>;

/// Tones: amplitude of displacement, frequency, phase.
fn tones(tones: Vec<(f64, f64, f64)>) -> Motion {
    Box::new(move |t| {
        tones.iter().fold((0.0, 0.0), |(a, d), &(size, f, phase)| {
            let value = size * (TAU * f * t + phase).sin();
            (a - (TAU * f).powi(2) * value, d + value)
        })
    })
}

static TRUTHS: [Truth; 4] = [
    Truth {
        name: "move .25 m, 10 s",
        seconds: 10.0,
        net: 0.25,
        form: |_, _| {
            // A cycloidal move from 2 to 8 s.
            Box::new(|t: f64| {
                let u = ((t - 2.0) / 6.0).clamp(0.0, 1.0);
                (0.25 * TAU / 36.0 * (TAU * u).sin(), 0.25 * (u - (TAU * u).sin() / TAU))
            })
        },
    },
    Truth {
        name: "burst, 10 s",
        seconds: 10.0,
        net: 0.0,
        form: |_, _| {
            // A 1.3 Hz tone under exp(-(t - 5)^2/(2 s^2)), s = 0.9: 10 mm.
            Box::new(|t: f64| {
                let (w, s) = (TAU * 1.3, 0.9);
                let x = t - 5.0;
                let envelope = 0.01 * (-x * x / (2.0 * s * s)).exp();
                let (sine, cosine) = (w * x).sin_cos();
                let bend = x * x / s.powi(4) - 1.0 / (s * s) - w * w;
                (envelope * (bend * sine - 2.0 * x / (s * s) * w * cosine), envelope * sine)
            })
        },
    },
    Truth {
        name: "steady 2.4+7.9 Hz, 20 s",
        seconds: 20.0,
        net: 0.0,
        form: |_, _| tones(vec![(2e-3, 2.4, 0.7), (0.3e-3, 7.9, 1.9)]),
    },
    Truth {
        name: "random .45-3 Hz, 20 s",
        seconds: 20.0,
        net: 0.0,
        form: |_, random| {
            tones((0..40).map(|_| (1e-3, 0.45 + 2.55 * random.uniform(), TAU * random.uniform())).collect())
        },
    },
];

/// A way from acceleration to displacement.
struct Method {
    name: &'static str,
    form: fn(&[f64], &Truth) -> Option<Vec<f64>>,
}

const STEP: f64 = 1.0 / RATE;

static METHODS: [Method; 11] = [
    Method {
        name: "script: mean, trapezoid twice",
        form: |a, _| Some(plain::trapezoid(&plain::trapezoid(&plain::centred(a), STEP), STEP)),
    },
    Method {
        name: "script: parabola off v",
        form: |a, _| Some(plain::trapezoid(&plain::without_parabola(&plain::trapezoid(a, STEP)), STEP)),
    },
    Method {
        name: "script: detrend, HP .2 Hz on a, v, d",
        form: |a, _| {
            let high = |x: &[f64]| plain::zero_phase(x, 0.2, STEP, Pass::High);
            let a = high(&plain::detrended(a));
            Some(high(&plain::trapezoid(&high(&plain::trapezoid(&a, STEP)), STEP)))
        },
    },
    Method { name: "rest", form: |a, t| library(a, t, "rest", None) },
    Method {
        name: "still, first and last 1.5 s",
        form: |a, t| (t.seconds == 10.0).then(|| library(a, t, "still=0s..1.5s,8.5s..9.995s", None)).flatten(),
    },
    Method {
        name: "start-rest-to=D",
        form: |a, t| {
            let conditions = format!("start-rest-to={}m", t.net);
            (t.seconds == 10.0).then(|| library(a, t, &conditions, None)).flatten()
        },
    },
    Method {
        name: "rest-to=D",
        form: |a, t| {
            let conditions = format!("rest-to={}m", t.net);
            (t.seconds == 10.0).then(|| library(a, t, &conditions, None)).flatten()
        },
    },
    Method { name: "steady:offset", form: |a, t| library(a, t, "steady:offset", None) },
    Method { name: "steady", form: |a, t| library(a, t, "steady", None) },
    Method { name: "steady, HP .2 Hz on d", form: |a, t| library(a, t, "steady", Some("0.2Hz")) },
    Method { name: "steady, HP .4 Hz on d", form: |a, t| library(a, t, "steady", Some("0.4Hz")) },
];

fn library(samples: &[f64], _: &Truth, conditions: &str, high: Option<&str>) -> Option<Vec<f64>> {
    let len = samples.len();
    let axis = Axis::from_rate_hz(RATE, len, RateSource::Given).ok()?;
    let mut requests = vec![Request::parse("integrate", "2").ok()?];
    requests.extend(high.and_then(|corner| Request::parse("highpass", corner).ok()));
    let (chain, _) = Chain::resolve(&requests, &Shape::default(), &axis, len).ok()?;
    let chain = chain.with_conditions(conditions.parse().ok()?, None);
    let unit = Unit::parse("m/s2");
    let channel = Channel { name: "a", unit: &unit, axis: &axis, samples };
    // Even ends without a baseline, as the table's conditions ask; the default takes the end slopes off as well.
    Some(condition(channel, &chain, Ends::EVEN, BaselineKind::None, &Planner::new()).ok()?.output)
}

/// Largest error, error at the last sample, RMS of the inner 80 %: of the peak displacement, in percent. A constant apart
/// is no error of the steady motions, whose place is not known; of the others it is.
fn errors(found: &[f64], wanted: &[f64], place_known: bool) -> [f64; 3] {
    let n = wanted.len();
    let mean = |x: &[f64]| x.iter().sum::<f64>() / x.len() as f64;
    let shift = if place_known { 0.0 } else { mean(found) - mean(wanted) };
    let apart: Vec<f64> = found.iter().zip(wanted).map(|(f, w)| f - w - shift).collect();
    let peak = wanted.iter().fold(0.0_f64, |m, v| m.max(v.abs()));
    let largest = apart.iter().fold(0.0_f64, |m, v| m.max(v.abs()));
    let inner = &apart[n / 10..n - n / 10];
    let rms = (inner.iter().map(|v| v * v).sum::<f64>() / inner.len() as f64).sqrt();
    [largest, apart[n - 1].abs(), rms].map(|error| 100.0 * error / peak)
}

pub fn table() {
    println!(
        "Displacement, % of the peak: largest | end | inner RMS; {RATE} Hz, noise {NOISE}, offset {OFFSET}, drift {DRIFT}/s"
    );
    print!("{:<38}", "");
    TRUTHS.iter().for_each(|truth| print!("{:>26}", truth.name));
    println!();
    for method in &METHODS {
        print!("{:<38}", method.name);
        for truth in &TRUTHS {
            let found: Vec<[f64; 3]> = (0..SEEDS).filter_map(|seed| trial(method, truth, seed)).collect();
            if found.is_empty() {
                print!("{:>26}", "-");
                continue;
            }
            let column = |k: usize| short(median(found.iter().map(|errors| errors[k]).collect()));
            print!("{:>26}", format!("{} | {} | {}", column(0), column(1), column(2)));
        }
        println!();
    }
    println!();
}

fn trial(method: &Method, truth: &Truth, seed: u64) -> Option<[f64; 3]> {
    let mut random = Random(1000 + seed);
    let motion = (truth.form)(truth.seconds, &mut random);
    let count = (truth.seconds * RATE) as usize;
    let time = |n: usize| (n as f64 + 0.5) * STEP;
    let record: Vec<f64> = (0..count)
        .map(|n| {
            let t = time(n);
            motion(t).0 + OFFSET + DRIFT * (t - truth.seconds / 2.0) + NOISE * random.normal()
        })
        .collect();
    let wanted: Vec<f64> = (0..count).map(|n| motion(time(n)).1).collect();
    Some(errors(&(method.form)(&record, truth)?, &wanted, truth.seconds == 10.0))
}
