//! One choice of ends and one length, made ready: takes samples to coefficients and back.

use super::fast::Kernel;
use crate::ends::Ends;
use crate::error::{Error, Result};

/// The transforms of records of one length with one choice of ends; normalisation as stated in [`crate::basis`].
/// Immutable and shared between threads; every call borrows the caller's scratch, of which the contents do not matter,
/// and allocates nothing. O(len log len) for every length.
#[derive(Debug)]
pub struct Plan {
    ends: Ends,
    len: usize,
    kernel: Kernel,
}

impl Plan {
    /// The plan for `len` samples.
    ///
    /// # Errors
    /// [`crate::error::Kind::Unsupported`] when `len` is 0.
    pub fn new(ends: Ends, len: usize) -> Result<Self> {
        if len == 0 {
            return Err(Error::unsupported("a record without samples has no basis"));
        }
        Ok(Self { ends, len, kernel: Kernel::new(ends, len) })
    }

    /// The ends of the records.
    pub fn ends(&self) -> Ends {
        self.ends
    }

    /// The number of samples, at least 1.
    #[expect(clippy::len_without_is_empty, reason = "a plan is never empty")]
    pub fn len(&self) -> usize {
        self.len
    }

    /// How many numbers of scratch every transform needs at least.
    pub fn scratch_len(&self) -> usize {
        self.kernel.scratch_len()
    }

    /// Frequency of basis function `k` in cycles per sample.
    pub fn frequency(&self, k: usize) -> f64 {
        self.ends.frequency(self.len, k)
    }

    /// Samples to orthonormal coefficients, in place: c = Q W^(1/2) x.
    ///
    /// # Panics
    /// If `x` does not hold [`Plan::len`] samples or `scratch` is shorter than [`Plan::scratch_len`].
    pub fn forward(&self, x: &mut [f64], scratch: &mut [f64]) {
        let scratch = self.checked(x.len(), scratch);
        self.kernel.forward(x, scratch);
    }

    /// Orthonormal coefficients to samples, in place: x = W^(-1/2) Q^T c. Panics as [`Plan::forward`] does.
    pub fn inverse(&self, c: &mut [f64], scratch: &mut [f64]) {
        let scratch = self.checked(c.len(), scratch);
        self.kernel.inverse(c, scratch);
    }

    /// Coefficients to the samples of the series after a quarter turn, in place: every A_k cos(theta_k x) of the basis
    /// replaced by A_k sin(theta_k x) and every sine by the cosine, at the same positions between the same mirrors. Signs
    /// and powers of the frequency are the caller's, already in `c`: see [`crate::basis`]. Panics as [`Plan::forward`]
    /// does.
    pub fn inverse_turned(&self, c: &mut [f64], scratch: &mut [f64]) {
        let scratch = self.checked(c.len(), scratch);
        self.kernel.inverse_turned(c, scratch);
    }

    fn checked<'a>(&self, given: usize, scratch: &'a mut [f64]) -> &'a mut [f64] {
        assert!(given == self.len, "a plan for {} samples was given {given}", self.len);
        let needed = self.scratch_len();
        assert!(scratch.len() >= needed, "a plan that needs {needed} numbers of scratch was lent {}", scratch.len());
        &mut scratch[..needed]
    }
}
