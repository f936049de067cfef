//! Adaptive probabilities, and their mixing: all in integers, so that every machine codes alike.

use std::sync::OnceLock;

/// 65536 / (1 + exp(-x)) at x = -12, -11.75, ... 12, rounded, within 1..=65535.
#[rustfmt::skip]
static KNOTS: [i32; 97] = [
    1, 1, 1, 1, 1, 1, 2, 2, 3, 4, 5, 6, 8, 10, 13, 17, 22, 28, 36, 47, 60, 77, 98, 126, 162, 208, 267, 342, 439, 562, 720, 922,
    1179, 1506, 1921, 2446, 3108, 3938, 4971, 6249, 7812, 9702, 11955, 14595, 17625, 21025, 24743, 28693, 32768, 36843, 40793,
    44511, 47911, 50941, 53581, 55834, 57724, 59287, 60565, 61598, 62428, 63090, 63615, 64030, 64357, 64614, 64816, 64974, 65097,
    65194, 65269, 65328, 65374, 65410, 65438, 65459, 65476, 65489, 65500, 65508, 65514, 65519, 65523, 65526, 65528, 65530, 65531,
    65532, 65533, 65534, 65534, 65535, 65535, 65535, 65535, 65535, 65535,
];

/// Largest magnitude of a log-odds number: 12 in units of 1/256.
const LIMIT: i32 = 12 * 256 - 1;

/// The probability (of 65536) that belongs to log-odds in units of 1/256: linear between the knots.
#[inline]
pub fn squash(x: i32) -> i32 {
    let shifted = x.clamp(-LIMIT, LIMIT) + 12 * 256;
    let (knot, part) = ((shifted >> 6) as usize, shifted & 63);
    KNOTS[knot] + (((KNOTS[knot + 1] - KNOTS[knot]) * part) >> 6)
}

/// The log-odds of every probability: the least x with squash(x) >= p.
fn stretches() -> &'static [i16; 65536] {
    static TABLE: OnceLock<Box<[i16; 65536]>> = OnceLock::new();
    TABLE.get_or_init(|| {
        let mut table = Box::new([LIMIT as i16; 65536]);
        let mut p = 0;
        for x in -LIMIT..=LIMIT {
            while p <= squash(x) as usize {
                table[p] = x as i16;
                p += 1;
            }
        }
        table
    })
}

/// An adaptive probability with two memories, of 2^32.
#[derive(Debug, Clone, Copy)]
pub struct Slot {
    fast: u32,
    slow: u32,
    seen: u16,
}

/// Largest counts of the two memories.
const FAST: usize = 20;
const SLOW: usize = 400;

/// 65536 / (n + 1.5), rounded down.
static SHARES: [i64; SLOW + 1] = {
    let mut table = [0; SLOW + 1];
    let mut n = 0;
    while n <= SLOW {
        table[n] = 131072 / (2 * n as i64 + 3);
        n += 1;
    }
    table
};

impl Slot {
    /// A probability that counts as `seen` observations.
    pub const fn new(one: u16, seen: u16) -> Slot {
        let one = (one as u32) << 16;
        Slot { fast: one, slow: one, seen }
    }

    #[inline]
    fn learn(&mut self, bit: bool) {
        let target = if bit { u32::MAX } else { 0 };
        let seen = usize::from(self.seen);
        let step = |p: u32, share: i64| (i64::from(p) + (((i64::from(target) - i64::from(p)) * share) >> 16)) as u32;
        self.fast = step(self.fast, SHARES[seen.min(FAST)]);
        self.slow = step(self.slow, SHARES[seen.min(SLOW)]);
        self.seen = (self.seen + 1).min(SLOW as u16);
    }
}

/// Inputs of a mixer at most: two a slot, and a constant.
const INPUTS: usize = 9;

/// Mixes the probabilities of up to four slots by weights that learn.
#[derive(Debug)]
pub struct Mixer {
    weights: Vec<[i32; INPUTS]>,
    stretch: &'static [i16; 65536],
}

impl Mixer {
    /// A mixer of `sets` weight sets for `slots` slots.
    pub fn new(sets: usize, slots: usize) -> Mixer {
        let mut start = [0; INPUTS];
        start[..2 * slots].fill(65536 * 6 / 10 / slots as i32);
        Mixer { weights: vec![start; sets], stretch: stretches() }
    }

    /// Codes a decision by the slots at `places` of `pool` with weight set `set`, and learns from it.
    #[inline]
    pub fn code<const N: usize>(
        &mut self,
        pool: &mut [Slot],
        places: [usize; N],
        set: usize,
        coder: &mut impl super::Binary,
        bit: bool,
    ) -> bool {
        let weights = &mut self.weights[set];
        let mut inputs = [0_i32; INPUTS];
        for (slot, place) in places.into_iter().enumerate() {
            let Slot { fast, slow, .. } = pool[place];
            inputs[2 * slot] = i32::from(self.stretch[(fast >> 16) as usize]);
            inputs[2 * slot + 1] = i32::from(self.stretch[(slow >> 16) as usize]);
        }
        inputs[2 * N] = 256;
        let used = 2 * N + 1;
        let dot: i64 = (0..used).map(|i| i64::from(weights[i]) * i64::from(inputs[i])).sum();
        let one = squash((dot >> 16).clamp(-4096, 4096) as i32);
        let bit = coder.bit(bit, one as u32);
        let error = (if bit { 65536 } else { 0 }) - one;
        for i in 0..used {
            let step = ((inputs[i] * error) >> 10) * RATE;
            weights[i] = (weights[i] + ((step + (1 << 9)) >> 10)).clamp(-(1 << 20), 1 << 20);
        }
        for place in places {
            pool[place].learn(bit);
        }
        bit
    }
}

/// Learning rate of the weights.
const RATE: i32 = 6;

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn log_odds_and_probabilities_are_inverse() {
        for p in (40..65500).step_by(7) {
            let x = stretches()[p];
            // One unit of 1/256 moves the probability by at most p (1 - p) / 256: 64 of 65536.
            assert!((squash(i32::from(x)) - p as i32).abs() <= 64, "{p}");
            // Linear interpolation over a quarter is within 1 % of the logistic function.
            let odds = (p as f64 / (65536.0 - p as f64)).ln();
            assert!((f64::from(x) / 256.0 - odds).abs() < 0.02, "{p}: {x} {odds}");
        }
    }
}
