//! A record's series on another even grid: any rate, any start, by a chirp transform with exact angles.

use std::f64::consts::TAU;

use rustfft::FftPlanner;
use rustfft::num_complex::Complex;

use super::amplitude;
use crate::ends::{Ends, Parity};

/// Positions `(first + m x step) / parts`, m = 0, 1, ... `count` - 1, in steps of the record from the left mirror.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub struct Grid {
    /// Numerator of the first position.
    pub first: i128,
    /// Numerator of the distance of two positions, even.
    pub step: u64,
    /// Common denominator, even.
    pub parts: u64,
    /// Number of positions.
    pub count: usize,
}

/// Values on `grid` of the series with orthonormal coefficients `straight`, plus, where there are some, those of the series
/// `turned` by a quarter turn (see [`crate::basis`]). Functions that vanish on every sample when turned are left out there.
/// O((n + m) log(n + m)) for n coefficients and m positions.
pub fn on_grid(ends: Ends, len: usize, straight: &[f64], turned: Option<&[f64]>, grid: Grid) -> Vec<f64> {
    let waves = Waves::of(ends, len, straight, turned);
    let Some(period) = waves.period(grid.parts) else {
        return vec![straight.first().copied().unwrap_or(0.0); grid.count];
    };
    // Half-cycles (2k + c for mirrors, 2j for harmonics) times positions: all angles are integers over `period` turns.
    let first = (grid.first - waves.origin * i128::from(grid.parts) / 2).rem_euclid(period as i128) as u128;
    let square = waves.stride / 2 * u128::from(grid.step) % period;
    let turns = |numerator: u128| {
        let angle = TAU * ((numerator % period) as f64 / period as f64);
        Complex::new(angle.cos(), angle.sin())
    };
    let chirp = |n: usize| {
        let n = n as u128;
        turns(square * (n * n % period))
    };
    let (count, terms) = (grid.count, waves.amplitudes.len());
    let size = (count + terms).next_power_of_two();
    let mut planner = FftPlanner::<f64>::new();
    let (forward, inverse) = (planner.plan_fft_forward(size), planner.plan_fft_inverse(size));
    let mut work = vec![Complex::default(); size];
    for (k, amplitude) in waves.amplitudes.iter().enumerate() {
        let shift = turns(waves.stride * (k as u128) % period * first);
        work[k] = amplitude * shift * chirp(k);
    }
    let mut kernel = vec![Complex::default(); size];
    for n in 0..count.max(terms) {
        let value = chirp(n).conj();
        if n < count {
            kernel[n] = value;
        }
        if n > 0 && n < terms {
            kernel[size - n] = value;
        }
    }
    forward.process(&mut work);
    forward.process(&mut kernel);
    let scale = (size as f64).recip();
    work.iter_mut().zip(&kernel).for_each(|(w, k)| *w *= k * scale);
    inverse.process(&mut work);
    let start = waves.lowest * first % period;
    let advance = waves.lowest * u128::from(grid.step) % period;
    (0..count).map(|m| (work[m] * chirp(m) * turns(start + advance * (m as u128) % period)).re).collect()
}

/// The series as the real part of a sum of e^(i w x) with half-cycles `lowest` + k `stride`, each over half a length.
struct Waves {
    amplitudes: Vec<Complex<f64>>,
    /// Twice the half-cycles of the first wave.
    lowest: u128,
    /// Twice the half-cycles from one wave to the next.
    stride: u128,
    /// Distance between the mirrors, or the period, in steps.
    length: u64,
    /// Twice the position that phases count from.
    origin: i128,
}

