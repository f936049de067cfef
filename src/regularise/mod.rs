//! From a record as read to one of uniform, finite samples: what is right is taken, what is doubtful is refused by place.

mod axis;
mod band;
mod choice;
mod cut;
mod fill;
mod regrid;
mod rows;
mod table;

use crate::audit::fault::{self, Fault};
use crate::audit::sparse::Sparse;
use crate::error::{Error, Finding, Kind, Result};
use crate::place::Place;
use crate::record::{RawRecord, Record, Spacing};

pub use choice::{Duplicates, Gaps, Regrid};
pub use cut::Bound;
pub use fill::fill_gaps;
pub use rows::RowMap;

use table::Table;

/// What may be done to a record that is not uniform and complete.
#[derive(Debug, Clone, Default, PartialEq)]
pub struct RegulariseOptions {
    /// First stamp to keep; `None` for the record's own start.
    pub from: Option<Bound>,
    /// Last stamp to keep; `None` for the record's own end.
    pub to: Option<Bound>,
    /// Missing rows and values.
    pub gaps: Gaps,
    /// Rows that repeat the stamp of the row before.
    pub duplicates: Duplicates,
    /// Uneven stamps; `None` regrids those that jitter or drift and takes nearly even ones as even.
    pub regrid: Option<Regrid>,
}

/// A uniform record, and which rows of the file its samples came from. Channels recorded at a lower rate are left out
/// with a remark, unless the record holds nothing else.
///
/// # Errors
/// `Malformed` with the line for a stamp that goes back, a repeated row, missing rows or values; `Unsupported` where the
/// stamps fit no even grid or nothing tells the rate, where a gap is too long to fill, or where nothing lies between
/// `from` and `to`; `Usage` for bounds of another dimension than the axis. Every one names the option that would settle
/// it.
pub fn regularise(raw: RawRecord, options: &RegulariseOptions) -> Result<(Record, RowMap)> {
    let mut groups = table::by_rate(raw);
    if groups.is_empty() {
        return Err(Error::unsupported("the record holds no channels"));
    }
    let first = groups.remove(0);
    let mut remarks = Vec::new();
    for other in &groups {
        for channel in &other.raw.channels {
            let text = "recorded at a lower rate than the others: left out; choose it by --channel to work on it alone";
            let place = Place::channel(&channel.name).within(&Place::file(&other.raw.source.path));
            remarks.push(Finding::new("sparse_channel", text).at(place));
        }
    }
    let (record, rows) = settle(first, options)?;
    Ok((record.with_findings(remarks), rows))
}

/// One uniform record for each rate in the file: the full rows first, then the channels recorded at lower rates.
///
/// # Errors
/// As `regularise`, for the first group that fails.
pub fn regularise_each(raw: RawRecord, options: &RegulariseOptions) -> Result<Vec<(Record, RowMap)>> {
    table::by_rate(raw).into_iter().map(|group| settle(group, options)).collect()
}

fn settle(mut table: Table, options: &RegulariseOptions) -> Result<(Record, RowMap)> {
    table.check()?;
    table.gaps = options.gaps;
    let mut findings = std::mem::take(&mut table.raw.findings);
    cut::cut(&mut table, options)?;
    let mut reading = table.read_stamps();
    if options.duplicates == Duplicates::Drop
        && let Some(repeats) = reading.as_ref().filter(|r| r.spacing == Spacing::Repeated)
    {
        findings.push(table.drop_repeats(&repeats.repeated.clone())?);
        reading = table.read_stamps();
    }
    if let (Some(stamps), Some(reading)) = (&table.raw.stamps, &reading) {
        let given = table.raw.stated_rate.as_ref().is_some_and(|rate| rate.given);
        if let Some(fault) = fault::stamp_fault(stamps, reading, &|row| table.place(row))
            && !is_settled(&fault, options, given)
        {
            return Err(fault.error);
        }
        findings.extend(fault::stamp_remarks(reading, &|row| table.place(row)));
    }
    if options.gaps == Gaps::Reject {
        table.refuse_missing()?;
    }
    let (axis, remarks) = axis::decide(&table, reading.as_ref())?;
    findings.extend(remarks);
    let (record, rows) = match &reading {
        Some(reading) if regrid::wanted(&table, reading, options.regrid) => {
            regrid::regrid(table, reading, axis, &mut findings)?
        }
        Some(reading) if reading.missing > 0 => fill::expand(table, reading, axis, &mut findings)?,
        _ => fill::complete(table, axis, &mut findings)?,
    };
    Ok((record.with_findings(findings), rows))
}

/// A fault that an option has settled: gaps that are to be filled, or doubts about the rate that a given one removes.
fn is_settled(fault: &Fault, options: &RegulariseOptions, given: bool) -> bool {
    match fault.code {
        "gap" => options.gaps != Gaps::Reject,
        "slipped" | "irregular" | "unresolved" => given && fault.error.kind() == Kind::Unsupported,
        _ => false,
    }
}

/// The channels of a record that share one pattern of rows.
type Pattern = Option<Sparse>;
