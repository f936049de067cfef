//! How far from each end an operator feels what lies beyond it: the reach.

use realfft::num_complex::Complex;
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
/// The grid on which growth decides, and the least of the 99.9 % reach on a reduced frequency scale.
const GRID: usize = 1 << 18;
/// Memory bound: 16 bytes a point and more are held at a time.
const LARGEST_GRID: usize = 1 << 22;
/// Longest record that can be held, in samples: the span over which tails that fall as 1/n are summed.
const LONGEST_RECORD: f64 = 1e9;

impl Reaches {
    /// The reaches of gain x (i w)^turns. Where the gain at the Nyquist frequency is above 0.5 and nothing is integrated
    /// or differentiated, 1 - gain is measured: the identity needs no neighbours.
    ///
    /// The response is summed on a grid of 16 extents or more, and again on a quarter of that. Where the two differ the
    /// grid grows, to at least 2^18 samples; a reach that still grows with the grid has no limit. Responses too long for
    /// that are measured on a reduced frequency scale, since their shape scales with the corners; the kink that the gain
    /// has at the record's own Nyquist frequency is then added by its asymptotic law. Structures too far apart for one
    /// grid (about 3000 to 1) get their extent, which is the sum of their parts' reaches or more, and no numeric reach.
    ///
    /// A single integral cut off at the Nyquist frequency rings there as 1/(pi^2 n), without limit but far below its
    /// own size: the 99.9 % reach leaves that ringing out, the numeric reach does not.
    pub fn of(gain: impl Fn(f64) -> f64, turns: i32, scale: Scale) -> Reaches {
        Reaches::of_halves(&gain, None, turns, scale)
    }

    /// As `of`, for a response that shifts phases: real and imaginary part at a frequency. Its kernel is not symmetric;
    /// the reach counts what lies beyond it on both sides together. Since a sampled record has no imaginary part at its
    /// Nyquist frequency, one that does not vanish there rings on as 1/n: the 99.9 % reach leaves that ringing out.
    pub fn of_response(response: impl Fn(f64) -> Complex<f64>, turns: i32, scale: Scale) -> Reaches {
        Reaches::of_halves(&|f| response(f).re, Some(&|f| response(f).im), turns, scale)
    }

    fn of_halves(real: Half<'_>, imaginary: Option<Half<'_>>, turns: i32, scale: Scale) -> Reaches {
        const UNBOUNDED: Reaches = Reaches { reach: Reach::Unbounded, numeric: None };
        if !scale.extent_samples.is_finite() || (turns < 0 && real(0.0) != 0.0) {
            return UNBOUNDED;
        }
        let flip = turns == 0 && real(0.5) > 0.5;
        let flipped = |f: f64| 1.0 - real(f);
        let halves = Halves { real: if flip { &flipped } else { real }, imaginary, turns };
        match plain(&halves, scale) {
            Reach::Unbounded => UNBOUNDED,
            reach @ Reach::Samples(_) => Reaches { reach, numeric: numeric(&halves, scale) },
        }
    }
}

/// Real or imaginary part of a response by frequency.
type Half<'a> = &'a dyn Fn(f64) -> f64;

/// A response of `turns` quarter turns in two halves: one of them has an even kernel, the other an odd one.
struct Halves<'a> {
    real: Half<'a>,
    imaginary: Option<Half<'a>>,
    turns: i32,
}

/// Lines of a spectrum, and the parity of the kernel that they stand for.
type Lines = Vec<(Vec<f64>, Parity)>;

impl Halves<'_> {
    fn sampled(&self, layout: Layout) -> Lines {
        let mut lines = vec![layout.sampled(self.real, self.turns)];
        if let Some(imaginary) = self.imaginary {
            let (values, parity) = layout.sampled(imaginary, self.turns);
            lines.push((values, parity.flipped()));
        }
        lines
    }

    /// Samples beyond which the tails of the cut at the Nyquist frequency stay below `share` of `total`.
    fn kink_reach(&self, total: f64, share: f64) -> Option<f64> {
        let (_, parity) = turn::factor(1.0, self.turns);
        let real = Kink::of(self.real, self.turns, parity, total).reach(share)?;
        let other = self.imaginary.map(|half| Kink::of(half, self.turns, parity.flipped(), total).reach(share));
        Some(other.unwrap_or(Some(0.0))?.max(real))
    }
}

