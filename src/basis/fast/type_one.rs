//! DCT-I and DST-I, orthonormal, on the points between and on two mirrors L steps apart.
//!
//! Even L: the sums and differences of points equally far from both mirrors are a type I problem of L/2 (even k) and a
//! type III problem of L/2 (odd k). Odd L: the extension of 2L points splits by the residues of k modulo 2 and L, which
//! are coprime, into two symmetric sequences of L points; both go through one complex transform as its real and
//! imaginary part, without twiddles.

use std::f64::consts::{FRAC_1_SQRT_2, SQRT_2};
use std::fmt;
use std::sync::Arc;

use rustfft::num_complex::Complex;
use rustfft::{Fft, FftPlanner};

use super::complex;
use super::type_two::TypeTwo;

pub enum TypeOne {
    Even { half: TypeTwo, rest: Box<TypeOne> },
    Odd(Arc<dyn Fft<f64>>),
}

impl TypeOne {
    /// For mirrors `length` >= 1 steps apart.
    pub fn new(length: usize) -> Self {
        if length.is_multiple_of(2) {
            Self::Even { half: TypeTwo::new(length / 2), rest: Box::new(Self::new(length / 2)) }
        } else {
            Self::Odd(FftPlanner::new().plan_fft_forward(length))
        }
    }

    /// Steps between the mirrors.
    pub fn length(&self) -> usize {
        match self {
            Self::Even { half, .. } => 2 * half.len(),
            Self::Odd(fft) => fft.len(),
        }
    }

    pub fn scratch_len(&self) -> usize {
        match self {
            Self::Even { half, rest } => half.len() + half.scratch_len().max(rest.scratch_len()),
            Self::Odd(fft) => 2 * (fft.len() + fft.get_inplace_scratch_len()),
        }
    }

    /// c_k = A_k sum_n w_n x_n cos(pi k n/L) on the L + 1 points, w = 1/2 on both mirrors.
    pub fn weighted_cosine(&self, x: &mut [f64], scratch: &mut [f64]) {
        let last = x.len() - 1;
        match self {
            Self::Even { half, rest } => {
                let middle = half.len();
                let (differences, scratch) = scratch.split_at_mut(middle);
                for n in 0..middle {
                    (differences[n], x[n]) = (x[n] - x[last - n], x[n] + x[last - n]);
                }
                differences[0] *= FRAC_1_SQRT_2;
                x[middle] *= 2.0;
                half.cosine_three(differences, scratch);
                rest.weighted_cosine(&mut x[..=middle], scratch);
                // From the back, so that nothing is overwritten unread. A_k of L/2 is sqrt(2) times that of L.
                x[last] = FRAC_1_SQRT_2 * x[middle];
                for k in (0..middle).rev() {
                    x[2 * k + 1] = FRAC_1_SQRT_2 * differences[k];
                    x[2 * k] = FRAC_1_SQRT_2 * x[k];
                }
            }
            Self::Odd(fft) => {
                let (z, work) = complex(scratch).split_at_mut(last);
                for (n, z) in z.iter_mut().enumerate() {
                    let difference = x[n] - x[last - n];
                    *z = Complex::new(x[n] + x[last - n], if n % 2 == 0 { difference } else { -difference });
                }
                fft.process_with_scratch(z, work);
                // Half of A_k: the extension holds every pair of samples twice.
                let flat = 0.5 * (1.0 / last as f64).sqrt();
                let wave = 0.5 * (2.0 / last as f64).sqrt();
                x[0] = flat * z[0].re;
                x[last] = flat * z[0].im;
                for j in 1..=last / 2 {
                    x[2 * j] = wave * z[j].re;
                    x[last - 2 * j] = wave * z[j].im;
                }
            }
        }
    }

    /// c_k = sqrt(2/L) sum_n x_n sin(pi k n/L) on the L - 1 points between the mirrors, k and n from 1; its own inverse.
    pub fn sine(&self, x: &mut [f64], scratch: &mut [f64]) {
        let len = x.len();
        match self {
            _ if len == 0 => {}
            Self::Even { half, rest } => {
                let middle = half.len();
                let (sums, scratch) = scratch.split_at_mut(middle);
                for i in 0..middle - 1 {
                    (sums[i], x[i]) = (x[i] + x[len - 1 - i], x[i] - x[len - 1 - i]);
                }
                // Twice the middle sample, which lies on the even mirror of the sums: W^(1/2) halves its square.
                sums[middle - 1] = SQRT_2 * x[middle - 1];
                half.sine_three(sums, scratch);
                rest.sine(&mut x[..middle - 1], scratch);
                for j in (1..middle).rev() {
                    x[2 * j] = FRAC_1_SQRT_2 * sums[j];
                    x[2 * j - 1] = FRAC_1_SQRT_2 * x[j - 1];
                }
                x[0] = FRAC_1_SQRT_2 * sums[0];
            }
            Self::Odd(fft) => {
                let length = fft.len();
                let (z, work) = complex(scratch).split_at_mut(length);
                z[0] = Complex::new(0.0, 0.0);
                for n in 1..length {
                    let (value, opposite) = (x[n - 1], x[length - n - 1]);
                    let sum = value + opposite;
                    z[n] = Complex::new(value - opposite, if n % 2 == 0 { sum } else { -sum });
                }
                fft.process_with_scratch(z, work);
                let wave = 0.5 * (2.0 / length as f64).sqrt();
                for j in 1..=length / 2 {
                    x[2 * j - 1] = -wave * z[j].im;
                    x[length - 2 * j - 1] = -wave * z[j].re;
                }
            }
        }
    }
}

impl fmt::Debug for TypeOne {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        write!(f, "TypeOne({})", self.length())
    }
}
