//! A record: channels of uniform, finite samples over one axis, and what was read before it became one.

mod axis;
mod lines;
mod raw;
mod source;

use ndarray::{Array2, ArrayView1};

use crate::error::{Error, Finding, Result};
use crate::place::Place;
use crate::unit::Unit;

pub use axis::{Axis, RateSource, Spacing};
pub use lines::RowLines;
pub use raw::{RawChannel, RawRecord, Stamps, StatedRate};
pub use source::{ColumnRole, Encoding, Format, Layout, SampleType, Source, TableLayout, TextSource, WaveLayout};

/// Channels over one axis. Every sample is finite, every channel has the axis' length, and there is at least one of each.
#[derive(Debug, Clone)]
pub struct Record {
    axis: Axis,
    names: Vec<String>,
    units: Vec<Unit>,
    /// Channels x samples.
    samples: Array2<f64>,
    findings: Vec<Finding>,
    /// Samples that were missing and are held by straight lines, channel by channel; empty without any.
    missing: Vec<Vec<usize>>,
}

/// One channel of a record, borrowed.
#[derive(Debug, Clone, Copy)]
pub struct Channel<'a> {
    /// Name, as the file spells it.
    pub name: &'a str,
    /// Unit of the samples.
    pub unit: &'a Unit,
    /// The axis all channels share.
    pub axis: &'a Axis,
    /// The samples, in `unit`.
    pub samples: &'a [f64],
}

impl Record {
    /// A record from `samples` (channels x samples).
    ///
    /// # Errors
    /// `Unsupported` when there is no channel or no sample; `Malformed` at the first sample that is not finite; `Usage`
    /// when names, units and rows do not match in number or the axis has another length.
    pub fn new(axis: Axis, names: Vec<String>, units: Vec<Unit>, samples: Array2<f64>) -> Result<Record> {
        let (channels, len) = samples.dim();
        if channels == 0 || len == 0 {
            return Err(Error::unsupported("the record holds no samples"));
        }
        if names.len() != channels || units.len() != channels || axis.len() != len {
            return Err(Error::usage("names, units, axis and samples differ in number"));
        }
        // Copies only what is not contiguous already: a record may fill half the memory.
        let samples = if samples.is_standard_layout() { samples } else { samples.as_standard_layout().into_owned() };
        for (name, row) in names.iter().zip(samples.rows()) {
            if let Some(n) = row.iter().position(|v| !v.is_finite()) {
                let place = Place { sample: Some(n as u64), ..Place::channel(name) };
                return Err(Error::malformed(format!("not a finite number: {}", row[n])).at(place));
            }
        }
        Ok(Record { axis, names, units, samples, findings: Vec::new(), missing: Vec::new() })
    }

    /// Remarks that travel with the record.
    pub fn findings(&self) -> &[Finding] {
        &self.findings
    }

    /// Adds remarks.
    #[must_use]
    pub fn with_findings(mut self, findings: impl IntoIterator<Item = Finding>) -> Record {
        self.findings.extend(findings);
        self
    }

    /// Lists, channel by channel, samples that were missing: straight lines hold their places until they are smoothed.
    #[must_use]
    pub fn with_missing(mut self, missing: Vec<Vec<usize>>) -> Record {
        self.missing = missing;
        self
    }

    /// Samples of channel `index` that were missing and wait to be smoothed, ascending.
    pub fn missing(&self, index: usize) -> &[usize] {
        self.missing.get(index).map_or(&[], Vec::as_slice)
    }

    /// The common axis.
    pub fn axis(&self) -> &Axis {
        &self.axis
    }

    /// Number of samples a channel, at least 1.
    #[expect(clippy::len_without_is_empty, reason = "a record is never empty")]
    pub fn len(&self) -> usize {
        self.samples.ncols()
    }

    /// Number of channels, at least 1.
    pub fn channel_count(&self) -> usize {
        self.samples.nrows()
    }

    /// Channel `index`, from 0.
    ///
    /// # Panics
    /// When `index` is not below `channel_count`.
    pub fn channel(&self, index: usize) -> Channel<'_> {
        let row: ArrayView1<'_, f64> = self.samples.row(index);
        let Some(samples) = row.to_slice() else { unreachable!("rows are contiguous since construction") };
        Channel { name: &self.names[index], unit: &self.units[index], axis: &self.axis, samples }
    }

    /// All channels in file order.
    pub fn channels(&self) -> impl Iterator<Item = Channel<'_>> {
        (0..self.channel_count()).map(|index| self.channel(index))
    }

    /// The samples, channels x samples.
    pub fn samples(&self) -> &Array2<f64> {
        &self.samples
    }

    /// Takes the record apart: axis, names, units, samples, findings.
    pub fn into_parts(self) -> (Axis, Vec<String>, Vec<Unit>, Array2<f64>, Vec<Finding>) {
        (self.axis, self.names, self.units, self.samples, self.findings)
    }
}
