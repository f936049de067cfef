//! What is done to a record in the frequency domain: filters, derivatives, integrals, and how far they reach.
//!
//! An operator is a gain per frequency (real, or complex where an instrument shifts phases), a whole number of quarter turns
//! (derivative +1, integral -1), its exact action on polynomials, and its reach. Gains commute, so their order in a request
//! does not matter. What is done to the samples themselves (spikes, smoothing by the data's own measure, another rate) is a
//! treatment before or after the passes. Adding an operator is one file and one row of `STEPS`.

mod band;
mod calibration;
mod chain;
mod conditions;
mod corner;
mod description;
mod despike;
mod edge;
mod gain;
mod kernel;
mod notch;
mod quantity;
mod range;
mod reach;
mod request;
mod resampling;
mod sensor;
mod shape;
mod smoothing;
mod step;
mod table;
mod treatment;
mod turn;
mod weighting;

pub use chain::{Chain, Pass, PassEnds};
pub use conditions::{CONDITIONS, Conditions, ConditionsRow, Drift, Needs, Offset};
pub use corner::{Corner, Measure};
pub use description::{ChainDescription, CheckPoint, CornerDescription, OperatorDescription, PassDescription};
pub use gain::Series;
pub use kernel::impulse_response;
pub use quantity::Quantity;
pub use range::{CentreWidth, Orders, Range};
pub use reach::{Reach, Reaches, Scale};
pub use request::Request;
pub use resampling::{Resampling, ResamplingDescription, Start};
pub use shape::{SHAPES, Shape, ShapeRow};
pub use smoothing::{cut_off, strength_of};
pub use step::Step;
pub use table::STEPS;
pub use treatment::{Smoothing, Strength, Treatments};
pub use turn::factor as turn_factor;
pub use weighting::{WEIGHTINGS, Weighting};
