//! Spectral lines found again: frequency and amplitude of tones in noise, false alarms, tones beside each other.

use std::f64::consts::TAU;

use super::*;

/// Sum of amplitude, frequency in bins, phase.
fn tones(len: usize, parts: &[(f64, f64, f64)]) -> Vec<f64> {
    let at = |n: usize| parts.iter().map(|(a, bin, p)| a * (TAU * bin * n as f64 / len as f64 + p).cos()).sum();
    (0..len).map(at).collect()
}

/// Normal noise from a fixed seed.
fn noise(len: usize, seed: u64) -> Vec<f64> {
    let mut state = seed.wrapping_mul(0x9e37_79b9_7f4a_7c15) | 1;
    let mut uniform = move || {
        // xorshift64* (Marsaglia 2003; Vigna 2016).
        state ^= state >> 12;
        state ^= state << 25;
        state ^= state >> 27;
        (state.wrapping_mul(0x2545_f491_4f6c_dd1d) >> 11) as f64 / (1u64 << 53) as f64
    };
    (0..len).map(|_| (-2.0 * (1.0 - uniform()).ln()).sqrt() * (TAU * uniform()).cos()).collect()
}

fn found(record: &[f64], count: usize) -> Vec<Line> {
    lines(record, record.len() as f64, count, &Planner::new()).unwrap()
}

#[test]
fn a_lone_tone_is_exact_between_any_two_bins() {
    for step in 0..20 {
        let bin = 123.0 + f64::from(step) / 20.0;
        let tone = tones(1000, &[(2.5, bin, 0.4 * f64::from(step))]);
        let line = found(&tone, 1)[0];
        // The image at the negative frequency leaks in by 1/(pi d^3), d = 246 bins: 2e-8 of the amplitude.
        assert!((line.amplitude - 2.5).abs() < 1e-6 && (line.frequency - bin).abs() < 1e-6, "{bin}: {line:?}");
        assert!(line.steadiness > 1.0 - 1e-6, "{bin}: {line:?}");
    }
}

#[test]
fn leakage_of_a_tone_is_no_line() {
    let tone = tones(2000, &[(1.0, 300.4, 0.2), (0.01, 340.3, 1.0)]);
    let all = found(&tone, 10);
    assert_eq!(all.len(), 2, "{all:?}");
    assert!((all[1].frequency - 340.3).abs() < 0.05 && (all[1].amplitude - 0.01).abs() < 2e-4, "{all:?}");
}

#[test]
fn errors_are_those_that_noise_makes() {
    let len = 1000;
    for bin in [200.0, 200.25, 200.5] {
        let (mut amplitudes, mut frequencies, mut stated) = (Vec::new(), Vec::new(), [0.0; 2]);
        for seed in 0..300 {
            let mut record = tones(len, &[(1.0, bin, 0.7)]);
            record.iter_mut().zip(noise(len, seed + 1)).for_each(|(v, e)| *v += 0.3 * e);
            let line = found(&record, 1)[0];
            amplitudes.push(line.amplitude - 1.0);
            frequencies.push(line.frequency - bin);
            stated[0] += line.amplitude_error / 300.0;
            stated[1] += line.frequency_error / 300.0;
        }
        let spread = |errors: &[f64]| (errors.iter().map(|e| e * e).sum::<f64>() / errors.len() as f64).sqrt();
        // 300 records tell a standard error to 4 %; at a bin's middle the choice of the neighbour adds curvature.
        for (measured, stated, what) in
            [(spread(&amplitudes), stated[0], "amplitude"), (spread(&frequencies), stated[1], "frequency")]
        {
            assert!((measured / stated - 1.0).abs() < 0.25, "{bin} {what}: {measured} against {stated}");
        }
    }
}

#[test]
fn noise_alone_rarely_shows_a_line_and_a_resonance_is_none() {
    let hits = (0..200).filter(|&seed| !found(&noise(1000, 7000 + seed), 5).is_empty()).count();
    // 5 of 100 by construction; the median over 34 bins is itself uncertain, which doubles it at worst.
    assert!(hits <= 24, "{hits} of 200 records of noise show a line");
    let mut lines_of_resonance = 0;
    for seed in 0..20 {
        let drive = noise(9000, 100 + seed);
        let (mut a, mut b) = (0.0, 0.0);
        // A resonance at 0.1 cycles a sample, 0.006 wide: some 50 bins.
        let (r, angle) = (0.98_f64, TAU * 0.1);
        let response: Vec<f64> = drive
            .iter()
            .map(|e| {
                let value = e + 2.0 * r * angle.cos() * a - r * r * b;
                (a, b) = (value, a);
                value
            })
            .collect();
        lines_of_resonance += found(&response[1000..], 10).len();
    }
    assert!(lines_of_resonance <= 6, "{lines_of_resonance} lines in 20 records of a resonance");
}

#[test]
fn a_weak_line_stands_out_of_noise() {
    let mut record = noise(4000, 5);
    record.iter_mut().zip(tones(4000, &[(0.2, 777.3, 0.0)])).for_each(|(v, t)| *v += t);
    let all = found(&record, 3);
    assert_eq!(all.len(), 1, "{all:?}");
    let line = all[0];
    assert!((line.amplitude - 0.2).abs() < 4.0 * line.amplitude_error, "{line:?}");
    assert!((line.frequency - 777.3).abs() < 4.0 * line.frequency_error, "{line:?}");
}

#[test]
fn short_and_silent_records_show_nothing() {
    assert!(found(&[0.0; 400], 5).is_empty());
    assert!(found(&[1.0; 15], 5).is_empty());
    assert!(found(&noise(400, 3), 0).is_empty());
}
