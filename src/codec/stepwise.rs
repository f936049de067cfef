//! Samples one after another as whole steps from what their past foretells: lossless, or within half a step.

use crate::codec::bytes::{Fields, put_count, put_signed};
use crate::codec::coder::{Binary, Decoder, Encoder, Hint, Integers};
use crate::codec::predictor::{Method, Predictor};
use crate::error::{Error, Result};

/// What a step is.
#[derive(Debug, Clone, Copy, PartialEq)]
pub enum Scale {
    /// Sample = (first + stride x v) x numerator / denominator, v whole: data on a converter's or a decimal grid.
    Grid { numerator: f64, denominator: f64, first: i64, stride: u64 },
    /// Sample = offset + step x v, v whole: the offset itself is always met.
    Whole { offset: f64, step: f64 },
    /// Sample = offset + step x (prediction + q), q whole.
    Free { offset: f64, step: f64 },
    /// The 32 bits of a single-precision number, in the order of the numbers; predicted as sample x 2^exponent.
    Single { exponent: i64 },
    /// The 64 bits of a double likewise.
    Double { exponent: i64 },
}

/// How a stretch of samples is coded.
#[derive(Debug, Clone, PartialEq)]
pub struct Plan {
    pub scale: Scale,
    pub method: Method,
    /// Samples off the grid, ascending, with their values.
    pub exceptions: Vec<(usize, f64)>,
}

impl Plan {
    /// The payload of samples.
    pub fn encode(&self, samples: &[f64]) -> Vec<u8> {
        let mut out = Vec::new();
        match self.scale {
            Scale::Grid { numerator, denominator, first, stride } => {
                out.push(0);
                out.extend(numerator.to_le_bytes());
                out.extend(denominator.to_le_bytes());
                put_signed(&mut out, first);
                put_count(&mut out, stride);
            }
            Scale::Whole { offset, step } | Scale::Free { offset, step } => {
                out.push(if matches!(self.scale, Scale::Whole { .. }) { 1 } else { 2 });
                out.extend(offset.to_le_bytes());
                out.extend(step.to_le_bytes());
            }
            Scale::Single { exponent } | Scale::Double { exponent } => {
                out.push(if matches!(self.scale, Scale::Single { .. }) { 3 } else { 4 });
                put_signed(&mut out, exponent);
            }
        }
        out.push(self.method.order);
        out.push(self.method.memory);
        put_count(&mut out, u64::from(self.method.taps));
        put_count(&mut out, self.exceptions.len() as u64);
        let mut before = 0;
        for &(at, value) in &self.exceptions {
            put_count(&mut out, (at - before) as u64);
            out.extend(value.to_le_bytes());
            before = at;
        }
        let mut encoder = Encoder::default();
        self.run(&mut encoder, Some(samples), samples.len());
        out.extend(encoder.finish());
        out
    }

    /// The samples of a payload of `len` samples.
    ///
    /// # Errors
    /// `Malformed` where the fields say what cannot be.
    pub fn decode(payload: &[u8], len: usize) -> Result<Vec<f64>> {
        let mut fields = Fields::new(payload);
        let plan = Plan::read(&mut fields, len)?;
        let samples = plan.run(&mut Decoder::new(fields.rest()), None, len);
        match samples.iter().position(|v| !v.is_finite()) {
            Some(n) => Err(Error::malformed(format!("sample {n} is not finite"))),
            None => Ok(samples),
        }
    }

