//! A long look back by steepest descent: finds tones that outlast the short equations.

/// Sums kept side by side: their order is part of the format.
const LANES: usize = 8;
/// Share of the error that a step takes off, normalised.
const RATE: f64 = 1.0 / 256.0;

/// Normalised least mean squares over the last samples.
#[derive(Debug)]
pub struct Gradient {
    weights: Vec<f64>,
    /// Twice the length: the newest `weights.len()` samples stand from `at` on, newest first.
    history: Vec<f64>,
    at: usize,
    energy: f64,
    foretold: f64,
}

impl Gradient {
    pub fn new(taps: usize) -> Gradient {
        Gradient { weights: vec![0.0; taps], history: vec![0.0; 16 * taps], at: 15 * taps, energy: 0.0, foretold: 0.0 }
    }

    /// Sum of weight x sample: lane l adds up taps l, l + 8, ...; then neighbours, pairs and halves.
    pub fn next(&mut self) -> f64 {
        let taps = self.weights.len();
        let mut lanes = [0.0; LANES];
        let history = &self.history[self.at..self.at + taps];
        for (w, h) in self.weights.chunks_exact(LANES).zip(history.chunks_exact(LANES)) {
            for lane in 0..LANES {
                lanes[lane] += w[lane] * h[lane];
            }
        }
        let [a, b, c, d, e, f, g, h] = lanes;
        self.foretold = ((a + b) + (c + d)) + ((e + f) + (g + h));
        if self.foretold.abs() < 1_152_921_504_606_846_976.0 {
            return self.foretold;
        }
        self.weights.fill(0.0);
        self.foretold = 0.0;
        0.0
    }

    pub fn learn(&mut self, sample: f64) {
        let taps = self.weights.len();
        let rate = RATE * (sample - self.foretold) / (self.energy + taps as f64);
        for (w, h) in self.weights.iter_mut().zip(&self.history[self.at..self.at + taps]) {
            *w += rate * h;
        }
        let oldest = self.history[self.at + taps - 1];
        let energy = self.energy + (sample * sample - oldest * oldest);
        self.energy = if energy > 0.0 { energy } else { 0.0 };
        if self.at == 0 {
            let end = self.history.len();
            self.history.copy_within(0..taps, end - taps);
            self.at = end - taps;
        }
        self.at -= 1;
        self.history[self.at] = sample;
    }
}
