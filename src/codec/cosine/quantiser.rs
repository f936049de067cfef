//! From coefficients to whole levels and back: plain rounding that weighs error against bits, or an eight-state trellis.

/// How levels stand for coefficients, in units of the step.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Quantiser {
    /// Coefficient = level x step.
    Plain,
    /// Two combs of twice the step, chosen by the parities of the levels before: coefficient = 2 level x step, or
    /// (2 level - sign of level) x step.
    Trellis,
}

/// Where the trellis stands: three bits a, b, c; a says which comb is due.
#[derive(Debug, Clone, Copy, Default, PartialEq, Eq)]
pub struct State(u8);

impl State {
    /// True where the second comb is due.
    pub fn second(self) -> bool {
        self.0 & 4 != 0
    }

    /// (a, b, c) becomes (a xor b, c xor parity, a).
    pub fn after(self, level: i64) -> State {
        let (a, b, c) = (self.0 >> 2, self.0 >> 1 & 1, self.0 & 1);
        State((a ^ b) << 2 | (c ^ (level & 1) as u8) << 1 | a)
    }
}

impl Quantiser {
    /// The coefficient of a level, in steps.
    pub fn value(self, state: State, level: i64) -> f64 {
        match (self, state.second()) {
            (Quantiser::Plain, _) => level as f64,
            (Quantiser::Trellis, false) => 2.0 * level as f64,
            (Quantiser::Trellis, true) => (2 * level.clamp(-MOST, MOST) - level.signum()) as f64,
        }
    }

    /// The state after a level.
    pub fn next(self, state: State, level: i64) -> State {
        match self {
            Quantiser::Plain => state,
            Quantiser::Trellis => state.after(level),
        }
    }
}

/// Levels are kept below 2^60.
const MOST: i64 = 1 << 60;

/// Share of the theoretical exchange of error for bits that is used.
const EXCHANGE: f64 = 0.8;

/// Levels for coefficients in steps; `spread` holds the mean magnitude expected around each, in steps.
pub fn levels(quantiser: Quantiser, coefficients: &[f64], spread: &[f64]) -> Vec<i64> {
    match quantiser {
        Quantiser::Plain => plain(coefficients, spread),
        Quantiser::Trellis => trellis(coefficients, spread),
    }
}

/// Bits of level zero, and of each further level, where magnitudes have that mean (two-sided geometric law).
fn bits(mean: f64) -> (f64, f64) {
    let mean = mean.max(1e-4);
    let ratio = ((1.0 + mean * mean).sqrt() - 1.0) / mean;
    (-((1.0 - ratio) / (1.0 + ratio)).log2(), -ratio.log2())
}

fn plain(coefficients: &[f64], spread: &[f64]) -> Vec<i64> {
    // d error / d rate of a uniform quantiser at high rate: 2 ln 2 / 12 steps squared a bit.
    let exchange = EXCHANGE * 2.0 * std::f64::consts::LN_2 / 12.0;
    let choose = |(c, spread): (&f64, &f64)| {
        let (_, each) = bits(*spread);
        let near = c.abs().round();
        let cost = |k: f64| (c.abs() - k) * (c.abs() - k) + exchange * each * k;
        let below = (near - 1.0).max(0.0);
        let mut best = if cost(below) < cost(near) { below } else { near };
        if cost(0.0) < cost(best) {
            best = 0.0;
        }
        (best * c.signum()) as i64
    };
    coefficients.iter().zip(spread).map(choose).collect()
}

/// The cheapest path through the eight states (Viterbi).
fn trellis(coefficients: &[f64], spread: &[f64]) -> Vec<i64> {
    // Mean squared error of the eight-state trellis at high rate, in steps: about 0.263.
    let exchange = EXCHANGE * 2.0 * std::f64::consts::LN_2 * 0.263;
    let mut costs = [f64::INFINITY; 8];
    costs[0] = 0.0;
    let mut steps: Vec<[(i32, u8); 8]> = Vec::with_capacity(coefficients.len());
    for (c, spread) in coefficients.iter().zip(spread) {
        let magnitude = c.abs().min(1e9);
        let (_, each) = bits(spread / 2.0);
        let each = exchange * each;
        let mut next = [f64::INFINITY; 8];
        let mut from = [(0_i32, 0_u8); 8];
        // The same levels serve all states of a comb.
        let combs = [false, true].map(|second| {
            let half = if second { (magnitude + 1.0) / 2.0 } else { magnitude / 2.0 };
            let low = half.floor().max(0.0);
            [low, low + 1.0, (low - 1.0).max(0.0), 0.0].map(|level| {
                let value = if second && level > 0.0 { 2.0 * level - 1.0 } else { 2.0 * level };
                (level as i32, (magnitude - value) * (magnitude - value) + each * level)
            })
        });
        // The best level of each comb and parity.
        let best = combs.map(|options| {
            let mut best = [(0_i32, f64::INFINITY); 2];
            for (level, cost) in options {
                let slot = &mut best[(level & 1) as usize];
                if cost < slot.1 {
                    *slot = (level, cost);
                }
            }
            best
        });
        for state in 0..8_u8 {
            if costs[usize::from(state)] == f64::INFINITY {
                continue;
            }
            for (level, cost) in best[usize::from(state >> 2)] {
                let after = usize::from(State(state).after(i64::from(level)).0);
                let total = costs[usize::from(state)] + cost;
                if total < next[after] {
                    next[after] = total;
                    from[after] = (level, state);
                }
            }
        }
        costs = next;
        steps.push(from);
    }
    let mut state = (0..8).min_by(|a, b| costs[*a].total_cmp(&costs[*b])).unwrap_or(0);
    let mut out = vec![0; coefficients.len()];
    for (n, from) in steps.iter().enumerate().rev() {
        let (level, before) = from[state];
        out[n] = i64::from(level) * coefficients[n].signum() as i64;
        state = usize::from(before);
    }
    out
}
