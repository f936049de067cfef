//! The complex spectrum of real numbers of any length, unnormalised; the work of every transform but types I and IV.

use std::fmt;
use std::sync::Arc;

use realfft::{ComplexToReal, RealFftPlanner, RealToComplex};
use rustfft::num_complex::Complex;

use super::complex;

/// X_k = sum_n x_n exp(-2 pi i k n / len) for k = 0..=len/2, and back without the factor 1/len.
pub struct RealFft {
    forward: Arc<dyn RealToComplex<f64>>,
    inverse: Arc<dyn ComplexToReal<f64>>,
}

impl RealFft {
    pub fn new(len: usize) -> Self {
        let mut planner = RealFftPlanner::new();
        Self { forward: planner.plan_fft_forward(len), inverse: planner.plan_fft_inverse(len) }
    }

    pub fn len(&self) -> usize {
        self.forward.len()
    }

    fn spectrum_len(&self) -> usize {
        self.forward.complex_len()
    }

    /// Scratch in f64: the spectrum and the work space behind it.
    pub fn scratch_len(&self) -> usize {
        2 * (self.spectrum_len() + self.forward.get_scratch_len().max(self.inverse.get_scratch_len()))
    }

    /// The spectrum of `x`, in the front of `scratch`. `x` is destroyed.
    pub fn forward<'a>(&self, x: &mut [f64], scratch: &'a mut [f64]) -> &'a [Complex<f64>] {
        let (spectrum, work) = complex(scratch).split_at_mut(self.spectrum_len());
        self.forward.process_with_scratch(x, spectrum, work).expect("the lengths are those of the plan");
        spectrum
    }

    /// The samples, into `x`, of the spectrum that `fill` writes; `fill` may read what `x` held before. Imaginary parts of
    /// the constant and of an even length's Nyquist entry do not count.
    pub fn inverse(&self, x: &mut [f64], scratch: &mut [f64], fill: impl FnOnce(&[f64], &mut [Complex<f64>])) {
        let (spectrum, work) = complex(scratch).split_at_mut(self.spectrum_len());
        fill(x, spectrum);
        spectrum[0].im = 0.0;
        if x.len().is_multiple_of(2) {
            spectrum[x.len() / 2].im = 0.0;
        }
        self.inverse.process_with_scratch(spectrum, x, work).expect("the lengths are those of the plan");
    }
}

impl fmt::Debug for RealFft {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        write!(f, "RealFft({})", self.forward.len())
    }
}
