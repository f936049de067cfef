//! What an operator does to one sample: gain, impulse response, reach.

use std::f64::consts::TAU;

use rustfft::num_complex::Complex;

use crate::baseline::Side;
use crate::numeric::fourier;

/// An operator as the edges see it. Frequencies in cycles per sample, lengths in samples.
#[derive(Clone, Copy)]
pub struct Shape<'a> {
    /// Size of the gain at a frequency from 0 to 1/2, in units of the output per unit of the record; with turns see
    /// [`turned`].
    pub gain: &'a (dyn Fn(f64) -> f64 + Sync),
    /// Quarter turns of the phase: derivative +1, integral -1.
    pub turns: i32,
    /// Shortest corner wavelength.
    pub shortest_wavelength: f64,
}

/// The size of `gain` (i w)^`turns` at `f` cycles per sample, as `Shape::gain` wants it. An integral leaves zero frequency
/// out: what it makes of a constant is no matter of frequencies.
pub fn turned(gain: f64, f: f64, turns: i32) -> f64 {
    if turns < 0 && f == 0.0 { 0.0 } else { gain * (TAU * f).powi(turns) }
}

/// The impulse response on a grid, and the reach: beyond it lies a thousandth of the kernel's absolute area.
pub struct Response<'a> {
    shape: Shape<'a>,
    /// Lags 0, 1, ... up to half the grid. Operators of real gain are even, or odd: that changes the sign at negative lags.
    kernel: Vec<f64>,
    /// `steps[n]` = sum of the kernel over the lags 0..n.
    steps: Vec<f64>,
    /// The same over the lags 0, -1, ..., where the operator shifts phases.
    mirrored_steps: Option<Vec<f64>>,
    reach: usize,
}

/// Wavelengths of the first grid.
const SPAN: f64 = 16.0;

/// Half the grid must hold the reach this many times.
const SETTLED: usize = 3;

/// The share of the kernel's absolute area that may lie beyond the reach.
const BEYOND_REACH: f64 = 1e-3;

impl<'a> Response<'a> {
    /// The response on a periodic grid of `grid` samples (at least 8).
    pub fn on_grid(shape: Shape<'a>, grid: usize) -> Self {
        let kernel = fourier::impulse_response(grid.max(8), shape.gain, shape.turns);
        let reach = reach(&kernel);
        Self { shape, steps: running(&kernel), mirrored_steps: None, kernel, reach }
    }

    /// As `on_grid`, for an operator whose gain is multiplied by a `phase` of size one at every frequency: what comes from
    /// before a sample differs from what comes from after it.
    fn with_phase_on_grid(shape: Shape<'a>, phase: &dyn Fn(f64) -> Complex<f64>, grid: usize) -> Self {
        let grid = grid.max(8);
        let turn = fourier::quarter_turns(shape.turns);
        let both = fourier::two_sided_response(grid, |f| phase(f) * turn * (shape.gain)(f));
        let half = grid / 2;
        let kernel = both[..=half].to_vec();
        let mirrored: Vec<f64> = (0..=half).map(|n| both[(grid - n) % grid]).collect();
        let sizes: Vec<f64> = kernel.iter().zip(&mirrored).map(|(a, b)| 0.5 * (a.abs() + b.abs())).collect();
        let reach = reach(&sizes);
        Self { shape, steps: running(&kernel), mirrored_steps: Some(running(&mirrored)), kernel, reach }
    }

    /// The response as far as a record of `len` samples needs it: on a grid of a few wavelengths that grows until the reach
    /// settles, at most four times the record.
    pub fn of(shape: Shape<'a>, len: usize) -> Self {
        Self::settled(shape, len, |grid| Self::on_grid(shape, grid))
    }

    /// As `of`, for an operator that shifts phases.
    pub fn with_phase(shape: Shape<'a>, phase: &dyn Fn(f64) -> Complex<f64>, len: usize) -> Self {
        Self::settled(shape, len, |grid| Self::with_phase_on_grid(shape, phase, grid))
    }

    fn settled(shape: Shape<'a>, len: usize, made: impl Fn(usize) -> Self) -> Self {
        let most = (4 * len).max(8);
        let mut grid = ((SPAN * shape.shortest_wavelength) as usize).next_power_of_two().max(1024);
        loop {
            let response = made(grid.min(most));
            // Tails that go once round the grid are folded back: by then they must have died away.
            if grid >= most || SETTLED * response.reach <= grid / 2 {
                return response;
            }
            grid *= 4;
        }
    }

