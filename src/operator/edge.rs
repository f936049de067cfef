//! A resolved roll-off at one corner: the low-pass and the high-pass that add up to one, without cancellation.

use std::f64::consts::{LN_2, PI};

use super::corner::ROUNDING;
use super::gain::{Gain, Series};

/// How the gain falls around a corner.
#[derive(Debug, Clone, Copy, PartialEq)]
pub enum Rolloff {
    /// 1/(1 + (f/fc)^(2 order)), the squared magnitude of an analogue Butterworth low-pass (Butterworth 1930): zero
    /// phase, 0.5 at the corner.
    Butterworth {
        /// Order of the underlying filter, 1..=32.
        order: i32,
    },
    /// 2^-(f/fc)^2 (ISO 16610-21:2011, 4.2).
    Gaussian,
    /// Half a period of a cosine from 1 to 0, centred on the corner.
    Cosine {
        /// Half the transition, in cycles per sample, at most the corner.
        half_width: f64,
    },
    /// 1 below the corner, 0.5 at it, 0 above.
    Brickwall,
}

/// A corner with its roll-off.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Edge {
    /// Corner in cycles per sample.
    pub corner: f64,
    /// How the gain falls there.
    pub rolloff: Rolloff,
}

impl Edge {
    /// Gains of the low-pass and of the high-pass at `f` cycles per sample. The smaller is formed directly and the
    /// larger as one minus it: their sum is 1 exactly, and small gains keep all their digits.
    pub fn split(&self, f: f64) -> (f64, f64) {
        let ratio = f / self.corner;
        let low_and_high = |low: f64| (low, 1.0 - low);
        let high_and_low = |high: f64| (1.0 - high, high);
        match self.rolloff {
            Rolloff::Butterworth { order } => {
                // r^(2n), never above 1: the larger gain's own formula is not needed.
                if ratio <= 1.0 {
                    let x = ratio.powi(2 * order);
                    high_and_low(x / (1.0 + x))
                } else {
                    let x = ratio.recip().powi(2 * order);
                    low_and_high(x / (1.0 + x))
                }
            }
            Rolloff::Gaussian => {
                let exponent = -LN_2 * ratio * ratio;
                if ratio <= 1.0 { high_and_low(-exponent.exp_m1()) } else { low_and_high(exponent.exp()) }
            }
            Rolloff::Cosine { half_width } => {
                let place = (f - self.corner) / half_width;
                if place <= -1.0 {
                    (1.0, 0.0)
                } else if place >= 1.0 {
                    (0.0, 1.0)
                } else if place <= 0.0 {
                    high_and_low((PI / 4.0 * (1.0 + place)).sin().powi(2))
                } else {
                    low_and_high((PI / 4.0 * (1.0 - place)).sin().powi(2))
                }
            }
            Rolloff::Brickwall => {
                if (ratio - 1.0).abs() <= ROUNDING {
                    (0.5, 0.5)
                } else if ratio < 1.0 {
                    (1.0, 0.0)
                } else {
                    (0.0, 1.0)
                }
            }
        }
    }

    /// Taylor series of the low-pass at zero frequency.
    pub fn low_series(&self) -> Series {
        let fc2 = self.corner * self.corner;
        match self.rolloff {
            // 1 - x + x^2 with x = (f/fc)^(2n).
            Rolloff::Butterworth { order: 1 } => Series::of_cycles(1.0, -1.0 / fc2, 1.0 / (fc2 * fc2)),
            Rolloff::Butterworth { order: 2 } => Series::of_cycles(1.0, 0.0, -1.0 / (fc2 * fc2)),
            Rolloff::Gaussian => Series::of_cycles(1.0, -LN_2 / fc2, LN_2 * LN_2 / (2.0 * fc2 * fc2)),
            // The transition begins at zero: (1 + cos(pi f/(2 fc)))/2.
            Rolloff::Cosine { half_width } if half_width >= self.corner => {
                let square = PI * PI / (4.0 * fc2);
                Series::of_cycles(1.0, -square / 4.0, square * square / 48.0)
            }
            Rolloff::Butterworth { .. } | Rolloff::Cosine { .. } | Rolloff::Brickwall => Series::ONE,
        }
    }

    /// About how far the impulse response extends, in samples; see `Gain::extent_samples`.
    pub fn extent_samples(&self) -> f64 {
        match self.rolloff {
            Rolloff::Butterworth { order } => 1.1 / (self.corner * (PI / (2.0 * f64::from(order))).sin()),
            Rolloff::Gaussian => 0.62 / self.corner,
            Rolloff::Cosine { half_width } => 5.1 / (2.0 * half_width),
            // The impulse response falls as 1/n, whose sum has no limit.
            Rolloff::Brickwall => f64::INFINITY,
        }
    }
}

/// The low-pass of an edge.
#[derive(Debug)]
pub(super) struct LowPass(pub Edge);

/// The high-pass of an edge: 1 minus the low-pass.
#[derive(Debug)]
pub(super) struct HighPass(pub Edge);

/// One minus the band-pass between two edges.
#[derive(Debug)]
pub(super) struct BandStop {
    pub low: Edge,
    pub high: Edge,
}

impl Gain for LowPass {
    fn at(&self, f: f64) -> f64 {
        self.0.split(f).0
    }
    fn series(&self) -> Series {
        self.0.low_series()
    }
    fn extent_samples(&self) -> f64 {
        self.0.extent_samples()
    }
    fn highest(&self) -> f64 {
        self.0.corner
    }
}

impl Gain for HighPass {
    fn at(&self, f: f64) -> f64 {
        self.0.split(f).1
    }
    fn series(&self) -> Series {
        self.0.low_series().complement()
    }
    fn extent_samples(&self) -> f64 {
        self.0.extent_samples()
    }
    fn highest(&self) -> f64 {
        self.0.corner
    }
}

impl Gain for BandStop {
    fn at(&self, f: f64) -> f64 {
        let (below, above) = self.high.split(f);
        let (under, over) = self.low.split(f);
        let pass = below * over;
        // 1 - L(hi) H(lo) = H(hi) + L(hi) L(lo): a sum of positive terms keeps the digits of a deep stop.
        if pass > 0.5 { above + below * under } else { 1.0 - pass }
    }
    fn series(&self) -> Series {
        self.high.low_series().times(self.low.low_series().complement()).complement()
    }
    fn extent_samples(&self) -> f64 {
        self.low.extent_samples() + self.high.extent_samples()
    }
    fn highest(&self) -> f64 {
        self.high.corner
    }
}

#[cfg(test)]
pub(super) mod tests;
