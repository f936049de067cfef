//! Fourier transforms of eight signals of one length at once, each signal in its own lane.

use super::butterfly::{Point, circle, eight, four, mul, odd, splat, two};
use super::roots::root;
use pulp::{Arch, Simd, WithSimd};
use rustfft::{Fft, FftPlanner, num_complex::Complex};
use std::array::from_fn;
use std::sync::Arc;

/// Signals side by side.
pub const LANES: usize = 8;
/// Values a point takes: eight real parts, then eight imaginary parts.
pub const POINT: usize = 2 * LANES;

/// A forward transform, sum over n of x[n] exp(-2 pi i k n / len), of eight signals at once, unscaled.
pub struct LaneTransform {
    len: usize,
    way: Way,
}

enum Way {
    /// Stages of the written-out small transforms, results in order (Stockham 1966).
    Stages(Vec<Stage>),
    /// A factor above 13: one signal after the other by the general kernel.
    Each(Arc<dyn Fft<f64>>),
}

struct Stage {
    radix: usize,
    /// Groups with a twiddle of their own.
    groups: usize,
    /// Neighbouring points that share it.
    span: usize,
    /// radix - 1 twiddles for each group.
    twiddles: Vec<[f64; 2]>,
}

impl LaneTransform {
    /// A plan for `len` points.
    pub fn new(len: usize) -> Self {
        let way = match radices(len) {
            Some(radices) => Way::Stages(stages(len, &radices)),
            None => Way::Each(FftPlanner::new().plan_fft_forward(len)),
        };
        Self { len, way }
    }

    /// Values that each of the two slices of [`LaneTransform::run`] needs: `len` points, and what the general kernel works in.
    pub fn space(&self) -> usize {
        let work = match &self.way {
            Way::Stages(_) => 0,
            Way::Each(fft) => 2 * fft.get_inplace_scratch_len(),
        };
        self.len * POINT + work
    }

    /// Transforms the points of `from`; the result lies in the first slice returned, the other one is free again.
    pub fn run<'a>(&self, arch: Arch, from: &'a mut [f64], to: &'a mut [f64]) -> (&'a mut [f64], &'a mut [f64]) {
        let (mut from, mut to) = (&mut from[..self.space()], &mut to[..self.space()]);
        match &self.way {
            Way::Stages(stages) => {
                for stage in stages {
                    arch.dispatch(StageRun { stage, from, to });
                    std::mem::swap(&mut from, &mut to);
                }
            }
            Way::Each(fft) => one_by_one(fft.as_ref(), from, to),
        }
        (from, to)
    }
}

/// Small transforms whose product is `len`, or none if a prime factor exceeds 13.
fn radices(mut len: usize) -> Option<Vec<usize>> {
    let mut found = Vec::new();
    for radix in [13, 11, 7, 5, 3] {
        while len.is_multiple_of(radix) {
            found.push(radix);
            len /= radix;
        }
    }
    if !len.is_power_of_two() {
        return None;
    }
    let mut twos = len.trailing_zeros();
    while twos > 0 {
        // Eights, except that two fours do less than an eight and a two.
        let step = if twos == 4 || twos == 2 { 2 } else { twos.min(3) };
        found.push(1 << step);
        twos -= step;
    }
    Some(found)
}

fn stages(len: usize, radices: &[usize]) -> Vec<Stage> {
    let mut span = 1;
    let mut stages = Vec::new();
    for &radix in radices {
        let groups = len / (span * radix);
        let turn = (groups * radix) as u64;
        let twiddles =
            (0..groups as u64).flat_map(|p| (1..radix as u64).map(move |i| root(p * i % turn, turn))).collect();
        stages.push(Stage { radix, groups, span, twiddles });
        span *= radix;
    }
    stages
}

struct StageRun<'a> {
    stage: &'a Stage,
    from: &'a [f64],
    to: &'a mut [f64],
}

impl WithSimd for StageRun<'_> {
    type Output = ();

    #[inline(always)]
    fn with_simd<S: Simd>(self, simd: S) {
        match self.stage.radix {
            2 => self.sweep(
                simd,
                #[inline(always)]
                |x| two(simd, x),
            ),
            3 => self.sweep_odd::<S, 3>(simd),
            4 => self.sweep(
                simd,
                #[inline(always)]
                |x| four(simd, x),
            ),
            5 => self.sweep_odd::<S, 5>(simd),
            7 => self.sweep_odd::<S, 7>(simd),
            8 => self.sweep(
                simd,
                #[inline(always)]
                |x| eight(simd, x),
            ),
            11 => self.sweep_odd::<S, 11>(simd),
            _ => self.sweep_odd::<S, 13>(simd),
        }
    }
}

