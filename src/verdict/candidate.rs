//! The extensions that are compared: seven symmetric ones to choose from, three more for reference, and the forecast.

use crate::baseline::{Baseline, BaselineKind, EndEstimates, Side};
use crate::ends::Ends;
use crate::numeric::polynomial::Polynomial;

/// A symmetric extension with the baseline that is split off first.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub struct Candidate {
    /// Short name, as reports print it.
    pub name: &'static str,
    /// What is assumed past the ends.
    pub ends: Ends,
    /// What is split off first.
    pub baseline: BaselineKind,
}

/// The candidates, simplest first: ties are listed in this order.
pub static CANDIDATES: [Candidate; 7] = [
    Candidate { name: "even", ends: Ends::EVEN, baseline: BaselineKind::None },
    Candidate { name: "periodic", ends: Ends::Periodic, baseline: BaselineKind::None },
    Candidate { name: "even-slope", ends: Ends::EVEN, baseline: BaselineKind::Slopes },
    Candidate { name: "odd-ends", ends: Ends::ODD, baseline: BaselineKind::Line },
    Candidate { name: "odd-mean", ends: Ends::ODD, baseline: BaselineKind::Mean },
    Candidate { name: "even-odd", ends: Ends::EVEN_ODD, baseline: BaselineKind::Level(Some(Side::Right)) },
    Candidate { name: "odd-even", ends: Ends::ODD_EVEN, baseline: BaselineKind::Level(Some(Side::Left)) },
];

/// Row of `CANDIDATES` that is even.
pub const EVEN: usize = 0;
/// Row of `CANDIDATES` that is periodic.
pub const PERIODIC: usize = 1;

/// Reflection through zero, the extension of a plain sine transform: for reference only.
pub static ODD_ZERO: Candidate = Candidate { name: "odd-zero", ends: Ends::ODD, baseline: BaselineKind::None };

/// What one output is asked for.
#[derive(Debug, Clone, Copy)]
pub enum Extension<'a> {
    /// A symmetric one.
    Symmetric(&'a Candidate),
    /// Given continuations, outwards from each end in samples; beyond them even.
    Continued {
        /// Past the left end.
        left: &'a [f64],
        /// Past the right end.
        right: &'a [f64],
    },
}

impl Candidate {
    /// The baseline polynomial from estimates that are already known, in steps from the left half-sample mirror.
    pub(super) fn polynomial(&self, found: &EndEstimates, mean: f64, length: f64) -> Polynomial {
        let constant = |value| Polynomial::zero(length).plus_constant(value);
        match self.baseline {
            BaselineKind::Line => Baseline::line(found.left.value, found.right.value, length),
            BaselineKind::Slopes | BaselineKind::Tangents => {
                Baseline::slopes(found.left.slope, found.right.slope, length)
            }
            BaselineKind::Level(side) => constant(found.at(side.unwrap_or(Side::Left)).level),
            BaselineKind::Mean => constant(mean),
            BaselineKind::None | BaselineKind::Trend(_) => Polynomial::zero(length),
        }
    }
}
