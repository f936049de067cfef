//! Fast transforms: which one serves which ends is decided here and nowhere else.

mod fourier;
mod real;
mod type_four;
mod type_one;
mod type_two;

use std::f64::consts::{FRAC_1_SQRT_2, SQRT_2};

use fourier::Fourier;
use rustfft::num_complex::Complex;
use type_four::TypeFour;
use type_one::TypeOne;
use type_two::TypeTwo;

use crate::ends::{Ends, Parity, Seat};

/// The fast transform of one choice of ends. A faster one for some length takes the place of the type's inside.
#[derive(Debug)]
pub enum Kernel {
    Periodic(Fourier),
    HalfEven(TypeTwo),
    HalfOdd(TypeTwo),
    HalfEvenOdd(TypeFour),
    HalfOddEven(TypeFour),
    /// One sample between two even mirrors on it.
    Point,
    WholeEven(TypeOne),
    WholeOdd(TypeOne),
    WholeEvenOdd(TypeTwo),
    WholeOddEven(TypeTwo),
}

impl Kernel {
    pub fn new(ends: Ends, len: usize) -> Self {
        use Parity::{Even, Odd};
        let Ends::Mirror { left, right, seat } = ends else { return Kernel::Periodic(Fourier::new(len)) };
        match (seat, left, right) {
            (Seat::Half, Even, Even) => Kernel::HalfEven(TypeTwo::new(len)),
            (Seat::Half, Odd, Odd) => Kernel::HalfOdd(TypeTwo::new(len)),
            (Seat::Half, Even, Odd) => Kernel::HalfEvenOdd(TypeFour::new(len)),
            (Seat::Half, Odd, Even) => Kernel::HalfOddEven(TypeFour::new(len)),
            (Seat::Whole, Even, Even) if len == 1 => Kernel::Point,
            (Seat::Whole, Even, Even) => Kernel::WholeEven(TypeOne::new(len - 1)),
            (Seat::Whole, Odd, Odd) => Kernel::WholeOdd(TypeOne::new(len + 1)),
            (Seat::Whole, Even, Odd) => Kernel::WholeEvenOdd(TypeTwo::new(len)),
            (Seat::Whole, Odd, Even) => Kernel::WholeOddEven(TypeTwo::new(len)),
        }
    }

    /// Scratch in f64 for any of the three transforms.
    pub fn scratch_len(&self) -> usize {
        match self {
            Kernel::Periodic(dft) => dft.scratch_len(),
            Kernel::HalfEven(two) | Kernel::HalfOdd(two) => two.scratch_len(),
            Kernel::HalfEvenOdd(four) | Kernel::HalfOddEven(four) => four.scratch_len(),
            Kernel::Point => 0,
            Kernel::WholeEven(one) => one.scratch_len(),
            // The turned series passes through the cosines on all points, mirrors included.
            Kernel::WholeOdd(one) => one.length() + 1 + one.scratch_len(),
            Kernel::WholeEvenOdd(two) | Kernel::WholeOddEven(two) => two.scratch_len(),
        }
    }

    /// c = Q W^(1/2) x.
    pub fn forward(&self, x: &mut [f64], scratch: &mut [f64]) {
        match self {
            Kernel::Periodic(dft) => dft.forward(x, scratch),
            Kernel::HalfEven(two) => two.cosine_two(x, scratch),
            Kernel::HalfOdd(two) => two.sine_two(x, scratch),
            Kernel::HalfEvenOdd(four) => four.cosine(x, scratch),
            Kernel::HalfOddEven(four) => four.sine(x, scratch),
            Kernel::Point => {}
            Kernel::WholeEven(one) => one.weighted_cosine(x, scratch),
            Kernel::WholeOdd(one) => one.sine(x, scratch),
            Kernel::WholeEvenOdd(two) => {
                x[0] *= FRAC_1_SQRT_2;
                two.cosine_three(x, scratch);
            }
            Kernel::WholeOddEven(two) => {
                x[x.len() - 1] *= FRAC_1_SQRT_2;
                two.sine_three(x, scratch);
            }
        }
    }

    /// x = W^(-1/2) Q^T c.
    pub fn inverse(&self, c: &mut [f64], scratch: &mut [f64]) {
        let last = c.len() - 1;
        match self {
            Kernel::Periodic(dft) => dft.inverse(c, scratch),
            Kernel::HalfEven(two) => two.cosine_three(c, scratch),
            Kernel::HalfOdd(two) => two.sine_three(c, scratch),
            Kernel::HalfEvenOdd(four) => four.cosine(c, scratch),
            Kernel::HalfOddEven(four) => four.sine(c, scratch),
            Kernel::Point => {}
            Kernel::WholeEven(one) => {
                // With F = Q W^(1/2) and Q symmetric, W^(-1/2) Q = W^(-1/2) F W^(-1/2).
                c[0] *= SQRT_2;
                c[last] *= SQRT_2;
                one.weighted_cosine(c, scratch);
                c[0] *= SQRT_2;
                c[last] *= SQRT_2;
            }
            Kernel::WholeOdd(one) => one.sine(c, scratch),
            Kernel::WholeEvenOdd(two) => {
                two.cosine_two(c, scratch);
                c[0] *= SQRT_2;
            }
            Kernel::WholeOddEven(two) => {
                two.sine_two(c, scratch);
                c[last] *= SQRT_2;
            }
        }
    }

    /// The samples of the series with cosines and sines exchanged.
    pub fn inverse_turned(&self, c: &mut [f64], scratch: &mut [f64]) {
        let last = c.len() - 1;
        match self {
            Kernel::Periodic(dft) => dft.inverse_turned(c, scratch),
            Kernel::HalfEven(two) => {
                // Sine k stands in place k - 1 of the sine basis.
                c.copy_within(1.., 0);
                c[last] = 0.0;
                two.sine_three(c, scratch);
            }
            Kernel::HalfOdd(two) => {
                // The cosine of the last sine vanishes on the samples.
                c.copy_within(..last, 1);
                c[0] = 0.0;
                two.cosine_three(c, scratch);
            }
            Kernel::HalfEvenOdd(four) => four.sine(c, scratch),
            Kernel::HalfOddEven(four) => four.cosine(c, scratch),
            Kernel::Point => c[0] = 0.0,
            Kernel::WholeEven(one) => {
                c[0] = 0.0;
                c[last] = 0.0;
                one.sine(&mut c[1..last.max(1)], scratch);
            }
            Kernel::WholeOdd(one) => {
                let (points, scratch) = scratch.split_at_mut(one.length() + 1);
                points[0] = 0.0;
                points[1..=c.len()].copy_from_slice(c);
                points[one.length()] = 0.0;
                one.weighted_cosine(points, scratch);
                c.copy_from_slice(&points[1..=c.len()]);
            }
            Kernel::WholeEvenOdd(two) => {
                // The sine basis gives the points 1 to N; ours are 0 to N - 1, and every sine vanishes at 0.
                two.sine_two(c, scratch);
                c.copy_within(..last, 1);
                c[0] = 0.0;
            }
            Kernel::WholeOddEven(two) => {
                // The cosine basis gives the points 0 to N - 1; ours are 1 to N, and every cosine vanishes at N.
                two.cosine_two(c, scratch);
                c.copy_within(1.., 0);
                c[last] = 0.0;
            }
        }
    }
}

/// Lends scratch as complex numbers; an odd last place is left out.
fn complex(scratch: &mut [f64]) -> &mut [Complex<f64>] {
    let even = scratch.len() / 2 * 2;
    bytemuck::cast_slice_mut(&mut scratch[..even])
}
