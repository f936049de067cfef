//! Samples as the cosine coefficients of their segments, with a lattice of remainders where every sample is bounded.

mod quantiser;
pub mod segments;
pub mod slope;
pub mod spread;

pub use quantiser::Quantiser;

use crate::basis::Planner;
use crate::codec::bytes::{Fields, put_count};
use crate::codec::coder::{Binary, Decoder, Encoder, Hint, Integers, Meter};
use crate::error::{Error, Result};
use quantiser::State;

/// A coded block of cosine coefficients.
#[derive(Debug, Clone, PartialEq)]
pub struct Series {
    pub quantiser: Quantiser,
    /// Step of the coefficients.
    pub step: f32,
    /// Factors of t, t^2, ... of the polynomial on top.
    pub factors: Vec<f32>,
    /// Lengths of the segments; they add up to the block.
    pub lengths: Vec<usize>,
    /// Levels of each segment in turn, without trailing zeros.
    pub levels: Vec<Vec<i64>>,
}

/// Remainders beside the series: sample = series + step x q.
#[derive(Debug, Clone, PartialEq)]
pub struct Remainder {
    pub step: f64,
    pub steps: Vec<i64>,
}

/// Coefficients ready to be quantised.
#[derive(Debug, Clone)]
pub struct Prepared {
    pub factors: Vec<f32>,
    pub lengths: Vec<usize>,
    pub coefficients: Vec<f64>,
    pub spread: Vec<f64>,
}

impl Prepared {
    /// From the coefficients of segments.
    pub fn new(factors: Vec<f32>, lengths: Vec<usize>, coefficients: Vec<f64>) -> Prepared {
        let mut spread = Vec::with_capacity(coefficients.len());
        let mut at = 0;
        for len in &lengths {
            spread.extend(spread::around(&coefficients[at..at + len]));
            at += len;
        }
        Prepared { factors, lengths, coefficients, spread }
    }

    /// Quantised with a step; also the squared error that this leaves.
    pub fn quantise(&self, quantiser: Quantiser, step: f32) -> (Series, f64) {
        let unit = f64::from(step);
        let scaled = |values: &[f64]| values.iter().map(|v| v / unit).collect::<Vec<f64>>();
        let levels = quantiser::levels(quantiser, &scaled(&self.coefficients), &scaled(&self.spread));
        let mut kept = Vec::with_capacity(self.lengths.len());
        let (mut at, mut error) = (0, 0.0);
        let mut state = State::default();
        for len in &self.lengths {
            let mut segment = levels[at..at + len].to_vec();
            for (level, c) in segment.iter().zip(&self.coefficients[at..]) {
                let off = c - unit * quantiser.value(state, *level);
                error += off * off;
                state = quantiser.next(state, *level);
            }
            while segment.last() == Some(&0) {
                segment.pop();
            }
            kept.push(segment);
            at += len;
        }
        let series =
            Series { quantiser, step, factors: self.factors.clone(), lengths: self.lengths.clone(), levels: kept };
        (series, error)
    }
}

impl Series {
    /// The samples that the series stands for.
    ///
    /// # Errors
    /// `Malformed` where they are not finite.
    pub fn samples(&self, planner: &Planner) -> Result<Vec<f64>> {
        let total: usize = self.lengths.iter().sum();
        let mut out = Vec::with_capacity(total);
        let mut state = State::default();
        for (len, levels) in self.lengths.iter().zip(&self.levels) {
            let start = out.len();
            out.resize(start + len, 0.0);
            for k in 0..*len {
                let level = levels.get(k).copied().unwrap_or(0);
                out[start + k] = f64::from(self.step) * self.quantiser.value(state, level);
                state = self.quantiser.next(state, level);
            }
            if !levels.is_empty() {
                segments::inverse(&mut out[start..], planner)?;
            }
        }
        slope::add(&mut out, &self.factors, 1.0);
        match out.iter().position(|v| !v.is_finite()) {
            Some(n) => Err(Error::malformed(format!("sample {n} is not finite"))),
            None => Ok(out),
        }
    }

    /// Coefficients that are not zero, and the index past the last of them, over all segments.
    pub fn kept(&self) -> (usize, usize) {
        let kept = self.levels.iter().flatten().filter(|level| **level != 0).count();
        (kept, self.levels.iter().map(Vec::len).max().unwrap_or(0))
    }

    /// The payload, with the remainders where there are any.
    pub fn encode(&self, remainder: Option<&Remainder>) -> Vec<u8> {
        let mut out = vec![u8::from(self.quantiser == Quantiser::Trellis) | (self.factors.len() as u8) << 1];
        out.extend(self.step.to_le_bytes());
        self.factors.iter().for_each(|factor| out.extend(factor.to_le_bytes()));
        put_count(&mut out, self.lengths.len() as u64);
        for (n, (len, levels)) in self.lengths.iter().zip(&self.levels).enumerate() {
            if n + 1 < self.lengths.len() {
                put_count(&mut out, *len as u64);
            }
            put_count(&mut out, levels.len() as u64);
        }
        if let Some(remainder) = remainder {
            out.extend(remainder.step.to_le_bytes());
        }
        let mut encoder = Encoder::default();
        self.code_levels(&mut encoder);
        if let Some(remainder) = remainder {
            remainder.code(&mut encoder);
        }
        out.extend(encoder.finish());
        out
    }

