//! Integers as decisions: the bit length around the expected one, the sign, the leading bits below the top one.

use super::mixing::{Mixer, Slot};
use super::{Binary, scale};

/// Steps of a scale: quarters of an octave, from 2^-8 up.
const SCALES: usize = 160;
/// Decisions about a bit length: one about the base, upward ones, downward ones.
const NODES: usize = 131;
/// Bit lengths of the two integers before, relative to the base.
const PAIRS: usize = 16 * 16;
/// Where an integer stands among the expected lengths.
const SETS: usize = 3 * 12;
/// Nodes of the three leading bits.
const LEADING: usize = 8;

/// What the coder of a stream is told about the next integer from outside, beside what it remembers itself.
#[derive(Debug, Clone, Copy, Default)]
pub struct Hint {
    /// A magnitude that is expected, in 1/256; it takes the place of the middling average where there is one.
    pub expected: Option<u64>,
    /// A class of its own for the decision whether the integer is zero: below 4.
    pub class: usize,
}

/// The adaptive model of one stream of integers.
#[derive(Debug)]
pub struct Integers {
    lengths: Vec<Slot>,
    leading: Vec<Slot>,
    signs: Vec<Slot>,
    length_mixer: Mixer,
    leading_mixer: Mixer,
    sign_mixer: Mixer,
    quick: u64,
    middle: u64,
    slow: u64,
    count: u64,
    last: [i64; 2],
}

/// First slots of the four models of a bit length.
const QUICK: usize = 0;
const MIDDLE: usize = QUICK + SCALES * NODES;
const SLOW: usize = MIDDLE + SCALES * NODES;
const PAIR: usize = SLOW + 4 * SCALES * NODES;

impl Default for Integers {
    fn default() -> Self {
        let mut lengths = Vec::with_capacity(PAIR + PAIRS * NODES);
        for _ in 0..6 {
            for scale in 0..SCALES {
                lengths.extend((0..NODES).map(|node| Slot::new(scale::first_guess(scale, node), 6)));
            }
        }
        lengths.resize(PAIR + PAIRS * NODES, Slot::new(32768, 1));
        Integers {
            lengths,
            leading: vec![Slot::new(32768, 4); 64 * LEADING + SCALES * 8 * LEADING],
            signs: vec![Slot::new(32768, 8); 9 + 1],
            length_mixer: Mixer::new(SETS, 4),
            leading_mixer: Mixer::new(LEADING * 3, 2),
            sign_mixer: Mixer::new(1, 2),
            quick: 0,
            middle: 0,
            slow: 0,
            count: 0,
            last: [0; 2],
        }
    }
}

impl Integers {
    /// Codes one integer; a decoder's `value` is ignored. Returns the integer.
    pub fn code(&mut self, coder: &mut impl Binary, value: i64, hint: Hint) -> i64 {
        let middle = hint.expected.unwrap_or(self.middle);
        let (quick, middle, slow) = (scale::of(self.quick), scale::of(middle), scale::of(self.slow));
        let base = (slow / 4).saturating_sub(8 + 2).min(60);
        let lengths = self.last.map(|v| (scale::length(v) + 2).saturating_sub(base).min(15));
        let starts = [
            QUICK + quick * NODES,
            MIDDLE + middle * NODES,
            SLOW + (hint.class * SCALES + slow) * NODES,
            PAIR + (lengths[0] * 16 + lengths[1]) * NODES,
        ];
        let wanted = scale::length(value);
        let length = self.length(coder, wanted, base, starts);
        let magnitude = self.magnitude(coder, value.unsigned_abs(), length, base, slow);
        let value = if length == 0 {
            0
        } else if self.sign(coder, value < 0) {
            (magnitude as i64).wrapping_neg()
        } else {
            magnitude as i64
        };
        self.remember(value);
        value
    }

    /// The bit length: 0 for zero.
    fn length(&mut self, coder: &mut impl Binary, wanted: usize, base: usize, starts: [usize; 4]) -> usize {
        let mut decide = |node: usize, set: usize, bit: bool| {
            let places = starts.map(|start| start + node);
            self.length_mixer.code(&mut self.lengths, places, set, coder, bit)
        };
        if base > 0 && !decide(0, 0, wanted >= base) {
            let mut length = base - 1;
            while length > 0 && decide(66 + length, 12 + (base - length).min(11), wanted < length) {
                length -= 1;
            }
            return length;
        }
        let mut length = base;
        while length < 64 && decide(1 + length, 24 + (length - base).min(11), wanted > length) {
            length += 1;
        }
        length
    }

    /// The magnitude of an integer of that bit length: three bits below the top one by model, the rest as they are.
    fn magnitude(&mut self, coder: &mut impl Binary, wanted: u64, length: usize, base: usize, slow: usize) -> u64 {
        if length < 2 {
            return length as u64;
        }
        let below = length as u32 - 1;
        let modelled = below.min(3);
        let relative = (length + 1).saturating_sub(base).min(7);
        let starts = [length.min(63) * LEADING, 64 * LEADING + (slow * 8 + relative) * LEADING];
        let mut node = 1_usize;
        for at in 0..modelled {
            let bit = wanted >> (below - 1 - at) & 1 == 1;
            let places = starts.map(|start| start + node);
            let bit = self.leading_mixer.code(&mut self.leading, places, at as usize * LEADING + node, coder, bit);
            node = 2 * node + usize::from(bit);
        }
        let top = node as u64;
        let rest = below - modelled;
        let low = if rest == 0 { 0 } else { coder.raw(wanted & ((1 << rest) - 1), rest) };
        top << rest | low
    }

    fn sign(&mut self, coder: &mut impl Binary, negative: bool) -> bool {
        let [first, second] = self.last.map(|v| (v.signum() + 1) as usize);
        self.sign_mixer.code(&mut self.signs, [first * 3 + second, 9], 0, coder, negative)
    }

    fn remember(&mut self, value: i64) {
        // Magnitudes past 2^40 count as 2^40: averages stay far from overflow.
        let magnitude = value.unsigned_abs().min(1 << 40) << 8;
        self.count = (self.count + 1).min(48);
        let towards = |average: u64, count: u64| {
            let (average, count) = (average as i64, count as i64);
            (average + (magnitude as i64 - average) / count) as u64
        };
        self.quick = towards(self.quick, self.count.min(3));
        self.middle = towards(self.middle, self.count.min(12));
        self.slow = towards(self.slow, self.count);
        self.last = [value, self.last[0]];
    }
}
