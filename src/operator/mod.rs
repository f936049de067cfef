//! What is done to a record in the frequency domain: filters, derivatives, integrals, and how far they reach.
//!
//! An operator is a real gain per frequency, a whole number of quarter turns (derivative +1, integral -1), its exact
//! action on polynomials, and its reach. Real gains commute, so their order in a request does not matter. Adding an
//! operator is one file and one row of `STEPS`.

mod band;
mod chain;
mod conditions;
mod corner;
mod description;
mod edge;
mod gain;
mod kernel;
mod notch;
mod quantity;
mod range;
mod reach;
mod request;
mod shape;
mod step;
mod table;
mod turn;

pub use chain::{Chain, Pass, PassEnds};
pub use conditions::{CONDITIONS, Conditions, ConditionsRow, Drift, Needs, Offset};
pub use corner::{Corner, Measure};
pub use description::{ChainDescription, CheckPoint, CornerDescription, OperatorDescription, PassDescription};
pub use gain::Series;
pub use kernel::impulse_response;
pub use quantity::Quantity;
pub use range::{CentreWidth, Range};
pub use reach::{Reach, Reaches, Scale};
pub use request::Request;
pub use shape::{SHAPES, Shape, ShapeRow};
pub use step::Step;
pub use table::STEPS;
pub use turn::factor as turn_factor;
