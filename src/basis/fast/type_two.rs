//! DCT-II, DCT-III, DST-II and DST-III, orthonormal, by one real Fourier transform of the same length; long
//! records by the kernels made for them.
//!
//! Makhoul 1980, IEEE Trans. Acoustics, Speech and Signal Processing 28, 27: the even samples forwards, then the odd ones
//! backwards, have a spectrum V_k with exp(-i pi k/2N) V_k = C_k - i C_(N-k), the cosine sums C of the samples.

use rustfft::num_complex::Complex;

use super::real::RealFft;
use crate::basis::angle;
use crate::basis::kernel::LongTwo;
use crate::ends::Parity;

#[derive(Debug)]
pub struct TypeTwo {
    len: usize,
    way: Way,
}

#[derive(Debug)]
enum Way {
    Long(LongTwo),
    General(General),
}

/// Any length.
#[derive(Debug)]
struct General {
    fft: RealFft,
    /// sqrt(2/N) exp(-i pi k/2N) for k = 0..=N/2.
    twiddles: Vec<Complex<f64>>,
}

impl TypeTwo {
    pub fn new(len: usize) -> Self {
        let way = LongTwo::new(len).map_or_else(|| Way::General(General::new(len)), Way::Long);
        Self { len, way }
    }

    pub fn len(&self) -> usize {
        self.len
    }

    pub fn scratch_len(&self) -> usize {
        match &self.way {
            Way::Long(long) => long.scratch_len(),
            Way::General(general) => general.fft.len() + general.fft.scratch_len(),
        }
    }

    /// c_k = A_k sum_n x_n cos(pi k (n + 1/2)/N).
    pub fn cosine_two(&self, x: &mut [f64], scratch: &mut [f64]) {
        match &self.way {
            Way::Long(long) => long.forward(x, scratch, Parity::Even),
            Way::General(general) => general.forward(x, scratch, 1.0),
        }
    }

    /// x_n = sum_k c_k A_k cos(pi k (n + 1/2)/N).
    pub fn cosine_three(&self, c: &mut [f64], scratch: &mut [f64]) {
        match &self.way {
            Way::Long(long) => long.inverse(c, scratch, Parity::Even),
            Way::General(general) => general.inverse(c, scratch, 1.0),
        }
    }

    /// c_k = A_k sum_n x_n sin(pi (k + 1)(n + 1/2)/N): with k + 1 = N - m the sine is (-1)^n cos(pi m (n + 1/2)/N).
    pub fn sine_two(&self, x: &mut [f64], scratch: &mut [f64]) {
        match &self.way {
            Way::Long(long) => long.forward(x, scratch, Parity::Odd),
            Way::General(general) => {
                general.forward(x, scratch, -1.0);
                x.reverse();
            }
        }
    }

    /// x_n = sum_k c_k A_k sin(pi (k + 1)(n + 1/2)/N).
    pub fn sine_three(&self, c: &mut [f64], scratch: &mut [f64]) {
        match &self.way {
            Way::Long(long) => long.inverse(c, scratch, Parity::Odd),
            Way::General(general) => {
                c.reverse();
                general.inverse(c, scratch, -1.0);
            }
        }
    }
}

impl General {
    fn new(len: usize) -> Self {
        let scale = (2.0 / len as f64).sqrt();
        let twiddle = |k: usize| {
            let (c, s) = angle::of_turns(k as u64, 4 * len as u64);
            Complex::new(scale * c, -scale * s)
        };
        Self { fft: RealFft::new(len), twiddles: (0..=len / 2).map(twiddle).collect() }
    }

    /// Odd samples are multiplied by `sign`.
    fn forward(&self, x: &mut [f64], scratch: &mut [f64], sign: f64) {
        let len = x.len();
        let (reordered, scratch) = scratch.split_at_mut(len);
        let (evens, odds) = reordered.split_at_mut(len.div_ceil(2));
        let (pairs, rest) = x.as_chunks::<2>();
        for ((pair, even), odd) in pairs.iter().zip(evens.iter_mut()).zip(odds.iter_mut().rev()) {
            *even = pair[0];
            *odd = sign * pair[1];
        }
        if let ([middle], Some(even)) = (rest, evens.last_mut()) {
            *even = *middle;
        }
        let spectrum = self.fft.forward(reordered, scratch);
        x[0] = (1.0 / len as f64).sqrt() * spectrum[0].re;
        for (k, (&w, &v)) in self.twiddles.iter().zip(spectrum).enumerate().skip(1) {
            let value = w * v;
            x[len - k] = -value.im;
            x[k] = value.re;
        }
    }

    fn inverse(&self, c: &mut [f64], scratch: &mut [f64], sign: f64) {
        let len = c.len();
        let (reordered, scratch) = scratch.split_at_mut(len);
        self.fft.inverse(reordered, scratch, |_, spectrum| {
            spectrum[0].re = (1.0 / len as f64).sqrt() * c[0];
            for (k, (&w, v)) in self.twiddles.iter().zip(spectrum).enumerate().skip(1) {
                *v = 0.5 * w.conj() * Complex::new(c[k], -c[len - k]);
            }
        });
        let (evens, odds) = reordered.split_at(len.div_ceil(2));
        let (pairs, rest) = c.as_chunks_mut::<2>();
        for ((pair, even), odd) in pairs.iter_mut().zip(evens).zip(odds.iter().rev()) {
            *pair = [*even, sign * odd];
        }
        if let ([middle], Some(even)) = (rest, evens.last()) {
            *middle = *even;
        }
    }
}
