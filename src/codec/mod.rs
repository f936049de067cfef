//! Archives of records with an error that is guaranteed: the smallest of several codings, decoded and checked before it is
//! kept.
//!
//! A channel is coded in blocks that stand alone. Each is tried as steps from what its past foretells (on a converter's or a
//! decimal grid, or free), as cosine coefficients of its segments, and as these with a lattice of remainders; all go
//! through one adaptive range coder in integers. The bound holds for the samples as a reader gets them, after they are
//! brought to numbers that the output can hold. The bytes are defined in `docs/container.md`.
//!
//! Coded integers and the output of predicted blocks are the same bits everywhere. Cosine blocks come out within 1e-9 of
//! the bound of one another on different machines, and the encoder leaves that much room.
//!
//! Sources: Ahmed, Natarajan and Rao 1974 (discrete cosine transform); Fischer 1991 and ITU-T H.266 section 7.4 (trellis and
//! dependent quantisation; from memory); Martin 1979 (range coding); Willems, Shtarkov and Tjalkens 1995 (mixing of models;
//! from memory); Shannon 1959 (rate and distortion).

mod block;
mod bytes;
mod cast;
mod coder;
mod container;
mod cosine;
mod fidelity;
mod goal;
mod predictor;
mod request;
mod search;
mod stepwise;
mod stream;

pub use block::{Coded, MODES, MOST_SAMPLES, Mode};
pub use cast::Cast;
pub use container::{
    Archive, ArchivedAxis, ArchivedChannel, ArchivedLayout, Entry, Gaps, Header, Lost, MAGIC, Origin, Rule, Writer,
    is_archive,
};
pub use fidelity::Fidelity;
pub use goal::{Effort, Limit};
pub use request::{Request, Size};
pub use stream::{Made, encode};

/// What is asked of an archive, as the settings hold it.
#[derive(Debug, Clone, Default, PartialEq)]
pub struct Wanted {
    /// The bound; must be given.
    pub request: Option<Request>,
    /// How long to look.
    pub effort: Effort,
    /// True to leave out layout, notes and provenance.
    pub bare: bool,
}
