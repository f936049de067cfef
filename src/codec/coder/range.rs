//! The range coder: binary decisions with 16-bit probabilities, and equally likely bits, packed into bytes and back.

/// Width of the coder's window: low and range are numbers of 48 bits.
const TOP: u64 = 1 << 48;
/// Below this a byte is shifted out.
const BOTTOM: u64 = 1 << 40;

/// What a model codes with. An encoder writes the given decision and returns it; a decoder ignores it and returns the one
/// that it reads: one text of a model serves both.
pub trait Binary {
    /// One decision; `one` of 65536 is the probability that it is true, 1..=65535.
    fn bit(&mut self, bit: bool, one: u32) -> bool;
    /// The low `count` bits of a number, equally likely, at most 64.
    fn raw(&mut self, value: u64, count: u32) -> u64;
}

/// Packs decisions into bytes.
#[derive(Debug)]
pub struct Encoder {
    low: u64,
    range: u64,
    out: Vec<u8>,
}

impl Default for Encoder {
    fn default() -> Self {
        Encoder { low: 0, range: TOP - 1, out: Vec::new() }
    }
}

impl Encoder {
    /// The bytes. Trailing zeros are left off: a decoder reads zeros past the end.
    pub fn finish(mut self) -> Vec<u8> {
        // The number with the fewest bytes that lies in [low, low + range).
        let short = (0..=6).map(|bytes| (TOP - 1) >> (8 * bytes)).map(|mask| (self.low + mask) & !mask);
        let chosen = short.filter(|v| *v < self.low + self.range).min_by_key(|v| 48 - v.trailing_zeros().min(48));
        self.low = chosen.unwrap_or(self.low);
        for _ in 0..6 {
            self.shift();
        }
        while self.out.last() == Some(&0) {
            self.out.pop();
        }
        self.out
    }

    fn shift(&mut self) {
        if self.low >= TOP {
            self.low -= TOP;
            for byte in self.out.iter_mut().rev() {
                *byte = byte.wrapping_add(1);
                if *byte != 0 {
                    break;
                }
            }
        }
        self.out.push((self.low >> 40) as u8);
        self.low = (self.low << 8) & (TOP - 1);
        self.range <<= 8;
    }

    fn settle(&mut self) {
        while self.range < BOTTOM {
            self.shift();
        }
    }
}

impl Binary for Encoder {
    #[inline]
    fn bit(&mut self, bit: bool, one: u32) -> bool {
        let bound = (self.range >> 16) * u64::from(one);
        if bit {
            self.range = bound;
        } else {
            self.low += bound;
            self.range -= bound;
        }
        self.settle();
        bit
    }

    fn raw(&mut self, value: u64, count: u32) -> u64 {
        let mut left = count;
        while left > 0 {
            let part = left.min(16);
            left -= part;
            self.range >>= part;
            self.low += (value >> left & ((1 << part) - 1)) * self.range;
            self.settle();
        }
        value
    }
}

/// Unpacks decisions. Any bytes decode to something; whether it is what was written is for a checksum to say.
#[derive(Debug)]
pub struct Decoder<'a> {
    code: u64,
    range: u64,
    rest: &'a [u8],
}

impl<'a> Decoder<'a> {
    /// Starts on the bytes of [`Encoder::finish`].
    pub fn new(bytes: &'a [u8]) -> Decoder<'a> {
        let mut decoder = Decoder { code: 0, range: TOP - 1, rest: bytes };
        for _ in 0..6 {
            decoder.pull();
        }
        decoder
    }

    fn pull(&mut self) {
        let byte = match self.rest.split_first() {
            Some((&byte, rest)) => {
                self.rest = rest;
                byte
            }
            None => 0,
        };
        self.code = (self.code << 8 | u64::from(byte)) & (TOP - 1);
    }

    fn settle(&mut self) {
        while self.range < BOTTOM {
            self.range <<= 8;
            self.pull();
        }
    }
}

impl Binary for Decoder<'_> {
    #[inline]
    fn bit(&mut self, _: bool, one: u32) -> bool {
        let bound = (self.range >> 16) * u64::from(one);
        let bit = self.code < bound;
        if bit {
            self.range = bound;
        } else {
            self.code -= bound;
            self.range -= bound;
        }
        self.settle();
        bit
    }

    fn raw(&mut self, _: u64, count: u32) -> u64 {
        let (mut left, mut value) = (count, 0);
        while left > 0 {
            let part = left.min(16);
            left -= part;
            self.range >>= part;
            let digit = (self.code / self.range).min((1 << part) - 1);
            self.code -= digit * self.range;
            value = value << part | digit;
            self.settle();
        }
        value
    }
}

/// Counts what decisions would cost, without packing them.
#[derive(Debug, Default)]
pub struct Meter {
    bits: f64,
}

impl Meter {
    /// Bits so far.
    pub fn bits(&self) -> f64 {
        self.bits
    }
}

impl Binary for Meter {
    #[inline]
    fn bit(&mut self, bit: bool, one: u32) -> bool {
        let p = if bit { one } else { 65536 - one };
        self.bits -= f64::from(p as f32 / 65536.0).log2();
        bit
    }

    fn raw(&mut self, value: u64, count: u32) -> u64 {
        self.bits += f64::from(count);
        value
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    /// Decisions of all probabilities, with raw bits between them, some of them improbable.
    fn run(coder: &mut impl Binary, given: Option<&[u64]>) -> Vec<u64> {
        let mut state = 1_u64;
        let mut next = || {
            state = state.wrapping_mul(6364136223846793005).wrapping_add(1442695040888963407);
            state >> 33
        };
        let mut out = Vec::new();
        for n in 0..20_000_usize {
            let one = [1, 65535, 32768, 60000, 300][n % 5];
            let (wild, count) = (next() % 65536, (next() % 65) as u32);
            let value = given.map_or(0, |given| given[2 * n]);
            out.push(u64::from(coder.bit(given.is_some() && value == 1, one)));
            let _ = wild;
            out.push(coder.raw(given.map_or(0, |given| given[2 * n + 1]), count));
        }
        out
    }

    #[test]
    fn what_is_packed_is_unpacked() {
        let mut state = 9_u64;
        let mut next = || {
            state = state.wrapping_mul(6364136223846793005).wrapping_add(1442695040888963407);
            state >> 1
        };
        // The same sequence of bit counts that `run` draws.
        let mut counts = 1_u64;
        let mut values = Vec::new();
        for _ in 0..20_000 {
            for _ in 0..2 {
                counts = counts.wrapping_mul(6364136223846793005).wrapping_add(1442695040888963407);
            }
            let count = (counts >> 33) % 65;
            values.push(next() % 2);
            values.push(if count == 64 { next() } else { next() & ((1 << count) - 1) });
        }
        let mut encoder = Encoder::default();
        run(&mut encoder, Some(&values));
        let bytes = encoder.finish();
        assert_eq!(run(&mut Decoder::new(&bytes), None), values);
    }

    #[test]
    fn sure_decisions_cost_next_to_nothing() {
        let mut encoder = Encoder::default();
        (0..10_000).for_each(|_| {
            encoder.bit(true, 65535);
        });
        // 10,000 x 2.2e-5 bits: nothing but the last byte.
        assert!(encoder.finish().len() <= 1);
    }
}