    /// The fields before the coded steps.
    ///
    /// # Errors
    /// As `decode`.
    pub fn read(fields: &mut Fields<'_>, len: usize) -> Result<Plan> {
        let kind = fields.byte()?;
        let scale = match kind {
            0 => {
                let (numerator, denominator) = (fields.double()?, fields.double()?);
                Scale::Grid { numerator, denominator, first: fields.signed()?, stride: fields.count()? }
            }
            1 => Scale::Whole { offset: fields.double()?, step: fields.double()? },
            2 => Scale::Free { offset: fields.double()?, step: fields.double()? },
            3 => Scale::Single { exponent: fields.signed()? },
            4 => Scale::Double { exponent: fields.signed()? },
            other => return Err(Error::malformed(format!("a scale of an unknown kind {other}"))),
        };
        let (order, memory, taps) = (fields.byte()?, fields.byte()?, fields.count()?);
        let method = Method { order, memory, taps: u16::try_from(taps).unwrap_or(u16::MAX) };
        let steps_are_sound = match scale {
            Scale::Grid { denominator, .. } => denominator != 0.0,
            Scale::Single { exponent } | Scale::Double { exponent } => (-1000..=1000).contains(&exponent),
            Scale::Whole { .. } | Scale::Free { .. } => true,
        };
        if !method.is_valid() || !steps_are_sound {
            return Err(Error::malformed("a prediction of an unknown kind"));
        }
        // Every exception takes nine bytes at least: their number cannot outgrow the block.
        let count = fields.length(len.min(fields.rest().len() / 9))?;
        let mut exceptions = Vec::with_capacity(count);
        let mut at = 0;
        for n in 0..count {
            let distance = fields.length(len)?;
            at += distance;
            if at >= len || n > 0 && distance == 0 {
                return Err(Error::malformed("an exception past the end of its block"));
            }
            exceptions.push((at, fields.double()?));
        }
        Ok(Plan { scale, method, exceptions })
    }

    /// Codes `len` samples and returns them as a decoder gets them.
    pub fn run(&self, coder: &mut impl Binary, samples: Option<&[f64]>, len: usize) -> Vec<f64> {
        let mut predictor = Predictor::new(self.method);
        let mut integers = Integers::default();
        let mut out = Vec::with_capacity(len);
        let mut exceptions = self.exceptions.iter().peekable();
        for n in 0..len {
            let foretold = predictor.next();
            let odd = exceptions.next_if(|(at, _)| *at == n).map(|(_, value)| *value);
            // A sample off the grid is coded as foretold.
            let wanted = samples.filter(|_| odd.is_none()).map(|samples| samples[n]);
            let (step, sample) = self.scale.step(foretold, wanted, |q| integers.code(coder, q, Hint::default()));
            predictor.learn(step);
            out.push(odd.unwrap_or(sample));
        }
        out
    }
}

impl Scale {
    /// Codes one sample by `code`; returns it in steps, as the prediction sees it, and in units.
    #[inline]
    fn step(self, foretold: f64, wanted: Option<f64>, code: impl FnOnce(i64) -> i64) -> (f64, f64) {
        match self {
            Scale::Grid { numerator, denominator, first, stride } => {
                let near = floor(foretold + 0.5);
                let target = |x: f64| {
                    let k = (x * denominator / numerator).round() as i64;
                    nearest_multiple(k.wrapping_sub(first), stride)
                };
                let v = near.wrapping_add(code(wanted.map_or(0, |x| target(x).wrapping_sub(near))));
                let k = first.wrapping_add(v.wrapping_mul(stride as i64));
                (v as f64, k as f64 * numerator / denominator)
            }
            Scale::Whole { offset, step } => {
                let near = floor(foretold + 0.5);
                let target = |x: f64| floor((x - offset) / step + 0.5);
                let v = near.wrapping_add(code(wanted.map_or(0, |x| target(x).wrapping_sub(near))));
                (v as f64, offset + step * v as f64)
            }
            Scale::Free { offset, step } => {
                let q = code(wanted.map_or(0, |x| floor((x - offset) / step - foretold + 0.5)));
                let v = foretold + q as f64;
                (v, offset + step * v)
            }
            Scale::Single { exponent } => {
                let near = ordered_single((foretold * power_of_two(-exponent)) as f32);
                let q = code(wanted.map_or(0, |x| ordered_single(x as f32) - near));
                let sample = f64::from(from_ordered_single(near.wrapping_add(q)));
                (scaled(sample, exponent), sample)
            }
            Scale::Double { exponent } => {
                let near = ordered_double(foretold * power_of_two(-exponent));
                let q = code(wanted.map_or(0, |x| ordered_double(x).wrapping_sub(near)));
                let sample = from_ordered_double(near.wrapping_add(q));
                (scaled(sample, exponent), sample)
            }
        }
    }
}

/// The greatest whole number not above x; x itself is far below 2^62 wherever an encoder asks.
#[inline]
pub fn floor(x: f64) -> i64 {
    let whole = x as i64;
    whole - i64::from(whole as f64 > x)
}