impl Waves {
    fn of(ends: Ends, len: usize, straight: &[f64], turned: Option<&[f64]>) -> Waves {
        let turned = |k: usize| turned.map_or(0.0, |turned| turned[k]);
        let length = ends.length(len) as u64;
        match ends {
            Ends::Periodic => {
                let pair = |j: usize| {
                    if j == 0 {
                        return Complex::new(straight[0], 0.0) * amplitude(ends, len, 0);
                    }
                    let (cosine, sine) = (2 * j - 1, 2 * j);
                    let nyquist = sine >= len;
                    let size = amplitude(ends, len, cosine);
                    let sine_value = if nyquist { 0.0 } else { straight[sine] };
                    let (from_cosine, from_sine) = if nyquist { (0.0, 0.0) } else { (turned(cosine), turned(sine)) };
                    Complex::new(straight[cosine] + from_sine, -sine_value - from_cosine) * size
                };
                let amplitudes = trimmed((0..=len / 2).map(pair).collect());
                Waves { amplitudes, lowest: 0, stride: 4, length, origin: 1 }
            }
            Ends::Mirror { left, right, .. } => {
                let lowest = match (left, right) {
                    (Parity::Even, Parity::Even) => 0,
                    (Parity::Odd, Parity::Odd) => 2,
                    _ => 1,
                };
                let wave = |k: usize| {
                    let vanishes = k + 1 == len && amplitude(ends, len, k) < 0.99 * (2.0 / length as f64).sqrt();
                    let turned = if vanishes || (k == 0 && lowest == 0) { 0.0 } else { turned(k) };
                    let value = match left {
                        Parity::Even => Complex::new(straight[k], -turned),
                        Parity::Odd => Complex::new(turned, -straight[k]),
                    };
                    value * amplitude(ends, len, k)
                };
                Waves { amplitudes: trimmed((0..len).map(wave).collect()), lowest, stride: 2, length, origin: 0 }
            }
        }
    }

    /// Twice the half-cycles over twice the length in parts of a step, for a whole turn: 4 x length x parts; `None` where
    /// there is no length.
    fn period(&self, parts: u64) -> Option<u128> {
        (self.length > 0).then(|| 4 * u128::from(self.length) * u128::from(parts))
    }
}

/// Without the waves of no size at the end; at least one.
fn trimmed(mut amplitudes: Vec<Complex<f64>>) -> Vec<Complex<f64>> {
    let used = amplitudes.iter().rposition(|a| *a != Complex::default()).map_or(1, |last| last + 1);
    amplitudes.truncate(used);
    amplitudes
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::basis::{Planner, series};

    fn coefficients(len: usize, seed: f64) -> Vec<f64> {
        (0..len).map(|k| (seed + 2.7 * k as f64).sin()).collect()
    }

    #[test]
    fn any_grid_agrees_with_the_series_point_by_point() {
        for ends in Ends::all() {
            for len in [1, 2, 3, 7, 24, 45] {
                let (straight, turned) = (coefficients(len, 0.3), coefficients(len, 1.1));
                let mut turned_used = turned.clone();
                // Off the samples the point-by-point series keeps what vanishes on them.
                let vanishing = match ends {
                    Ends::Periodic => len % 2 == 0,
                    _ => amplitude(ends, len, len - 1) < 0.99 * (2.0 / ends.length(len)).sqrt(),
                };
                if vanishing {
                    turned_used[len - 1] = 0.0;
                }
                for (first, step, parts, count) in
                    [(1, 2, 2, len), (-3, 6, 4, 9), (17, 2 * 441, 2 * 480, 50), (5, 14, 2, 3)]
                {
                    let grid = Grid { first, step, parts, count };
                    let found = on_grid(ends, len, &straight, Some(&turned), grid);
                    for (m, value) in found.iter().enumerate() {
                        let x = (first as f64 + m as f64 * step as f64) / parts as f64;
                        let exact = series::value_at(ends, len, &straight, x)
                            + if ends.length(len) > 0.0 {
                                series::turned_value_at(ends, len, &turned_used, x)
                            } else {
                                0.0
                            };
                        // About log2(256) butterfly stages and the reference's own rounding, on a norm of about sqrt(len).
                        assert!(
                            (value - exact).abs() < 2e-14 * (len as f64).sqrt(),
                            "{ends:?} {len} {grid:?} {m}: {value} {exact}"
                        );
                    }
                }
            }
        }
    }

    #[test]
    fn on_the_record_s_own_grid_it_is_the_inverse() {
        let len = 1000;
        for ends in Ends::all() {
            let straight = coefficients(len, 0.9);
            let first = (2.0 * ends.first_position()) as i128;
            let found = on_grid(ends, len, &straight, None, Grid { first, step: 2, parts: 2, count: len });
            let plan = Planner::new().plan(ends, len).unwrap();
            let (mut exact, mut scratch) = (straight, vec![f64::NAN; plan.scratch_len()]);
            plan.inverse(&mut exact, &mut scratch);
            let worst = found.iter().zip(&exact).map(|(a, b)| (a - b).abs()).fold(0.0, f64::max);
            assert!(worst < 1e-13, "{ends:?}: {worst}"); // values of size 1, 3 transforms of 11 stages
        }
    }
}
