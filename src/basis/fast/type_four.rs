//! DCT-IV and DST-IV, orthonormal: even lengths by a complex transform of half the length, odd ones by a real transform of
//! the same length and a permutation; long records by the kernel made for them.

use std::fmt;
use std::sync::Arc;

use rustfft::num_complex::Complex;
use rustfft::{Fft, FftPlanner};

use super::complex;
use super::real::RealFft;
use crate::basis::angle;
use crate::basis::kernel::{LongFour, long_four};
use crate::ends::Parity;

pub enum TypeFour {
    Long(Box<LongFour>),
    Even {
        fft: Arc<dyn Fft<f64>>,
        /// (2/N)^(1/4) exp(-i pi (8n + 1)/8N) for n < N/2.
        twiddles: Vec<Complex<f64>>,
    },
    Odd(RealFft),
}

impl TypeFour {
    pub fn new(len: usize) -> Self {
        if let Some(long) = long_four(len) {
            return Self::Long(Box::new(long));
        }
        if !len.is_multiple_of(2) {
            return Self::Odd(RealFft::new(len));
        }
        let scale = (2.0 / len as f64).sqrt().sqrt();
        let twiddle = |n: usize| {
            let (c, s) = angle::of_turns(8 * n as u64 + 1, 16 * len as u64);
            Complex::new(scale * c, -scale * s)
        };
        let fft = FftPlanner::new().plan_fft_forward(len / 2);
        Self::Even { fft, twiddles: (0..len / 2).map(twiddle).collect() }
    }

    pub fn scratch_len(&self) -> usize {
        match self {
            Self::Long(long) => long.scratch_len(),
            Self::Even { fft, .. } => 2 * (fft.len() + fft.get_inplace_scratch_len()),
            Self::Odd(fft) => fft.len() + fft.scratch_len(),
        }
    }

    /// c_k = sqrt(2/N) sum_n x_n cos(pi (k + 1/2)(n + 1/2)/N); its own inverse.
    pub fn cosine(&self, x: &mut [f64], scratch: &mut [f64]) {
        match self {
            Self::Long(long) => long.transform(x, scratch, Parity::Even),
            Self::Even { fft, twiddles } => even(fft.as_ref(), twiddles, x, scratch),
            Self::Odd(fft) => odd(fft, x, scratch),
        }
    }

    /// c_k = sqrt(2/N) sum_n x_n sin(pi (k + 1/2)(n + 1/2)/N); its own inverse. Read backwards in n the sine is
    /// (-1)^k times the cosine.
    pub fn sine(&self, x: &mut [f64], scratch: &mut [f64]) {
        if let Self::Long(long) = self {
            return long.transform(x, scratch, Parity::Odd);
        }
        x.reverse();
        self.cosine(x, scratch);
        x.iter_mut().skip(1).step_by(2).for_each(|v| *v = -*v);
    }
}

/// With z_n = x_2n + i x_(N-1-2n) and phi = pi (2k + 1/2)(2n + 1/2)/N, C_2k - i C_(N-1-2k) = sum_n z_n exp(-i phi), and
/// phi = 2 pi k n/(N/2) + pi (k + 1/8)/N + pi (n + 1/8)/N: a transform of N/2 points between two equal twiddles.
fn even(fft: &dyn Fft<f64>, twiddles: &[Complex<f64>], x: &mut [f64], scratch: &mut [f64]) {
    let last = x.len() - 1;
    let (z, work) = complex(scratch).split_at_mut(twiddles.len());
    for (n, (z, &w)) in z.iter_mut().zip(twiddles).enumerate() {
        *z = w * Complex::new(x[2 * n], x[last - 2 * n]);
    }
    fft.process_with_scratch(z, work);
    for (k, (&z, &w)) in z.iter().zip(twiddles).enumerate() {
        let value = w * z;
        x[2 * k] = value.re;
        x[last - 2 * k] = -value.im;
    }
}

/// After Chan and Ho 1992, IEEE Trans. Circuits and Systems II 39, 185. The odd numbers j = 2n + 1 and l = 2k + 1 count
/// modulo 8N, and 8 and N are coprime: with u = 1/N mod 8 and v = 1/8 mod N, j l/8N = u j l/8 + v j l/N modulo 1. The
/// reflections j -> -j and j -> 4N - j bring every j to 1 modulo 8; what is left is a transform over j modulo N.
fn odd(fft: &RealFft, x: &mut [f64], scratch: &mut [f64]) {
    let len = x.len();
    let turn = 8 * len;
    let u = len % 8; // its own inverse modulo 8
    let first = len * u; // 0 modulo N, 1 modulo 8
    let (y, scratch) = scratch.split_at_mut(len);
    // 1 modulo N, 0 modulo 8.
    let step = (8 - u) * len + 1;
    let mut j = first;
    for y in y.iter_mut() {
        let (n, sign) = fold(j, len);
        *y = sign * x[n];
        j += step;
        j -= if j >= turn { turn } else { 0 };
    }
    let spectrum = fft.forward(y, scratch);
    // sqrt(2/N) times the cosine and sine of pi u/4, which are +-sqrt(1/2).
    let scale = (1.0 / len as f64).sqrt();
    let of_re = if u == 1 || u == 7 { scale } else { -scale };
    let of_im = if u == 1 || u == 3 { scale } else { -scale };
    // Entry q belongs to l = 8q modulo N.
    let (mut above, mut below) = (first, first);
    for (q, value) in spectrum.iter().enumerate() {
        let (re, im) = (of_re * value.re, of_im * value.im);
        let (k, sign) = fold(above, len);
        x[k] = sign * (re + im);
        if q > 0 {
            let (k, sign) = fold(below, len);
            x[k] = sign * (re - im);
        }
        above += 8;
        above -= if above >= turn { turn } else { 0 };
        below += if below < 8 { turn } else { 0 };
        below -= 8;
    }
}

/// The sample under the odd number `j` below 8N and its sign: even about 0, odd about 2N.
fn fold(j: usize, len: usize) -> (usize, f64) {
    match j {
        _ if j < 2 * len => (j / 2, 1.0),
        _ if j < 4 * len => ((4 * len - j) / 2, -1.0),
        _ if j < 6 * len => ((j - 4 * len) / 2, -1.0),
        _ => ((8 * len - j) / 2, 1.0),
    }
}

impl fmt::Debug for TypeFour {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        match self {
            Self::Long(long) => long.fmt(f),
            Self::Even { fft, .. } => write!(f, "TypeFour({})", 2 * fft.len()),
            Self::Odd(fft) => write!(f, "TypeFour({})", fft.len()),
        }
    }
}