/// k / stride to the nearest, halves up.
fn nearest_multiple(k: i64, stride: u64) -> i64 {
    let stride = stride.max(1) as i128;
    (i128::from(k) + stride / 2).div_euclid(stride) as i64
}

/// 2^exponent for -1022..=1023.
pub fn power_of_two(exponent: i64) -> f64 {
    f64::from_bits(((exponent.clamp(-1022, 1023) + 1023) as u64) << 52)
}

/// A sample in steps: nothing where it is not finite.
fn scaled(sample: f64, exponent: i64) -> f64 {
    let steps = sample * power_of_two(exponent);
    if steps.is_finite() { steps } else { 0.0 }
}

/// Bits of a number as an integer in the order of the numbers.
fn ordered_single(x: f32) -> i64 {
    let bits = i64::from(x.to_bits() as i32);
    if bits < 0 { -(bits & 0x7fff_ffff) - 1 } else { bits }
}

fn from_ordered_single(order: i64) -> f32 {
    let bits =
        if order < 0 { (order.wrapping_neg().wrapping_sub(1)) as u32 | 1 << 31 } else { order as u32 & 0x7fff_ffff };
    f32::from_bits(bits)
}

fn ordered_double(x: f64) -> i64 {
    let bits = x.to_bits() as i64;
    if bits < 0 { !(bits & i64::MAX) } else { bits }
}

fn from_ordered_double(order: i64) -> f64 {
    f64::from_bits(if order < 0 { !order as u64 | 1 << 63 } else { order as u64 })
}

#[cfg(test)]
mod tests {
    use super::*;

    const METHODS: [Method; 4] = [
        Method { order: 0, memory: 8, taps: 0 },
        Method { order: 2, memory: 10, taps: 0 },
        Method { order: 16, memory: 10, taps: 0 },
        Method { order: 8, memory: 12, taps: 256 },
    ];

    fn wave(len: usize) -> Vec<f64> {
        let mut state = 3_u64;
        let mut noise = || {
            state = state.wrapping_mul(6364136223846793005).wrapping_add(1442695040888963407);
            (state >> 40) as f64 / (1 << 24) as f64 - 0.5
        };
        (0..len).map(|n| (0.05 * n as f64).sin() * 3.0 + 0.3 * noise()).collect()
    }

    #[test]
    fn every_scale_and_method_comes_back() {
        let samples = wave(700);
        for method in METHODS {
            for (scale, error) in [
                (Scale::Whole { offset: 0.25, step: 0.02 }, 0.01),
                (Scale::Free { offset: 0.0, step: 0.02 }, 0.01),
                (Scale::Grid { numerator: 1.0, denominator: 1000.0, first: -20, stride: 7 }, 0.0035),
                (Scale::Double { exponent: 20 }, 0.0),
            ] {
                let plan = Plan { scale, method, exceptions: vec![(0, 7.5), (699, 1e9)] };
                let found = Plan::decode(&plan.encode(&samples), samples.len()).expect("its own payload");
                assert_eq!((found[0], found[699]), (7.5, 1e9));
                for n in 1..699 {
                    assert!(
                        (found[n] - samples[n]).abs() <= error * (1.0 + 1e-9),
                        "{scale:?} {method:?} {n} {} {}",
                        found[n],
                        samples[n]
                    );
                }
            }
            let singles: Vec<f64> = samples.iter().map(|v| f64::from(*v as f32)).collect();
            let plan = Plan { scale: Scale::Single { exponent: 20 }, method, exceptions: Vec::new() };
            assert_eq!(Plan::decode(&plan.encode(&singles), 700).expect("its own payload"), singles);
        }
    }

    #[test]
    fn numbers_keep_their_order_as_integers() {
        let doubles = [-1e300, -1.0, -5e-324, -0.0, 0.0, 5e-324, 1.0, 1e300];
        assert!(doubles.windows(2).all(|w| ordered_double(w[0]) < ordered_double(w[1])));
        assert!(doubles.iter().all(|v| from_ordered_double(ordered_double(*v)).to_bits() == v.to_bits()));
        let singles = [-3e38_f32, -1.0, -0.0, 0.0, 1e-45, 2.0];
        assert!(singles.windows(2).all(|w| ordered_single(w[0]) < ordered_single(w[1])));
        assert!(singles.iter().all(|v| from_ordered_single(ordered_single(*v)).to_bits() == v.to_bits()));
    }
}
