//! Integrals under end conditions against closed forms, published pulses and trials with noise.

mod random;

use std::f64::consts::{PI, TAU};

use endgrain::basis::Planner;
use endgrain::condition::{Outcome, condition, default_baseline};
use endgrain::ends::Ends;
use endgrain::operator::{Chain, Conditions, Request, Shape};
use endgrain::record::{Axis, Channel, RateSource};
use endgrain::unit::Unit;
use random::Random;

/// A record's axis, unit and chain.
struct Bench {
    axis: Axis,
    unit: Unit,
    chain: Chain,
    ends: Ends,
    planner: Planner,
}

impl Bench {
    fn new(len: usize, length: f64, times: u8, conditions: &str, more: &[(&str, &str)], unit: &str) -> Bench {
        let axis = Axis::from_rate_hz(len as f64 / length, len, RateSource::Given).expect("an axis");
        let mut requests = vec![Request::parse("integrate", &times.to_string()).expect("a request")];
        requests.extend(more.iter().map(|(key, value)| Request::parse(key, value).expect("a request")));
        let (chain, _) = Chain::resolve(&requests, &Shape::default(), &axis, len).expect("a chain");
        let conditions: Conditions = conditions.parse().expect("end conditions");
        let ends = if conditions == Conditions::ZeroMean { Ends::Periodic } else { Ends::EVEN };
        let chain = chain.with_conditions(conditions, None);
        Bench { axis, unit: Unit::parse(unit), chain, ends, planner: Planner::new() }
    }

    fn run(&self, samples: &[f64]) -> Outcome {
        let channel = Channel { name: "a", unit: &self.unit, axis: &self.axis, samples };
        let baseline = default_baseline(self.ends, &self.chain);
        condition(channel, &self.chain, self.ends, baseline, &self.planner).expect("an integral")
    }
}

/// Integrates midpoint samples of `record` over `length` seconds under conditions, in m/s2.
fn integrated(
    record: impl Fn(f64) -> f64,
    length: f64,
    count: usize,
    times: u8,
    conditions: &str,
) -> (Vec<f64>, Outcome) {
    let samples: Vec<f64> = (0..count).map(|n| record((n as f64 + 0.5) * length / count as f64)).collect();
    let outcome = Bench::new(count, length, times, conditions, &[], "m/s2").run(&samples);
    (outcome.output.clone(), outcome)
}

/// The integrals at the end of the record, not at its last sample.
fn arrival(outcome: &Outcome, length: f64, count: usize) -> (f64, f64) {
    let step = length / count as f64;
    let integral = outcome.integral.as_ref().expect("an integral");
    (integral.arrival.first * step, integral.arrival.second * step * step)
}

const G: f64 = 9.80665; // CGPM 1901
const A: f64 = 30.0 * G;
const T: f64 = 0.011;

#[test]
fn shock_pulses_have_the_velocity_changes_of_the_standard() {
    // IEC 60068-2-27:2008 and MIL-STD-810: 2AT/pi, AT/2, AT/2; de Silva, Vibration and Shock Handbook, 12.1.4 and 12.1.5,
    // and Harris and Crede: displacement at the end of the pulse from rest AT^2/pi, AT^2/4, AT^2/6.
    type Pulse = fn(f64) -> f64;
    let pulses: [(&str, Pulse, f64, f64); 3] = [
        ("half-sine", |t| A * (PI * t / T).sin(), 2.060225, 11.3312e-3),
        ("versed-sine", |t| A / 2.0 * (1.0 - (TAU * t / T).cos()), 1.618097, 8.89953e-3),
        ("saw-tooth", |t| A * t / T, 1.618097, 5.93302e-3),
    ];
    for (name, pulse, velocity, displacement) in pulses {
        let count = 1000;
        let (_, outcome) = integrated(pulse, T, count, 2, "start-rest");
        let (v, d) = arrival(&outcome, T, count);
        assert!((v / velocity - 1.0).abs() < 1e-6, "{name}: {v}");
        assert!((d / displacement - 1.0).abs() < 1e-5, "{name}: {d}"); // six printed digits
    }
    // Drop height that gives the half-sine's velocity change: dv^2/2g = 216.411 mm.
    let (_, outcome) = integrated(|t| A * (PI * t / T).sin(), T, 1000, 1, "start-rest");
    let v = arrival(&outcome, T, 1000).0;
    assert!((v * v / (2.0 * G) / 0.216411 - 1.0).abs() < 1e-5);
    // 81.111 in/s.
    assert!((v / 0.0254 / 81.111 - 1.0).abs() < 1e-5);
}

