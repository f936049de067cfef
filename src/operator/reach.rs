//! How far from each end an operator feels what lies beyond it: the reach.

use serde::{Serialize, Serializer};

use crate::ends::Parity;

use super::kernel;
use super::turn;

/// The 99.9 % reach: beyond it, to both sides together, lies one thousandth of the absolute area of the impulse response.
#[derive(Debug, Clone, Copy, PartialEq)]
pub enum Reach {
    /// So many samples to each side.
    Samples(f64),
    /// No number bounds it: the gain jumps, or an integral keeps zero frequency. The whole record is within reach.
    Unbounded,
}

impl Reach {
    /// The number of samples, where there is one.
    pub fn samples(self) -> Option<f64> {
        match self {
            Reach::Samples(samples) => Some(samples),
            Reach::Unbounded => None,
        }
    }

    /// The number of samples, at most `len`.
    pub fn within(self, len: usize) -> f64 {
        self.samples().map_or(len as f64, |samples| samples.min(len as f64))
    }
}

impl Serialize for Reach {
    /// The number of samples, or `null` when unbounded.
    fn serialize<S: Serializer>(&self, serializer: S) -> Result<S::Ok, S::Error> {
        self.samples().serialize(serializer)
    }
}

/// The reach of an operator for people, and for choosing a way of computing.
#[derive(Debug, Clone, Copy, PartialEq, Serialize)]
pub struct Reaches {
    /// The 99.9 % reach.
    #[serde(rename = "reach_samples")]
    pub reach: Reach,
    /// The numeric reach: samples beyond which at most 1e-13 of the area lies; `None` when that is not reached.
    #[serde(rename = "numeric_reach_samples")]
    pub numeric: Option<f64>,
}

/// What a gain's impulse response measures, roughly: it lays the grid.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Scale {
    /// At least the 99.9 % reach, at most a few times that, in samples.
    pub extent_samples: f64,
    /// Highest frequency with structure (corner, centre), in cycles per sample.
    pub highest: f64,
}

/// Share of the area that defines the reach.
const PLAIN: f64 = 1e-3;
/// Share of the area below which a kernel's tail is lost in rounding of double numbers.
const NUMERIC: f64 = 1e-13;
/// The grid of the 99.9 % reach, and the least grid on a reduced frequency scale.
const GRID: usize = 1 << 18;
/// Memory bound: 16 bytes a point and more are held at a time.
const LARGEST_GRID: usize = 1 << 22;
/// Longest record that can be held, in samples: the span over which tails that fall as 1/n are summed.
const LONGEST_RECORD: f64 = 1e9;

impl Reaches {
    /// The reaches of gain x (i w)^turns. Where the gain at the Nyquist frequency is above 0.5 and nothing is integrated
    /// or differentiated, 1 - gain is measured: the identity needs no neighbours.
    ///
    /// The response is summed on a grid of at least 2^18 samples, 16 extents or more. Responses too long for that are
    /// measured on a reduced frequency scale, since their shape scales with the corners; the kink that the gain has at
    /// the record's own Nyquist frequency is then added by its asymptotic law. Structures too far apart for one grid
    /// (about 3000 to 1) get their extent, which is the sum of their parts' reaches or more, and no numeric reach.
    pub fn of(gain: impl Fn(f64) -> f64, turns: i32, scale: Scale) -> Reaches {
        const UNBOUNDED: Reaches = Reaches { reach: Reach::Unbounded, numeric: None };
        if !scale.extent_samples.is_finite() || (turns < 0 && gain(0.0) != 0.0) {
            return UNBOUNDED;
        }
        let flip = turns == 0 && gain(0.5) > 0.5;
        let gain = |f: f64| if flip { 1.0 - gain(f) } else { gain(f) };
        let Some(layout) = Layout::lay(16.0 * scale.extent_samples, scale.highest, GRID) else {
            return Reaches { reach: Reach::Samples(scale.extent_samples.ceil()), numeric: None };
        };
        let (values, parity) = layout.sampled(&gain, turns);
        let fine = Tail::of(kernel::transformed(&values, parity));
        // Every fourth line: the same response on a quarter of the grid. A reach that grows with the grid has no limit.
        let coarse: Vec<f64> = values.iter().step_by(4).copied().collect();
        let coarse = Tail::of(kernel::transformed(&coarse, parity)).reach(PLAIN);
        let found = fine.reach(PLAIN);
        if found as f64 > 1.5 * coarse as f64 + 4.0 {
            return UNBOUNDED;
        }
        let kink = Kink::of(&gain, turns, parity, fine.total / layout.shrink.powi(turns));
        let reach = match (layout.shrink > 1.0, kink.reach(PLAIN)) {
            (false, _) => Reach::Samples(found as f64),
            (true, Some(kink)) => Reach::Samples((found as f64 * layout.shrink).max(kink)),
            (true, None) => return UNBOUNDED,
        };
        Reaches { reach, numeric: numeric(&gain, turns, scale) }
    }
}

