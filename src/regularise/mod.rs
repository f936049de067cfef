//! From a record as read to one of uniform, finite samples: what is right is taken, what is doubtful is refused by place.

mod axis;
mod band;
mod choice;
mod cut;
mod fill;
mod regrid;
mod regular;
mod rows;
mod split;
mod table;

use crate::audit::fault::{self, Fault};
use crate::audit::sparse::Sparse;
use crate::error::{Error, Finding, Kind, Result};
use crate::place::Place;
use crate::record::{RawRecord, Spacing};

pub use choice::{Duplicates, Gaps, Regrid};
pub use cut::Bound;
pub use fill::fill_gaps;
pub use regular::{Regular, Segment};
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

/// A uniform record, which rows of the file its samples came from, and what was mended. Channels recorded at a lower rate
/// are left out with a remark, unless the record holds nothing else.
///
/// # Errors
/// `Malformed` with the line for a stamp that goes back, a repeated row, missing rows or values; `Unsupported` where the
/// stamps fit no even grid or nothing tells the rate, where a gap is too long to fill, where the record falls into several
/// parts, or where nothing lies between `from` and `to`; `Usage` for bounds of another dimension than the axis. Every one
/// names the option that would settle it.
pub fn regularise(raw: RawRecord, options: &RegulariseOptions) -> Result<Regular> {
    let file = Place::file(&raw.source.path);
    let mut parts = regularise_parts(raw, options)?;
    match (parts.pop(), parts.len()) {
        (Some(only), 0) => Ok(only),
        (_, others) => Err(Error::unsupported(format!("gaps split the record into {} parts", others + 1))
            .at(file)
            .remedy("here it must be one: cut with --from and --to, or fill with --gaps fill")),
    }
}

/// The parts of a record between its gaps with `Gaps::Split`, the whole record as one part otherwise.
///
/// # Errors
/// As `regularise`.
pub fn regularise_parts(raw: RawRecord, options: &RegulariseOptions) -> Result<Vec<Regular>> {
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
    let said = |mut part: Regular| {
        part.record = part.record.with_findings(remarks.iter().cloned());
        part
    };
    Ok(settle(first, options)?.into_iter().map(said).collect())
}

/// The channels that share one rate, and what became of them.
pub struct RateGroup {
    /// Names of the channels, in file order.
    pub channels: Vec<String>,
    /// The parts of their record, or why there is none.
    pub parts: Result<Vec<Regular>>,
}

/// One group for each rate in the file: the full rows first, then the channels recorded at lower rates.
pub fn regularise_each(raw: RawRecord, options: &RegulariseOptions) -> Vec<RateGroup> {
    let one = |group: Table| RateGroup {
        channels: group.raw.channels.iter().map(|channel| channel.name.clone()).collect(),
        parts: settle(group, options),
    };
    table::by_rate(raw).into_iter().map(one).collect()
}

fn settle(mut table: Table, options: &RegulariseOptions) -> Result<Vec<Regular>> {
    table.check()?;
    table.gaps = options.gaps;
    let mut findings = std::mem::take(&mut table.raw.findings);
    cut::cut(&mut table, options)?;
    if options.gaps != Gaps::Split {
        return settle_rows(table, options, findings);
    }
    // Places in the file, which the parts take from the rows they came from.
    let (rows, columns) = (table.rows.clone(), table.columns.clone());
    let outline = Table { raw: table.raw.outline(), rows, columns, gaps: table.gaps };
    let mut parts = Vec::new();
    while let Some(slip) = table.read_stamps().and_then(|reading| reading.slip).filter(|_| !given(&table)) {
        let text = "the clock jumps by a part of a step near here: split";
        findings.push(Finding::new("slipped", text).at(table.place(slip)));
        let rest = table.split_off(slip);
        parts.extend(settle_rows(std::mem::replace(&mut table, rest), options, findings.clone())?);
    }
    parts.extend(settle_rows(table, options, findings)?);
    Ok(split::number(parts, |row| outline.file_place(row)))
}

/// The record or the parts of rows on one clock.
fn settle_rows(mut table: Table, options: &RegulariseOptions, mut findings: Vec<Finding>) -> Result<Vec<Regular>> {
    let mut reading = table.read_stamps();
    if options.duplicates == Duplicates::Drop
        && let Some(repeats) = reading.as_ref().filter(|r| r.spacing == Spacing::Repeated)
    {
        findings.push(table.drop_repeats(&repeats.repeated.clone())?);
        reading = table.read_stamps();
    }
    if let (Some(stamps), Some(reading)) = (&table.raw.stamps, &reading) {
        if let Some(fault) = fault::stamp_fault(stamps, reading, &|row| table.place(row))
            && !is_settled(&fault, options, given(&table))
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
    if options.gaps == Gaps::Split {
        return split::split(table, reading.as_ref(), &axis, options.regrid, &findings);
    }
    let mut regular = match &reading {
        Some(reading) if regrid::wanted(&table, reading, options.regrid) => {
            regrid::regrid(table, reading, axis, options.regrid, &mut findings)?
        }
        Some(reading) if reading.missing > 0 => fill::expand(table, reading, axis, &mut findings)?,
        _ => fill::complete(table, axis, &mut findings)?,
    };
    regular.record = regular.record.with_findings(findings);
    Ok(vec![regular])
}

/// True when the user vouches for a rate.
fn given(table: &Table) -> bool {
    table.raw.stated_rate.as_ref().is_some_and(|rate| rate.given)
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