/// The 99.9 % reach.
fn plain(halves: &Halves<'_>, scale: Scale) -> Reach {
    let Some(mut layout) = Layout::lay(16.0 * scale.extent_samples, scale.highest, 1 << 12, GRID) else {
        return Reach::Samples(scale.extent_samples.ceil());
    };
    let rings = halves.turns == -1 || halves.imaginary.is_some();
    layout.tapered |= rings;
    loop {
        let lines = halves.sampled(layout);
        let fine = Tail::of(&lines);
        // Every fourth line: the same response on a quarter of the grid.
        let coarse: Lines =
            lines.iter().map(|(values, parity)| (values.iter().step_by(4).copied().collect(), *parity)).collect();
        let coarse = Tail::of(&coarse).reach(PLAIN) as f64;
        let found = fine.reach(PLAIN) as f64;
        if layout.grid < GRID && (found - coarse).abs() > 0.5 + 1e-3 * found {
            layout.grid *= 8;
            continue;
        }
        if found > 1.5 * coarse + 4.0 {
            return Reach::Unbounded;
        }
        if layout.shrink == 1.0 {
            return Reach::Samples(found);
        }
        let found = found * layout.shrink;
        let total = fine.total / layout.shrink.powi(halves.turns);
        let kink = if rings { Some(0.0) } else { halves.kink_reach(total, PLAIN) };
        return kink.map_or(Reach::Unbounded, |kink| Reach::Samples(found.max(kink)));
    }
}

/// The numeric reach, on a grid that just holds it (14 to 28 reaches of 1e-13): rounding grows with the root of the number
/// of lines in the pass band. Even on its smallest reduced grid the taper's own response, some 600 samples to 1e-13, stays
/// within the reach.
fn numeric(halves: &Halves<'_>, scale: Scale) -> Option<f64> {
    let layout = Layout::lay(64.0 * scale.extent_samples, scale.highest, 1 << 10, 1 << 16)?;
    let tail = Tail::of(&halves.sampled(layout));
    let found = tail.reach(NUMERIC) as f64 * layout.shrink;
    let kink = halves.kink_reach(tail.total / layout.shrink.powi(halves.turns), NUMERIC)?;
    let reach = found.max(kink).ceil();
    // Beyond an eighth of the grid the periodic sum no longer tells a tail from its own repetition.
    (reach <= layout.shrink * layout.grid as f64 / 8.0).then_some(reach)
}

/// A grid, by how much the record is thinned on it, and whether the spectrum is tapered to zero at its end.
#[derive(Debug, Clone, Copy)]
struct Layout {
    grid: usize,
    shrink: f64,
    tapered: bool,
}

impl Layout {
    /// A grid of at least `needed` samples: the record's own steps up to `most`, reduced beyond.
    fn lay(needed: f64, highest: f64, least: usize, most: usize) -> Option<Layout> {
        if needed <= most as f64 {
            let grid = (needed as usize).next_power_of_two().max(least);
            return Some(Layout { grid, shrink: 1.0, tapered: false });
        }
        let mut grid = most;
        while grid <= LARGEST_GRID {
            let shrink = needed / grid as f64;
            if shrink <= 1.0 {
                return Some(Layout { grid, shrink: 1.0, tapered: false });
            }
            // The taper begins eight times above the highest structure.
            if highest * shrink <= 1.0 / 32.0 {
                return Some(Layout { grid, shrink, tapered: true });
            }
            grid *= 4;
        }
        None
    }

    fn sampled(self, gain: Half<'_>, turns: i32) -> (Vec<f64>, Parity) {
        let shrink = self.shrink;
        if !self.tapered {
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
    /// The mean size at n and -n: with an even part e and an odd part o, (|e + o| + |e - o|)/2 is the larger of |e| and |o|.
    fn of(lines: &[(Vec<f64>, Parity)]) -> Tail {
        let mut response: Vec<f64> = Vec::new();
        for (values, parity) in lines {
            let part = kernel::transformed(values, *parity);
            response.resize(part.len(), 0.0);
            response.iter_mut().zip(&part).for_each(|(size, h)| *size = size.max(h.abs()));
        }
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
    fn of(gain: Half<'_>, turns: i32, parity: Parity, total: f64) -> Kink {
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