/// The numeric reach, on a grid that just holds it: rounding grows with the root of the number of lines in the pass band.
fn numeric(gain: &impl Fn(f64) -> f64, turns: i32, scale: Scale) -> Option<f64> {
    let layout = Layout::lay(64.0 * scale.extent_samples, scale.highest, 1 << 10)?;
    let (values, parity) = layout.sampled(gain, turns);
    let tail = Tail::of(kernel::transformed(&values, parity));
    let found = tail.reach(NUMERIC);
    if found > layout.grid / 8 {
        return None;
    }
    let kink = Kink::of(gain, turns, parity, tail.total / layout.shrink.powi(turns)).reach(NUMERIC)?;
    Some((found as f64 * layout.shrink).max(kink.ceil()))
}

/// A grid, and by how much the record is thinned on it.
#[derive(Debug, Clone, Copy)]
struct Layout {
    grid: usize,
    shrink: f64,
}

impl Layout {
    fn lay(needed: f64, highest: f64, least: usize) -> Option<Layout> {
        if needed <= GRID as f64 {
            return Some(Layout { grid: (needed as usize).next_power_of_two().max(least), shrink: 1.0 });
        }
        let mut grid = GRID;
        while grid <= LARGEST_GRID {
            let shrink = needed / grid as f64;
            if shrink <= 1.0 {
                return Some(Layout { grid, shrink: 1.0 });
            }
            // The taper begins eight times above the highest structure.
            if highest * shrink <= 1.0 / 32.0 {
                return Some(Layout { grid, shrink });
            }
            grid *= 4;
        }
        None
    }

    fn sampled(self, gain: &impl Fn(f64) -> f64, turns: i32) -> (Vec<f64>, Parity) {
        let shrink = self.shrink;
        if shrink == 1.0 {
            return kernel::sampled(gain, turns, self.grid / 2);
        }
        kernel::sampled(|f| gain(f / shrink) * taper(f), turns, self.grid / 2)
    }
}

/// 1 up to half the grid's Nyquist frequency, then smoothly (all derivatives) to 0 at it: the cut itself leaves no tail.
fn taper(f: f64) -> f64 {
    let place = 4.0 * f - 1.0;
    if place <= 0.0 {
        1.0
    } else if place >= 1.0 {
        0.0
    } else {
        let bump = |x: f64| (-x.recip()).exp();
        bump(1.0 - place) / (bump(place) + bump(1.0 - place))
    }
}

/// Sizes of a response and their sum.
struct Tail {
    sizes: Vec<f64>,
    total: f64,
}

impl Tail {
    fn of(mut response: Vec<f64>) -> Tail {
        response.iter_mut().for_each(|h| *h = h.abs());
        let total = response.iter().rev().sum::<f64>() * 2.0 - response.first().copied().unwrap_or(0.0);
        Tail { sizes: response, total }
    }

    /// The least r with 2 sum over n > r of |h[n]| <= share x total.
    fn reach(&self, share: f64) -> usize {
        let allowed = share * self.total;
        let mut beyond = 0.0;
        for (n, size) in self.sizes.iter().enumerate().skip(1).rev() {
            beyond += 2.0 * size;
            if beyond > allowed {
                return n;
            }
        }
        0
    }
}

/// The tail that the cut of a spectrum at the Nyquist frequency leaves: repeated integration by parts of
/// (1/pi) integral over 0..pi of H cos(w n) gives (-1)^n H'(pi)/(pi n^2), and of H sin(w n) gives -(-1)^n H(pi)/(pi n).
struct Kink {
    parity: Parity,
    /// |H'(pi)| (even) or |H(pi)| (odd), over pi and over the whole area.
    share: f64,
}

impl Kink {
    fn of(gain: &impl Fn(f64) -> f64, turns: i32, parity: Parity, total: f64) -> Kink {
        let at = |f: f64| gain(f) * turn::factor(f, turns).0;
        let size = match parity {
            Parity::Even => {
                let apart = 1e-4;
                (at(0.5) - at(0.5 - apart)).abs() / (std::f64::consts::TAU * apart)
            }
            Parity::Odd => at(0.5).abs(),
        };
        let share = if size == 0.0 { 0.0 } else { size / (std::f64::consts::PI * total) };
        Kink { parity, share }
    }

    /// Samples beyond which the kink's tail stays below `share` of the area; `None` when it never does.
    fn reach(&self, share: f64) -> Option<f64> {
        match self.parity {
            Parity::Even => Some(2.0 * self.share / share),
            // The sum of 1/n over the longest record.
            Parity::Odd => (2.0 * self.share * LONGEST_RECORD.ln() <= share).then_some(0.0),
        }
    }
}

#[cfg(test)]
mod tests;
