//! What can be measured about a record under an extension, as explanation and veto.
//!
//! None of these numbers chooses an extension: measured on records whose continuation is known, they choose no better
//! than always taking `even`. A leakage excess 3 dB above that of another candidate does rule an extension out.

pub mod decay;
pub mod exposure;
pub mod join;
pub mod jump;
pub mod leakage;
mod subject;

use crate::numeric::{noise, quantum};

pub use subject::Subject;

/// One measure, a row of `METRICS`.
pub struct Metric {
    /// Key in results.
    pub key: &'static str,
    /// One line for people.
    pub about: &'static str,
    /// Unit of the number.
    pub unit: Measure,
    /// The number; `None` where it does not exist.
    pub measure: fn(&Subject) -> Option<f64>,
}

/// What a measure is in.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Measure {
    /// The record's unit.
    Record,
    /// The record's unit per step.
    RecordPerStep,
    /// Decibels.
    Decibels,
    /// A bare number.
    Bare,
}

/// All measures, in the order of reports.
pub static METRICS: [Metric; 7] = [
    Metric { key: "value_jump", about: "largest jump of value at an end", unit: Measure::Record, measure: jump::value },
    Metric {
        key: "slope_jump",
        about: "largest jump of slope at an end",
        unit: Measure::RecordPerStep,
        measure: jump::slope,
    },
    Metric {
        key: "leakage_share_db",
        about: "energy far above the record's own frequencies, relative to its variance",
        unit: Measure::Decibels,
        measure: leakage::share_db,
    },
    Metric {
        key: "leakage_excess_db",
        about: "the same relative to what a window that hides the ends leaves",
        unit: Measure::Decibels,
        measure: leakage::excess_db,
    },
    Metric {
        key: "decay_exponent",
        about: "how fast the coefficients fall with frequency",
        unit: Measure::Bare,
        measure: decay::exponent,
    },
    Metric {
        key: "noise_sigma",
        about: "white noise from third differences",
        unit: Measure::Record,
        measure: |subject| Some(noise::sigma(subject.samples)),
    },
    Metric {
        key: "quantisation_step",
        about: "smallest gap between different values",
        unit: Measure::Record,
        measure: |subject| Some(quantum::step(subject.samples)),
    },
];

#[cfg(test)]
mod tests;
