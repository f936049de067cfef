//! The limits of a density hold as often as they say: simulated records of known density.

mod random;

use endgrain::basis::Planner;
use endgrain::spectrum::{Density, Detrend, Limits, Segments, adaptive, band, sine, welch, window};
use random::Random;

const RATE: f64 = 1000.0;
const LEN: usize = 4000;

/// White noise of unit variance, so of density 2/rate; or the same through a resonance at 100 Hz, with its density.
fn record(random: &mut Random, coloured: bool) -> Vec<f64> {
    let drive: Vec<f64> = (0..LEN + 2000).map(|_| random.normal()).collect();
    if !coloured {
        return drive[2000..].to_vec();
    }
    let (radius, angle) = pole();
    let (mut a, mut b) = (0.0, 0.0);
    let response: Vec<f64> = drive
        .iter()
        .map(|e| {
            let value = e + 2.0 * radius * angle.cos() * a - radius * radius * b;
            (a, b) = (value, a);
            value
        })
        .collect();
    response[2000..].to_vec()
}

/// Radius and angle: 100 Hz, half-power width about 30 Hz.
fn pole() -> (f64, f64) {
    (0.9, std::f64::consts::TAU * 0.1)
}

fn truth(frequency: f64, coloured: bool) -> f64 {
    let white = 2.0 / RATE;
    if !coloured {
        return white;
    }
    let (radius, angle) = pole();
    let omega = std::f64::consts::TAU * frequency / RATE;
    // |1 - 2 r cos(a) z + r^2 z^2|^2 at z = exp(-i omega).
    let re = 1.0 - 2.0 * radius * angle.cos() * omega.cos() + radius * radius * (2.0 * omega).cos();
    let im = 2.0 * radius * angle.cos() * omega.sin() - radius * radius * (2.0 * omega).sin();
    white / (re * re + im * im)
}

type Estimate = fn(&[f64]) -> Density;

const ESTIMATES: &[(&str, Estimate)] = &[
    ("welch", |x| {
        let segments = Segments::new(LEN, 256, 0.5).expect("segments");
        welch(x, RATE, segments, window("hann").expect("hann"), Detrend::Mean, &Planner::new()).expect("a density")
    }),
    ("welch, blackman-harris, 75 %", |x| {
        let segments = Segments::new(LEN, 256, 0.75).expect("segments");
        let window = window("blackman-harris").expect("a window");
        welch(x, RATE, segments, window, Detrend::Mean, &Planner::new()).expect("a density")
    }),
    ("sine:8", |x| sine(x, RATE, 8, Detrend::Mean, &Planner::new()).expect("a density")),
    ("sine:30", |x| sine(x, RATE, 30, Detrend::Mean, &Planner::new()).expect("a density")),
    ("sine", |x| adaptive(x, RATE, Detrend::Mean, &Planner::new()).expect("a density")),
];

/// Share of lines whose limits hold the truth, between two frequencies, over so many records.
fn coverage(estimate: Estimate, coloured: bool, from: f64, to: f64, records: u64) -> f64 {
    let mut limits = Limits::new(0.95).expect("a level");
    let (mut held, mut all) = (0, 0);
    for seed in 0..records {
        let density = estimate(&record(&mut Random(1000 + seed), coloured));
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

#[test]
fn limits_hold_the_truth_in_95_of_100_lines() {
    for (name, estimate) in ESTIMATES {
        // A line near zero shares its bins with its mirror image, which the degrees of freedom account for; the mean that is
        // taken off is another matter: its own line is left out.
        for (from, to) in [(RATE / 100.0, RATE / 2.0), (50.0, 300.0)] {
            let found = coverage(*estimate, false, from, to, 40);
            assert!((0.93..=0.97).contains(&found), "{name}, white, {from} to {to} Hz: {found}");
        }
        let found = coverage(*estimate, true, 60.0, 140.0, 40);
        assert!((0.93..=0.97).contains(&found), "{name}, about a resonance: {found}");
    }
}

#[test]
fn limits_hold_beside_zero_and_the_nyquist_frequency() {
    // Few lines, many records. Without the mirror image the upper limit would be missed far more often there.
    let bare: Estimate = |x| sine(x, RATE, 8, Detrend::None, &Planner::new()).expect("a density");
    for (from, to) in [(0.0, 0.1), (0.3, 1.0), (RATE / 2.0 - 1.0, RATE / 2.0)] {
        let found = coverage(bare, false, from, to, 1500);
        // 1500 records of one to four lines: a standard error of half a per cent at most.
        assert!((0.93..=0.97).contains(&found), "{from} to {to} Hz: {found}");
    }
}

#[test]
fn limits_of_a_band_hold_its_power() {
    let mut limits = Limits::new(0.95).expect("a level");
    for (name, estimate) in ESTIMATES {
        for (low, high) in [(100.0, 110.0), (80.3, 120.7), (50.0, 400.0)] {
            let expected = 2.0 / RATE * (high - low);
            let records = 150;
            let held = (0..records)
                .filter(|seed| {
                    let found = band(&estimate(&record(&mut Random(50_000 + seed), false)), low, high);
                    let (a, b) = found.rms_limits(&mut limits);
                    a * a <= expected && expected <= b * b
                })
                .count();
            // 150 records: a standard error of 1.8 %; three of them either side of 95 %.
            let share = held as f64 / records as f64;
            assert!(share > 0.895, "{name}, {low} to {high} Hz: {share}");
        }
    }
}