#[test]
fn the_table_of_severities_is_reproduced() {
    // IEC 60068-2-27:2008, Table 1 (rows from memory): peak in m/s2, duration in ms, velocity change in m/s of half-sine,
    // 2AD/pi to three decimals; 0.5 and 0.9 of peak times duration for final-peak saw-tooth and trapezoid.
    #[rustfmt::skip]
    let rows: [(f64, f64, f64); 14] = [
        (50.0, 30.0, 0.955), (150.0, 11.0, 1.050), (300.0, 18.0, 3.438), (300.0, 11.0, 2.101), (300.0, 6.0, 1.146),
        (500.0, 11.0, 3.501), (1000.0, 11.0, 7.003), (1000.0, 6.0, 3.820), (2000.0, 6.0, 7.639), (2000.0, 3.0, 3.820),
        (5000.0, 1.0, 3.183), (10000.0, 1.0, 6.366), (15000.0, 0.5, 4.775), (30000.0, 0.2, 3.820),
    ];
    for (peak, ms, printed) in rows {
        let duration = ms / 1e3;
        let change = |pulse: &dyn Fn(f64) -> f64| {
            arrival(&integrated(pulse, duration, 1000, 1, "start-rest").1, duration, 1000).0
        };
        let half_sine = change(&|t| peak * (PI * t / duration).sin());
        assert!((half_sine - printed).abs() <= 0.0005 + 1e-9, "{peak} {ms}: {half_sine}");
        let saw_tooth = change(&|t| peak * t / duration);
        assert!((saw_tooth / (0.5 * peak * duration) - 1.0).abs() < 1e-9);
        // Rise and fall over a tenth each. The corners of the trapezoid cost O(h^2).
        let ramp = duration / 10.0;
        let trapezoid = change(&|t| peak * (t / ramp).min((duration - t) / ramp).min(1.0));
        assert!((trapezoid / (0.9 * peak * duration) - 1.0).abs() < 1e-6);
    }
}

#[test]
fn at_the_calibrators_frequency_one_unit_is_one_unit() {
    // omega = 1000 rad/s, 159.1549431 Hz: 1 m/s2 is 1 mm/s is 1 um (ISO 16063, common calibration practice).
    let f = 1000.0 / TAU;
    assert!((f - 159.1549431).abs() < 1e-7);
    let (length, count) = (20.0 / f, 4000);
    let (v, _) = integrated(|t| (1000.0 * t).sin(), length, count, 1, "zero-mean");
    let (d, _) = integrated(|t| (1000.0 * t).sin(), length, count, 2, "zero-mean");
    for n in 0..count {
        let t = (n as f64 + 0.5) * length / count as f64;
        assert!((v[n] * 1e3 + (1000.0 * t).cos()).abs() < 1e-9, "{n}");
        assert!((d[n] * 1e6 + (1000.0 * t).sin()).abs() < 1e-9, "{n}");
    }
}

#[test]
fn harmonic_motion_follows_its_relations() {
    // a = (2 pi f)^2 d, v = 2 pi f d (ISO 2041; IEC 60068-2-6): amplitude, frequency, acceleration, velocity.
    for (mm, f, a, v) in
        [(1.0, 10.0, 3.947842, 62.83185), (0.1, 50.0, 9.869604, 31.41593), (10.0, 5.0, 9.869604, 314.1593)]
    {
        let (length, count) = (8.0 / f, 2000);
        let peak = |x: &[f64]| x.iter().fold(0.0_f64, |m, v| m.max(v.abs()));
        let (velocity, _) = integrated(|t| a * (TAU * f * t).cos(), length, count, 1, "zero-mean");
        let (displacement, _) = integrated(|t| a * (TAU * f * t).cos(), length, count, 2, "zero-mean");
        // The largest of 250 samples a cycle is within (pi/250)^2/2 of the peak; figures of seven digits.
        assert!((peak(&velocity) * 1e3 / v - 1.0).abs() < 1e-4 && (peak(&displacement) * 1e3 / mm - 1.0).abs() < 1e-4);
    }
    // 0.075 mm at 1 g cross over at 57.55 Hz, 0.35 mm at 5 g at 59.57 Hz (IEC 60068-2-6, from memory); handbook rules:
    // v = 61.448 g/f in/s, D = 19.5595 g/f^2 in peak to peak.
    for (mm, g, f) in [(0.075, 1.0, 57.55), (0.15, 2.0, 57.55), (0.35, 5.0, 59.57)] {
        let length = 10.0 / f;
        let (d, _) = integrated(|t| g * G * (TAU * f * t).cos(), length, 4000, 2, "zero-mean");
        let peak = d.iter().fold(0.0_f64, |m, v| m.max(v.abs()));
        assert!((peak * 1e3 / mm - 1.0).abs() < 5e-4, "{mm}: {peak}");
        assert!((2.0 * peak / 0.0254 / (19.5595 * g / (f * f)) - 1.0).abs() < 1e-4);
        let (v, _) = integrated(|t| g * G * (TAU * f * t).cos(), length, 4000, 1, "zero-mean");
        let peak = v.iter().fold(0.0_f64, |m, v| m.max(v.abs()));
        assert!((peak / 0.0254 / (61.448 * g / f) - 1.0).abs() < 1e-4);
    }
}

