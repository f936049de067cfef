//! One channel as a page tells of it, whichever command it comes from.

use crate::record::{Axis, Channel};
use crate::report::page::thinned;
use crate::report::{Picture, TrustedReport, VerdictReport};

/// A channel's verdict and what was used.
#[derive(Debug, Clone)]
pub struct Content<'a> {
    /// Name of the channel.
    pub name: &'a str,
    /// Unit of the output.
    pub unit: String,
    /// The extension in use.
    pub used: &'a str,
    /// Who chose it.
    pub why: &'static str,
    /// Both in a sentence.
    pub used_sentence: String,
    /// The verdict.
    pub verdict: Option<&'a VerdictReport>,
    /// What is trusted.
    pub trusted: Option<TrustedReport>,
}

/// Densities before and after, and the gain between them.
#[derive(Debug, Clone)]
pub struct Spectra {
    /// `Hz` or `1/m`.
    pub frequency_unit: &'static str,
    /// Units of the densities before and after.
    pub units: [String; 2],
    /// Of the record.
    pub before: Vec<[f64; 2]>,
    /// Of the output.
    pub after: Vec<[f64; 2]>,
    /// Gain of the operators as applied.
    pub gain: Vec<[f64; 2]>,
}

/// An integral with its uncertainty.
#[derive(Debug, Clone)]
pub struct Stack {
    /// The record less offset and drift, whose integral the result is.
    pub corrected: Vec<[f64; 2]>,
    /// Place, and the result less and plus two standard deviations.
    pub band: Vec<[f64; 3]>,
}

impl Stack {
    /// Of an integral on the record's own grid.
    pub fn of(axis: &Axis, corrected: &[f64], result: &[f64], deviations: &[f64]) -> Stack {
        let every = result.len().div_ceil(KEPT / 2).max(1);
        let limits = |n: usize| {
            Some([axis.stamp(n), result.get(n)? - 2.0 * deviations.get(n)?, result[n] + 2.0 * deviations[n]])
        };
        Stack {
            corrected: thinned(corrected, axis.start(), axis.step(), KEPT),
            band: (0..result.len()).step_by(every).chain(result.len().checked_sub(1)).filter_map(limits).collect(),
        }
    }
}

/// Points kept of a line over the whole record: a page thins further where it shows several channels.
const KEPT: usize = 1000;

/// What a page draws of one conditioned channel.
#[derive(Debug, Clone)]
pub struct Passage {
    /// The channel's name.
    pub name: String,
    /// Continuations and outputs near the ends, where they were judged.
    pub picture: Option<Picture>,
    /// The record.
    pub before: Vec<[f64; 2]>,
    /// The output.
    pub after: Vec<[f64; 2]>,
    /// What was taken away; where input and output are of one unit and stand on one axis.
    pub removed: Option<Vec<[f64; 2]>>,
    /// What the operators did at every frequency; `None` for records too short for a density.
    pub spectra: Option<Spectra>,
    /// The integral with its uncertainty, where there is one.
    pub integral: Option<Stack>,
}

impl Passage {
    /// From a channel and its output on `axis`.
    pub fn of(
        channel: Channel<'_>,
        output: &[f64],
        axis: &Axis,
        same_unit: bool,
        picture: Option<Picture>,
        spectra: Option<Spectra>,
    ) -> Passage {
        let thin = |values: &[f64], axis: &Axis| thinned(values, axis.start(), axis.step(), KEPT);
        let alike = same_unit && axis == channel.axis && output.len() == channel.samples.len();
        let removed = alike.then(|| {
            let difference: Vec<f64> =
                channel.samples.iter().zip(output).map(|(before, after)| before - after).collect();
            thin(&difference, axis)
        });
        Passage {
            name: channel.name.to_owned(),
            picture,
            before: thin(channel.samples, channel.axis),
            after: thin(output, axis),
            removed,
            spectra,
            integral: None,
        }
    }
}
