//! What is done to a record in the frequency domain: filters, derivatives, integrals, and how far they reach.
//!
//! An operator is a real gain per frequency, a whole number of quarter turns (derivative +1, integral -1), its exact
//! action on polynomials, and its reach. Real gains commute, so their order in a request does not matter. Adding an
//! operator is one file and one row of `STEPS`.

mod band;
mod chain;
mod corner;
mod description;
mod edge;
mod gain;
mod kernel;
mod notch;
mod range;
mod reach;
mod request;
mod shape;
mod step;
mod turn;

pub use chain::{Chain, Pass, PassEnds};
pub use corner::{Corner, Measure};
pub use description::{ChainDescription, CheckPoint, CornerDescription, OperatorDescription, PassDescription};
pub use gain::Series;
pub use kernel::impulse_response;
pub use range::{CentreWidth, Range};
pub use reach::{Reach, Reaches, Scale};
pub use request::Request;
pub use shape::{SHAPES, Shape, ShapeRow};
pub use step::Step;
pub use turn::factor as turn_factor;

/// All operators, in the order of help texts.
pub static STEPS: &[Step] = &[
    Step {
        key: "lowpass",
        value: "CORNER",
        example: "40Hz",
        help: "keep what is slower than a corner",
        read: band::lowpass,
    },
    Step {
        key: "highpass",
        value: "CORNER",
        example: "0.5Hz",
        help: "keep what is faster than a corner; last in the order of a run",
        read: band::highpass,
    },
    Step {
        key: "bandpass",
        value: "A..B",
        example: "2Hz..40Hz",
        help: "keep what lies between two corners: a low-pass times a high-pass",
        read: band::bandpass,
    },
    Step {
        key: "bandstop",
        value: "A..B",
        example: "45Hz..55Hz",
        help: "remove what lies between two corners: one minus the band-pass",
        read: band::bandstop,
    },
    Step {
        key: "notch",
        value: "CENTRE:WIDTH",
        example: "50Hz:2Hz",
        help: "remove one line, with the full width at half gain",
        read: notch::notch,
    },
    Step {
        key: "integrate",
        value: "1|2",
        example: "2",
        help: "integrate once (acceleration to velocity) or twice (to displacement)",
        read: turn::integrate,
    },
    Step {
        key: "differentiate",
        value: "1|2",
        example: "1",
        help: "differentiate once or twice",
        read: turn::differentiate,
    },
];