#[test]
fn a_milli_g_of_offset_goes_far_in_a_minute() {
    // 1 mg over 60 s: 0.588399 m/s and 17.65197 m.
    let samples = vec![1.0; 6000];
    let outcome = Bench::new(6000, 60.0, 2, "start-rest", &[], "mg").run(&samples);
    let step: f64 = 0.01;
    let integral = outcome.integral.as_ref().expect("an integral");
    let scale = 1e-3 * G;
    assert!((integral.arrival.first * step * scale / 0.588399 - 1.0).abs() < 1e-6); // printed digits
    assert!((integral.arrival.second * step * step * scale / (scale * 1800.0) - 1.0).abs() < 1e-9);
    assert!((scale * 1800.0 - 17.65197).abs() < 1e-5);
}

#[test]
fn polynomials_exponentials_and_cubics_integrate_exactly() {
    // A parabola is its own baseline: exact to rounding.
    let (d, _) = integrated(|t| 1.0 - 0.5 * t + 0.2 * t * t, 4.0, 300, 2, "start-rest");
    for (n, value) in d.iter().enumerate() {
        let t = (n as f64 + 0.5) * 4.0 / 300.0;
        let exact = t * t / 2.0 - t.powi(3) / 12.0 + t.powi(4) / 60.0;
        assert!((value - exact).abs() < 1e-11, "{n}: {value} {exact}"); // slopes are fitted from rounded samples
    }
    // Largest error over the record for smooth records without end slopes taken off would be 6.6e-5 for N = 200 over 4 s,
    // and 1.0e-7 with estimated slopes; a cumulative trapezoid twice 2.2e-4.
    type Pair = (fn(f64) -> f64, fn(f64) -> f64);
    let cases: [Pair; 2] =
        [(|t| t.powi(3), |t| t.powi(5) / 20.0), (|t| (0.7 * t).exp(), |t| ((0.7 * t).exp() - 1.0 - 0.7 * t) / 0.49)];
    for (record, exact) in cases {
        let mut last = f64::INFINITY;
        for count in [50, 200, 800] {
            let (d, _) = integrated(record, 4.0, count, 2, "start-rest");
            let error = d
                .iter()
                .enumerate()
                .map(|(n, v)| (v - exact((n as f64 + 0.5) * 4.0 / count as f64)).abs())
                .fold(0.0, f64::max)
                / exact(4.0);
            // What is left after the parabola has a kink in its third derivative only: O(h^4), 256 times less each.
            assert!(error < last / 100.0, "{count}: {error} after {last}");
            last = error;
        }
        assert!(last < 1e-9, "{last}");
    }
}

#[test]
fn a_half_cycle_too_many_does_not_hurt_the_end_line() {
    // a = A sin(2 pi f t) over m + 1/2 cycles from rest: v = A/(2 pi f) (1 - cos(2 pi f t)), mean A/(2 pi f).
    let w = TAU * 1.25;
    let (v, _) = integrated(|t| (w * t).sin(), 2.0, 1000, 1, "start-rest");
    let worst = (0..1000).map(|n| (v[n] - (1.0 - (w * (n as f64 + 0.5) / 500.0).cos()) / w).abs()).fold(0.0, f64::max);
    assert!(worst < 1e-8, "{worst}");
}