    /// About how many bits the payload takes.
    pub fn bits(&self) -> f64 {
        let mut meter = Meter::default();
        self.code_levels(&mut meter);
        meter.bits() + 8.0 * (6 + 4 * self.factors.len() + 4 * self.lengths.len()) as f64
    }

    /// A payload of `len` samples; with its remainders where the block says that it has them.
    ///
    /// # Errors
    /// `Malformed` where the fields say what cannot be.
    pub fn decode(payload: &[u8], len: usize, with_remainder: bool) -> Result<(Series, Option<Remainder>)> {
        let mut fields = Fields::new(payload);
        let flags = fields.byte()?;
        let degree = usize::from(flags >> 1);
        if degree > slope::MOST {
            return Err(Error::malformed("a polynomial of an unknown degree"));
        }
        let quantiser = if flags & 1 == 1 { Quantiser::Trellis } else { Quantiser::Plain };
        let step = fields.single()?;
        let factors = (0..degree).map(|_| fields.single()).collect::<Result<Vec<f32>>>()?;
        // A segment takes two bytes at least.
        let count = fields.length(len.min(1 + fields.rest().len() / 2))?;
        let (mut lengths, mut kept, mut left) = (Vec::with_capacity(count), Vec::with_capacity(count), len);
        for n in 0..count {
            let length = if n + 1 < count { fields.length(left)? } else { left };
            if length == 0 {
                return Err(Error::malformed("a segment of no samples"));
            }
            left -= length;
            lengths.push(length);
            kept.push(fields.length(length)?);
        }
        if left > 0 {
            return Err(Error::malformed("segments that do not fill their block"));
        }
        let unit = if with_remainder { Some(fields.double()?) } else { None };
        let mut decoder = Decoder::new(fields.rest());
        let empty = kept.iter().map(|kept| vec![0; *kept]).collect();
        let mut series = Series { quantiser, step, factors, lengths, levels: empty };
        series.levels = series.code_levels(&mut decoder);
        let remainder = unit.map(|step| {
            let mut remainder = Remainder { step, steps: vec![0; len] };
            remainder.steps = remainder.code(&mut decoder);
            remainder
        });
        Ok((series, remainder))
    }

    fn code_levels(&self, coder: &mut impl Binary) -> Vec<Vec<i64>> {
        let mut integers = Integers::default();
        let mut state = State::default();
        let mut out: Vec<Vec<i64>> = Vec::with_capacity(self.levels.len());
        // Magnitudes of the segment before, smoothed, at their share of the band.
        let mut before: Vec<u64> = Vec::new();
        for (len, levels) in self.lengths.iter().zip(&self.levels) {
            let mut coded = Vec::with_capacity(levels.len());
            let mut latest = 0_u64;
            for (k, level) in levels.iter().enumerate() {
                let expected = (!before.is_empty()).then(|| {
                    let at = k * before.len() / len;
                    (before[at.min(before.len() - 1)] + latest) / 2
                });
                let class = usize::from(self.quantiser == Quantiser::Trellis && state.second());
                let level = integers.code(coder, *level, Hint { expected, class });
                state = self.quantiser.next(state, level);
                latest = average(latest, level);
                coded.push(level);
            }
            for _ in levels.len()..*len {
                state = self.quantiser.next(state, 0);
            }
            if self.lengths.len() > 1 {
                before = smoothed(&coded, *len);
            }
            out.push(coded);
        }
        out
    }
}

/// A running average of magnitudes in 1/256, a quarter of each new one.
fn average(before: u64, level: i64) -> u64 {
    let magnitude = (level.unsigned_abs().min(1 << 40) << 8) as i64;
    (before as i64 + (magnitude - before as i64) / 4) as u64
}

/// For each coefficient of a segment the mean of itself (twice) and its neighbours, in 1/256.
fn smoothed(levels: &[i64], len: usize) -> Vec<u64> {
    let magnitude = |k: usize| levels.get(k).map_or(0, |level| level.unsigned_abs().min(1 << 40) << 8);
    (0..len).map(|k| (2 * magnitude(k) + magnitude(k + 1) + magnitude(k.saturating_sub(1))) / 4).collect()
}

impl Remainder {
    /// The remainders of samples beside a series, each within half a step.
    pub fn of(samples: &[f64], series: &[f64], step: f64) -> Remainder {
        let steps = samples.iter().zip(series).map(|(x, s)| ((x - s) / step).round() as i64).collect();
        Remainder { step, steps }
    }

    /// About how many bits they take.
    pub fn bits(&self) -> f64 {
        let mut meter = Meter::default();
        self.code(&mut meter);
        meter.bits()
    }

    /// Adds them to a series.
    pub fn add(&self, series: &mut [f64]) {
        for (sample, q) in series.iter_mut().zip(&self.steps) {
            *sample += self.step * *q as f64;
        }
    }

    fn code(&self, coder: &mut impl Binary) -> Vec<i64> {
        let mut integers = Integers::default();
        self.steps.iter().map(|q| integers.code(coder, *q, Hint::default())).collect()
    }
}
