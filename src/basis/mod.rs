//! The basis that belongs to a choice of ends, and plans that take a record into it and back.
//!
//! Which transform, which frequencies, mirrors and sample positions belong to which ends is the table at the top of
//! [`crate::ends`]. This is the normalisation, stated once:
//!
//! - Positions x are in steps from the left mirror; sample n stands at x_n = n + [`Ends::first_position`]. Basis function
//!   k is phi_k(x) = A_k cos(theta_k x) where the left mirror is even and A_k sin(theta_k x) where it is odd, with
//!   theta_k = 2 pi [`Ends::frequency`] in radians per sample.
//! - Every basis is orthonormal under the weights w_n of [`Ends::weight`]: sum_n w_n phi_j(x_n) phi_k(x_n) is 1 for
//!   j = k, otherwise 0. This fixes A_k: see [`amplitude`].
//! - Forward: c_k = sum_n w_n x_n phi_k(x_n), that is c = Q W^(1/2) x with Q orthonormal and W = diag(w).
//!   Inverse: x_n = sum_k c_k phi_k(x_n). Parseval: sum c^2 = sum w x^2. Coefficients carry the unit of the samples.
//! - Periodic: coefficients are packed as constant, then cosine and sine of each harmonic in turn, then the Nyquist
//!   cosine of an even length. Phases count from sample 0, not from x = 0: the functions are A cos(theta (x - 1/2)) and
//!   A sin(theta (x - 1/2)), since half a step further back the Nyquist cosine would vanish on every sample.
//! - A quarter turn replaces every cosine by the sine of the same argument and every sine by the cosine, with the same
//!   A_k, mirrors and positions. The derivative of c_k A_k cos(theta_k x) is the turned series with -theta_k c_k, that of
//!   c_k A_k sin(theta_k x) the turned series with +theta_k c_k; in the periodic basis this holds for cosines and sines
//!   of the pair alike. The constant, the last sine of the odd half-sample basis and the periodic Nyquist cosine become
//!   functions that vanish on every sample.
//!
//! Sources: Martucci 1994, IEEE Trans. Signal Processing 42, 1038; Strang 1999, SIAM Review 41, 135.

mod angle;
#[doc(hidden)]
pub mod direct;
mod fast;
pub mod grid;
mod kernel;
mod plan;
mod planner;
pub mod series;

pub use plan::Plan;
pub use planner::Planner;

use crate::ends::{Ends, Parity, Seat};

/// The constant A_k that makes basis function `k` of a record of `len` samples orthonormal: sqrt(1/L) for a function
/// that is 1 in magnitude on every sample, otherwise sqrt(2/L), where L is [`Ends::length`]; 1 for the single sample
/// between two even whole-sample mirrors.
pub fn amplitude(ends: Ends, len: usize, k: usize) -> f64 {
    let length = ends.length(len);
    if length == 0.0 {
        return 1.0;
    }
    let last = k + 1 == len;
    let is_flat = match ends {
        Ends::Periodic => k == 0 || (last && len.is_multiple_of(2)),
        Ends::Mirror { left: Parity::Even, right: Parity::Even, seat } => k == 0 || (last && seat == Seat::Whole),
        Ends::Mirror { left: Parity::Odd, right: Parity::Odd, seat } => last && seat == Seat::Half,
        Ends::Mirror { .. } => false,
    };
    if is_flat { (1.0 / length).sqrt() } else { (2.0 / length).sqrt() }
}