impl StageRun<'_> {
    #[inline(always)]
    fn sweep_odd<S: Simd, const R: usize>(self, simd: S) {
        let circle = circle::<R>();
        self.sweep(
            simd,
            #[inline(always)]
            |x| odd::<S, R>(simd, x, &circle),
        );
    }

    #[inline(always)]
    fn sweep<S: Simd, const R: usize>(self, simd: S, small: impl Fn([Point<S>; R]) -> [Point<S>; R]) {
        let Stage { groups, span, .. } = *self.stage;
        // A point is 2 v vectors: v of real parts, v of imaginary parts.
        let v = const { LANES / S::F64_LANES };
        let block = span * 2 * v;
        let from = &S::as_simd_f64s(self.from).0[..R * groups * block];
        let to = &mut S::as_mut_simd_f64s(self.to).0[..R * groups * block];
        for (p, to) in to.chunks_exact_mut(R * block).enumerate() {
            let legs: [&[S::f64s]; R] = from_fn(
                #[inline(always)]
                |j| &from[(j * groups + p) * block..][..block],
            );
            let mut outs = to.chunks_exact_mut(block);
            let outs: [&mut [S::f64s]; R] = from_fn(
                #[inline(always)]
                |_| outs.next().unwrap_or_default(),
            );
            let twiddles: [Point<S>; R] = from_fn(
                #[inline(always)]
                |i| {
                    if i == 0 { splat(simd, [1.0, 0.0]) } else { splat(simd, self.stage.twiddles[p * (R - 1) + i - 1]) }
                },
            );
            for at in 0..span {
                for h in 0..v {
                    let at = at * 2 * v + h;
                    let x = from_fn(
                        #[inline(always)]
                        |j| [legs[j][at], legs[j][at + v]],
                    );
                    let y = small(x);
                    for i in 0..R {
                        let y = if i == 0 || p == 0 { y[i] } else { mul(simd, y[i], twiddles[i]) };
                        outs[i][at] = y[0];
                        outs[i][at + v] = y[1];
                    }
                }
            }
        }
    }
}

/// Lends each lane in turn to a kernel for contiguous complex signals; the result replaces `points`.
fn one_by_one(fft: &dyn Fft<f64>, points: &mut [f64], space: &mut [f64]) {
    let len = fft.len();
    let (points, _) = points[..len * POINT].as_chunks_mut::<POINT>();
    let (space, _) = space.as_chunks_mut::<2>();
    let (signals, work) = bytemuck::cast_slice_mut::<_, Complex<f64>>(space).split_at_mut(LANES * len);
    for (l, signal) in signals.chunks_exact_mut(len).enumerate() {
        for (value, point) in signal.iter_mut().zip(points.iter()) {
            *value = Complex::new(point[l], point[LANES + l]);
        }
    }
    fft.process_with_scratch(signals, work);
    for (l, signal) in signals.chunks_exact(len).enumerate() {
        for (value, point) in signal.iter().zip(points.iter_mut()) {
            (point[l], point[LANES + l]) = (value.re, value.im);
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    /// Every way of computing that this processor has.
    fn ways() -> Vec<Arch> {
        let mut ways = vec![Arch::Scalar, Arch::new()];
        #[cfg(target_arch = "x86_64")]
        ways.extend(pulp::x86::V3::try_new().map(Arch::V3));
        ways
    }

    #[test]
    fn every_lane_is_a_transform_of_its_own() {
        // One stage of each kind, mixed stages, and a factor above 13.
        for len in [1, 2, 3, 4, 5, 7, 8, 11, 13, 16, 17, 30, 77, 96, 169, 250, 1001, 17 * 12] {
            let plan = LaneTransform::new(len);
            let x: Vec<f64> = (0..plan.space()).map(|i| ((i * i + 7) % 89) as f64 / 89.0 - 0.5).collect();
            let norm = x.iter().map(|v| v * v).sum::<f64>().sqrt();
            for arch in ways() {
                let (mut from, mut to) = (x.clone(), vec![f64::NAN; plan.space()]);
                let (done, _) = plan.run(arch, &mut from, &mut to);
                for k in (0..len).step_by(len.div_ceil(40)) {
                    for l in 0..LANES {
                        let mut want = [0.0; 2];
                        for n in 0..len {
                            let [c, s] = root((k * n % len) as u64, len as u64);
                            let (re, im) = (x[n * POINT + l], x[n * POINT + LANES + l]);
                            want = [want[0] + re * c - im * s, want[1] + re * s + im * c];
                        }
                        let far = (done[k * POINT + l] - want[0]).hypot(done[k * POINT + LANES + l] - want[1]);
                        // len terms, each within some eps of its share of the norm of all eight lanes.
                        let bound = 4.0 * f64::EPSILON * (1.0 + (len as f64).log2()) * norm;
                        assert!(far < bound, "{len}, {k}, lane {l}, {arch:?}: {far:e}");
                    }
                }
            }
        }
    }
}