#[test]
fn conditions_hold_and_known_motion_comes_back() {
    // A move by 0.25 m in 10 s from rest to rest, with an offset and a drift of the sensor.
    let (length, count) = (10.0, 2000);
    let w = TAU / length;
    let travel = 0.25;
    let truth = |t: f64| travel * (t / length - (w * t).sin() / TAU);
    let record = |t: f64| travel / length * w * (w * t).sin() + 0.05 + 0.002 * (t - length / 2.0);
    for conditions in ["rest-to=0.25m", "rest-to=250mm", "still=0s..0.05s,9.95s..9.999s"] {
        let (d, outcome) = integrated(record, length, count, 2, conditions);
        let constants = outcome.integral.as_ref().expect("constants").constants;
        let step = length / count as f64;
        let tolerance = if conditions.starts_with("still") { 0.02 } else { 1e-7 };
        assert!((constants.offset - 0.05).abs() < tolerance, "{conditions}: {}", constants.offset);
        assert!((constants.drift / step - 0.002).abs() < tolerance, "{conditions}: {}", constants.drift / step);
        if !conditions.starts_with("still") {
            let worst = (0..count).map(|n| (d[n] - truth((n as f64 + 0.5) * step)).abs()).fold(0.0, f64::max);
            assert!(worst < 1e-7, "{conditions}: {worst}");
        }
    }
    let (_, outcome) = integrated(record, length, count, 2, "start-rest-to=0.25m");
    assert!((arrival(&outcome, length, count).1 - 0.25).abs() < 1e-12);
    let (_, outcome) = integrated(record, length, count, 2, "pinned=-2mm");
    assert!((arrival(&outcome, length, count).1 + 0.002).abs() < 1e-12);
    let (_, outcome) = integrated(record, length, count, 1, "rest");
    assert!(arrival(&outcome, length, count).0.abs() < 1e-12);
}

#[test]
fn noise_scatters_as_the_band_says() {
    // 1500 records of white noise under every kind of end conditions: the scatter of the result at five places against the
    // band. 1500 trials scatter by 1.8 %.
    use endgrain::integral::{Band, HighPass, Solver, Trial};
    let (count, length, trials) = (128usize, 4.0, 1500);
    type Case<'a> = (&'a str, Solver, &'a [(&'a str, &'a str)]);
    let cases: [Case<'_>; 8] = [
        ("start-rest", Solver::StartRest, &[]),
        ("rest", Solver::Rest, &[]),
        ("rest-to=0m", Solver::RestTo(0.0), &[]),
        ("start-rest-to=0m", Solver::StartRestTo(0.0), &[]),
        ("pinned", Solver::Pinned(0.0), &[]),
        ("zero-mean", Solver::ZeroMean, &[]),
        ("steady", Solver::Steady { drift: true }, &[]),
        ("steady", Solver::Steady { drift: true }, &[("highpass", "1Hz")]),
    ];
    const CORNER: f64 = 1.0 / 32.0; // 1 Hz at 32 samples a second
    let step = length / count as f64;
    for (conditions, solver, more) in cases {
        let bench = Bench::new(count, length, 2, conditions, more, "m/s2");
        let high_gain = |f: f64| if f == 0.0 { 0.0 } else { 1.0 / (1.0 + (CORNER / f).powi(8)) };
        let high = (!more.is_empty()).then_some(HighPass { gain: &high_gain, corner: CORNER });
        let trial =
            Trial { solver: &solver, turns: -2, gain: &|_| 1.0, high, length: count as f64, offset_samples: None };
        let band = Band::of(&trial).expect("a band");
        let mut random = Random(99);
        let places = [6, 32, 64, 96, 126];
        let mut squares = [0.0; 5];
        for _ in 0..trials {
            let noise: Vec<f64> = (0..count).map(|_| random.normal()).collect();
            let d = bench.run(&noise).output;
            for (sum, &n) in squares.iter_mut().zip(&places) {
                *sum += d[n] * d[n] / f64::from(trials);
            }
        }
        for (square, &n) in squares.iter().zip(&places) {
            let predicted = band.deviation(n as f64 + 0.5) * step * step;
            assert!(
                (square.sqrt() / predicted - 1.0).abs() < 0.1,
                "{conditions} {more:?} {n}: {} {predicted}",
                square.sqrt()
            );
        }
    }
}

#[test]
fn integrals_are_linear() {
    let mut random = Random(3);
    for conditions in ["start-rest", "rest", "pinned", "steady", "zero-mean"] {
        let bench = Bench::new(200, 2.0, 2, conditions, &[], "m/s2");
        let factor = random.logarithmic(0.1, 10.0);
        let x: Vec<f64> = (0..200).map(|_| random.normal()).collect();
        let scaled: Vec<f64> = x.iter().map(|v| factor * v).collect();
        let (once, again) = (bench.run(&x).output, bench.run(&scaled).output);
        for (a, b) in once.iter().zip(&again) {
            assert!((factor * a - b).abs() < 1e-10 * factor, "{conditions}: {a} {b}"); // metres, some roundings
        }
    }
}