    /// The operator's own description.
    pub fn shape(&self) -> Shape<'a> {
        self.shape
    }

    /// Impulse response at lags 0, 1, ...
    pub fn kernel(&self) -> &[f64] {
        &self.kernel
    }

    /// Least distance with at most a thousandth of the absolute kernel area beyond it on both sides, in samples.
    pub fn reach(&self) -> usize {
        self.reach
    }

    /// The edge zone of a record of `len` samples, each end.
    pub fn zone(&self, len: usize) -> usize {
        self.reach.min(len / 4).max(4).min(len)
    }

    /// How far an end of a record of `len` samples can be trimmed: to the reach, at most to the middle.
    pub fn trimmable(&self, len: usize) -> usize {
        self.reach.min(len / 2)
    }

    /// Sum of the changes of the kernel from lag 1 on, relative to its area from there: the share by which it changes over
    /// one sample.
    pub fn roughness(&self) -> f64 {
        let changes: f64 = self.kernel.windows(2).skip(1).map(|w| (w[1] - w[0]).abs()).sum();
        let area: f64 = self.kernel.iter().skip(1).map(|h| h.abs()).sum();
        if area > 0.0 { changes / area } else { 0.0 }
    }

    /// Sum of the kernel over the distances from..to, as seen from inside past one end; beyond the grid it counts as zero.
    /// The two ends differ where phases shift, and an odd operator changes the sign at the right one, which is left to the
    /// caller.
    pub fn area(&self, side: Side, from: usize, to: usize) -> f64 {
        let steps = match (side, &self.mirrored_steps) {
            (Side::Right, Some(mirrored)) => mirrored,
            _ => &self.steps,
        };
        let last = steps.len() - 1;
        steps[to.min(last)] - steps[from.min(last)]
    }
}

/// Sums over the lags before each.
fn running(kernel: &[f64]) -> Vec<f64> {
    let mut sum = 0.0;
    let mut steps = Vec::with_capacity(kernel.len() + 1);
    steps.push(0.0);
    for &h in kernel {
        sum += h;
        steps.push(sum);
    }
    steps
}

fn reach(kernel: &[f64]) -> usize {
    let area: f64 = kernel.iter().map(|h| h.abs()).sum();
    let whole = 2.0 * area - kernel[0].abs();
    let mut beyond = 0.0;
    for n in (1..kernel.len()).rev() {
        beyond += 2.0 * kernel[n].abs();
        if beyond > BEYOND_REACH * whole {
            return n;
        }
    }
    0
}

#[cfg(test)]
mod tests {
    use super::*;

    fn reach_of(gain: &(dyn Fn(f64) -> f64 + Sync), len: usize) -> f64 {
        let shape = Shape { gain, turns: 0, shortest_wavelength: 100.0 };
        Response::of(shape, len).reach() as f64 / 100.0
    }

    #[test]
    fn reaches_are_those_of_the_closed_forms() {
        // Gaussian: erfc(pi r/sqrt(ln 2)) = 0.001 gives r = 0.617 wavelengths (tables of the error function). The squared
        // Butterworth response of order 4 has the envelope exp(-2 pi r sin(pi/8)): a thousandth at about 2.7.
        assert!((reach_of(&|f| (-(f * 100.0).powi(2)).exp2(), 10_000) - 0.617).abs() < 0.01);
        assert!((reach_of(&|f| 1.0 / (1.0 + (f * 100.0).powi(8)), 10_000) - 2.7).abs() < 0.05);
        // The tail of a brick wall falls as 1/n only: no number of samples holds it.
        assert!(reach_of(&|f| if f < 0.01 { 1.0 } else { 0.0 }, 10_000) > 100.0);
        assert_eq!(reach_of(&|_| 1.0, 1000), 0.0);
    }

    #[test]
    fn areas_add_up_to_the_gain_at_zero_frequency() {
        let gain = |f: f64| (-(f * 100.0).powi(2)).exp2();
        let response = Response::of(Shape { gain: &gain, turns: 0, shortest_wavelength: 100.0 }, 10_000);
        let outside = response.area(Side::Left, 1, usize::MAX);
        assert!((response.kernel()[0] + 2.0 * outside - 1.0).abs() < 1e-12);
        assert!((response.area(Side::Right, 5, 9) - response.kernel()[5..9].iter().sum::<f64>()).abs() < 1e-15);
    }

    #[test]
    fn a_delay_is_seen_from_the_left_end_alone() {
        // e^(-i w 5): every sample comes from five before, so past the left end five samples are felt and none past the right.
        let gain = |_: f64| 1.0;
        let phase = |f: f64| Complex::from_polar(1.0, -TAU * f * 5.0);
        let shape = Shape { gain: &gain, turns: 0, shortest_wavelength: 20.0 };
        let response = Response::with_phase(shape, &phase, 1000);
        assert!((response.area(Side::Left, 5, 6) - 1.0).abs() < 1e-12);
        assert!(response.area(Side::Right, 1, 100).abs() < 1e-12 && response.area(Side::Left, 6, 100).abs() < 1e-12);
        assert_eq!(response.reach(), 5);
    }

    #[test]
    fn a_derivative_has_no_kernel_at_lag_zero() {
        let gain = |f: f64| std::f64::consts::TAU * f * (-(f * 100.0).powi(2)).exp2();
        let response = Response::of(Shape { gain: &gain, turns: 1, shortest_wavelength: 100.0 }, 10_000);
        // h(n) < 0 for n > 0: a rise ahead means a fall behind; the kernel is odd, y(j) = sum h(j - n) x(n).
        assert!(response.kernel()[0].abs() < 1e-15 && response.kernel()[20] < 0.0);
    }
}
