//! What is taken off before a density is formed: offset or trend, of the whole record or of every segment.

use std::fmt;
use std::str::FromStr;

use crate::baseline::{Baseline, BaselineKind, Scale};
use crate::ends::Ends;
use crate::error::{Error, Result};
use crate::place::escape;

/// What is taken off.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Default)]
pub enum Detrend {
    /// Nothing.
    None,
    /// The record's mean.
    #[default]
    Mean,
    /// The least-squares polynomial of that degree, 1 to 3, through the whole record.
    Trend(u8),
    /// The mean of every segment.
    SegmentMean,
    /// The least-squares line through every segment.
    SegmentLine,
}

/// Spellings and what they stand for.
const WORDS: &[(&str, Detrend)] = &[
    ("none", Detrend::None),
    ("mean", Detrend::Mean),
    ("line", Detrend::Trend(1)),
    ("quadratic", Detrend::Trend(2)),
    ("cubic", Detrend::Trend(3)),
    ("segment-mean", Detrend::SegmentMean),
    ("segment-line", Detrend::SegmentLine),
];

impl Detrend {
    /// The record as the estimate sees it.
    ///
    /// # Errors
    /// None for a record of at least one sample.
    pub fn of_record(self, samples: &[f64]) -> Result<Vec<f64>> {
        let mut rest = samples.to_vec();
        match self {
            Detrend::Mean => take_off(&mut rest, BaselineKind::Mean)?,
            Detrend::Trend(degree) => take_off(&mut rest, BaselineKind::Trend(degree))?,
            Detrend::None | Detrend::SegmentMean | Detrend::SegmentLine => {}
        }
        Ok(rest)
    }

    /// Takes off of one segment what belongs to it.
    ///
    /// # Errors
    /// None for a segment of at least one sample.
    pub fn of_segment(self, segment: &mut [f64]) -> Result<()> {
        match self {
            Detrend::SegmentMean => take_off(segment, BaselineKind::Mean),
            Detrend::SegmentLine => take_off(segment, BaselineKind::Trend(1)),
            Detrend::None | Detrend::Mean | Detrend::Trend(_) => Ok(()),
        }
    }

    /// In words: `mean taken off`.
    pub fn sentence(self) -> &'static str {
        match self {
            Detrend::None => "nothing taken off",
            Detrend::Mean => "mean taken off",
            Detrend::Trend(1) => "least-squares line taken off",
            Detrend::Trend(2) => "least-squares quadratic taken off",
            Detrend::Trend(_) => "least-squares cubic taken off",
            Detrend::SegmentMean => "mean of every segment taken off",
            Detrend::SegmentLine => "least-squares line of every segment taken off",
        }
    }
}

fn take_off(samples: &mut [f64], kind: BaselineKind) -> Result<()> {
    let ends = Ends::EVEN;
    let baseline = Baseline::fit(kind, samples, ends, Scale::assumed(samples.len()))?;
    let first = ends.first_position();
    for (n, value) in samples.iter_mut().enumerate() {
        *value -= baseline.polynomial().at(n as f64 + first);
    }
    Ok(())
}

impl FromStr for Detrend {
    type Err = Error;

    fn from_str(text: &str) -> Result<Self> {
        WORDS.iter().find(|(word, _)| *word == text).map(|(_, detrend)| *detrend).ok_or_else(|| {
            let known: Vec<&str> = WORDS.iter().map(|(word, _)| *word).collect();
            Error::usage(format!("not a trend: \"{}\"", escape(text)))
                .remedy(format!("use one of {}", known.join(", ")))
        })
    }
}

impl fmt::Display for Detrend {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        let word = WORDS.iter().find(|(_, detrend)| detrend == self).map_or("line", |(word, _)| *word);
        f.write_str(word)
    }
}
