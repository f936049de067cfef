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
}

impl Passage {
    /// From a channel and its output on `axis`.
    pub fn of(channel: Channel<'_>, output: &[f64], axis: &Axis, same_unit: bool, picture: Option<Picture>) -> Passage {
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
        }
    }
}
