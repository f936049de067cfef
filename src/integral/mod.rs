//! The constants of an integral, from what is known of the motion at the ends, and how uncertain noise leaves the result.
//!
//! A record a of length L, less an offset b and a drift c of its sensor, integrates to
//!
//! - v(u) = v0 + V(u) - b u - c (u^2 - L u)/2
//! - d(u) = d0 + v0 u + D(u) - b u^2/2 - c (u^3/6 - L u^2/4)
//!
//! where V and D start at rest at u = 0. Lengths are in steps, so v is in the record's unit times steps, and so on.

mod constants;
mod resolve;
mod uncertainty;

pub use constants::{Arrival, AtRest, Constants, Solver};
pub use resolve::{Resolved, resolve};
pub use uncertainty::{Band, HighPass, Trial, corner_for, high_pass_area};
