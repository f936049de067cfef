//! Foretells the next sample of a record from the ones before it, alike on every machine.
//!
//! Everything here is +, -, x and / on doubles in the stated order, with nothing fused: a decoder that keeps the order gets
//! the same bits. Samples come in units of the step, less an offset: see [`crate::codec`].

mod covariance;
mod gradient;

use covariance::Covariance;
use gradient::Gradient;

/// A way to foretell.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub struct Method {
    /// Samples that a least-squares prediction looks back on: 0, 1, 2, 4, 8, 16, 24 or 32.
    pub order: u8,
    /// Its memory: a sample n steps back counts (1 - 2^-memory)^n; 5..=16.
    pub memory: u8,
    /// Samples that a gradient prediction of the remainder looks back on: 0, 16, 32 or 256.
    pub taps: u16,
}

impl Method {
    /// What a file may name.
    pub fn is_valid(self) -> bool {
        matches!(self.order, 0 | 1 | 2 | 4 | 8 | 16 | 24 | 32)
            && (5..=16).contains(&self.memory)
            && matches!(self.taps, 0 | 16 | 32 | 256)
    }
}

/// The state of a prediction.
#[derive(Debug)]
pub struct Predictor {
    covariance: Covariance,
    gradient: Option<Gradient>,
    /// What the first stage foretold.
    first: f64,
}

impl Predictor {
    /// Before the first sample.
    pub fn new(method: Method) -> Predictor {
        Predictor {
            covariance: Covariance::new(usize::from(method.order), method.memory),
            gradient: (method.taps > 0).then(|| Gradient::new(usize::from(method.taps))),
            first: 0.0,
        }
    }

    /// The next sample; 0 where nothing finite can be said.
    pub fn next(&mut self) -> f64 {
        self.first = self.covariance.next();
        let second = self.gradient.as_mut().map_or(0.0, Gradient::next);
        let sum = self.first + second;
        // Beyond 2^60 steps a prediction says nothing.
        if sum.abs() < 1_152_921_504_606_846_976.0 { sum } else { 0.0 }
    }

    /// Takes the sample that came.
    pub fn learn(&mut self, sample: f64) {
        if let Some(gradient) = &mut self.gradient {
            gradient.learn(sample - self.first);
        }
        self.covariance.learn(sample);
    }
}
