//! Invented channels, clipped and not, with and without spikes.

use super::random::Random;

/// A sum of three to six tones between 0.002 and 0.15 cycles a sample, about unit RMS.
pub fn tones(random: &mut Random, len: usize) -> Vec<f64> {
    let count = 3 + (random.next() % 4) as usize;
    let parts: Vec<(f64, f64, f64)> =
        (0..count).map(|_| (0.3 + random.uniform(), random.logarithmic(0.002, 0.15), random.uniform() * 6.3)).collect();
    let power: f64 = parts.iter().map(|(a, ..)| a * a / 2.0).sum();
    let value = |n: usize| -> f64 {
        parts.iter().map(|(a, f, p)| a * (std::f64::consts::TAU * f * n as f64 + p).sin()).sum::<f64>() / power.sqrt()
    };
    (0..len).map(value).collect()
}

/// A channel of a length.
type Kind = fn(&mut Random, usize) -> Vec<f64>;

/// Kinds of channel that nothing has clipped. Each is quantised to a random lsb half of the time.
pub const UNCLIPPED: &[(&str, Kind)] = &[
    ("white noise", |random, len| (0..len).map(|_| random.normal()).collect()),
    ("tones", tones),
    ("tones and noise", |random, len| {
        let noise = random.uniform() * 0.3;
        tones(random, len).into_iter().map(|v| v + noise * random.normal()).collect()
    }),
    ("slow sine", |random, len| {
        let cycles = 1.0 + 6.0 * random.uniform();
        (0..len).map(|n| (std::f64::consts::TAU * cycles * n as f64 / len as f64).sin()).collect()
    }),
    ("shocks from rest", |random, len| {
        let mut values: Vec<f64> = (0..len).map(|_| 0.002 * random.normal()).collect();
        for _ in 0..4 {
            let at = (random.uniform() * len as f64 * 0.9) as usize;
            let size = 1.0 + random.uniform();
            for (n, value) in values[at..].iter_mut().enumerate().take(400) {
                *value += size * (-(n as f64) / 60.0).exp() * (n as f64 * 0.5).sin();
            }
        }
        values
    }),
    ("drift", |random, len| {
        let mut sum = 0.0;
        (0..len)
            .map(|_| {
                sum += random.normal();
                sum * 0.05
            })
            .collect()
    }),
    ("few bits", |random, len| (0..len).map(|_| (random.normal() * 1.5).round()).collect()),
    ("ring-down", |random, len| {
        let f = random.logarithmic(0.005, 0.1);
        (0..len).map(|n| (-(n as f64) / 500.0).exp() * (std::f64::consts::TAU * f * n as f64).cos()).collect()
    }),
    ("heavy tails", |random, len| (0..len).map(|_| random.normal().powi(3)).collect()),
];

/// The values on multiples of an lsb of 2^-6 to 2^-13 of the largest magnitude, half of the time.
pub fn maybe_quantised(random: &mut Random, values: Vec<f64>) -> Vec<f64> {
    if random.uniform() < 0.5 {
        return values;
    }
    let largest = values.iter().fold(0.0, |most: f64, v| most.max(v.abs()));
    let lsb = largest * 2f64.powi(-6 - (random.next() % 8) as i32);
    values.into_iter().map(|v| (v / lsb).round() * lsb).collect()
}
