//! The limits of a density hold as often as they say: simulated records of known density.

#[expect(dead_code, reason = "shared with tests that draw other numbers")]
mod random;

use std::sync::LazyLock;

use endgrain::basis::Planner;
use endgrain::spectrum::{Density, Detrend, Limits, Segments, adaptive, band, sine, welch, window};
use random::Random;

const RATE: f64 = 1000.0;
const LEN: usize = 1600;

static PLANNER: LazyLock<Planner> = LazyLock::new(Planner::new);

/// White noise of unit variance, so of density 2/rate; or the same through a resonance at 100 Hz, with its density.
fn record(random: &mut Random, len: usize, coloured: bool) -> Vec<f64> {
    if !coloured {
        return (0..len).map(|_| random.normal()).collect();
    }
    let (radius, angle) = POLE;
    let (mut a, mut b) = (0.0, 0.0);
    // The resonance has forgotten its start after 300 samples: 0.85^300 is 1e-21.
    let response = (0..len + 300).map(|_| {
        let value = random.normal() + 2.0 * radius * angle.cos() * a - radius * radius * b;
        (a, b) = (value, a);
        value
    });
    response.skip(300).collect()
}

/// Radius and angle: 100 Hz, half-power width about 50 Hz.
const POLE: (f64, f64) = (0.85, std::f64::consts::TAU * 0.1);

/// The density at a line; at zero and the Nyquist frequency a one-sided density counts once.
fn truth(frequency: f64, coloured: bool) -> f64 {
    let at_end = frequency == 0.0 || frequency >= RATE / 2.0 * (1.0 - 1e-12);
    let white = if at_end { 1.0 } else { 2.0 } / RATE;
    if !coloured {
        return white;
    }
    let (radius, angle) = POLE;
    let omega = std::f64::consts::TAU * frequency / RATE;
    // |1 - 2 r cos(a) z + r^2 z^2|^2 at z = exp(-i omega).
    let re = 1.0 - 2.0 * radius * angle.cos() * omega.cos() + radius * radius * (2.0 * omega).cos();
    let im = 2.0 * radius * angle.cos() * omega.sin() - radius * radius * (2.0 * omega).sin();
    white / (re * re + im * im)
}

type Estimate = fn(&[f64]) -> Density;

fn by_segments(x: &[f64], name: &str, overlap: f64) -> Density {
    let segments = Segments::new(x.len(), 128, overlap).expect("segments");
    welch(x, RATE, segments, window(name).expect("a window"), Detrend::Mean, &PLANNER).expect("a density")
}

const ESTIMATES: &[(&str, Estimate)] = &[
    ("welch", |x| by_segments(x, "hann", 0.5)),
    ("welch, blackman-harris, 75 %", |x| by_segments(x, "blackman-harris", 0.75)),
    ("sine:8", |x| sine(x, RATE, 8, Detrend::Mean, &PLANNER).expect("a density")),
    ("sine:30", |x| sine(x, RATE, 30, Detrend::Mean, &PLANNER).expect("a density")),
    ("sine", |x| adaptive(x, RATE, Detrend::Mean, &PLANNER).expect("a density")),
];

/// Share of lines whose limits hold the truth, between two frequencies.
fn coverage(densities: &[Density], coloured: bool, from: f64, to: f64) -> f64 {
    let mut limits = Limits::new(0.95).expect("a level");
    let (mut held, mut all) = (0, 0);
    for density in densities {
        for line in 0..density.len() {
            let frequency = density.frequency(line);
            if frequency < from || frequency > to {
                continue;
            }
            let (low, high) = limits.factors(density.freedom[line]);
            let truth = truth(frequency, coloured);
            held += usize::from(density.values[line] * low <= truth && truth <= density.values[line] * high);
            all += 1;
        }
    }
    held as f64 / all as f64
}

fn densities(estimate: Estimate, coloured: bool, records: u64) -> Vec<Density> {
    (0..records).map(|seed| estimate(&record(&mut Random(1000 + seed), LEN, coloured))).collect()
}

#[test]
fn limits_hold_the_truth_in_95_of_100_lines() {
    for (name, estimate) in ESTIMATES {
        let white = densities(*estimate, false, 40);
        // The lowest lines are left out: the mean that is taken off takes a part of them along.
        for (from, to) in [(30.0, RATE / 2.0), (50.0, 300.0)] {
            let found = coverage(&white, false, from, to);
            assert!((0.93..=0.97).contains(&found), "{name}, white, {from} to {to} Hz: {found}");
        }
        let found = coverage(&densities(*estimate, true, 40), true, 60.0, 140.0);
        assert!((0.93..=0.97).contains(&found), "{name}, about a resonance: {found}");
    }
}

#[test]
fn limits_hold_beside_zero_and_the_nyquist_frequency() {
    // Few lines, many records. Without the mirror image the limits would be missed twice as often there.
    let bare = |x: &[f64]| sine(x, RATE, 8, Detrend::None, &PLANNER).expect("a density");
    let densities: Vec<Density> = (0..2000).map(|seed| bare(&record(&mut Random(90_000 + seed), 199, false))).collect();
    for (from, to) in [(0.0, 1.0), (4.0, 11.0), (RATE / 2.0 - 1.0, RATE / 2.0)] {
        let found = coverage(&densities, false, from, to);
        // 2000 records of one or two lines: a standard error of half a per cent.
        assert!((0.93..=0.97).contains(&found), "{from} to {to} Hz: {found}");
    }
}

#[test]
fn limits_of_a_band_hold_its_power() {
    let mut limits = Limits::new(0.95).expect("a level");
    for (name, estimate) in ESTIMATES {
        let densities = densities(*estimate, false, 150);
        for (low, high) in [(100.0, 125.0), (80.3, 160.7), (50.0, 400.0)] {
            let expected = 2.0 / RATE * (high - low);
            let mut held = 0;
            for density in &densities {
                let (a, b) = band(density, low, high).rms_limits(&mut limits);
                held += usize::from(a * a <= expected && expected <= b * b);
            }
            // 150 records: a standard error of 1.8 %; three of them below 95 %.
            let share = held as f64 / densities.len() as f64;
            assert!(share > 0.895, "{name}, {low} to {high} Hz: {share}");
        }
    }
}
