//! The stretches between gaps, each a record of its own on the grid of the whole.

use std::ops::Range;

use crate::audit::stamps::StampReading;
use crate::error::{Error, Finding, Result};
use crate::place::Place;
use crate::record::Axis;

use super::regular::{Regular, Segment};
use super::table::Table;
use super::{Regrid, fill, regrid};

/// Samples below which a stretch between two gaps is left out: no corner leaves anything of it untouched by its ends.
pub const SHORTEST: usize = 16;

/// Splits a table at missing rows, and at rows without a value in any of its channels. `axis` is that of the whole.
///
/// # Errors
/// `Unsupported` when no stretch is long enough.
pub fn split(
    mut table: Table,
    reading: Option<&StampReading>,
    axis: &Axis,
    how: Option<Regrid>,
    findings: &[Finding],
) -> Result<Vec<Regular>> {
    let stretches = stretches(&table, reading);
    let file = Place::file(&table.raw.source.path);
    let lost = table.len() - stretches.iter().map(Range::len).sum::<usize>();
    let (long, short): (Vec<_>, Vec<_>) = stretches.into_iter().partition(|stretch| stretch.len() >= SHORTEST);
    let mut common = findings.to_vec();
    if lost > 0 {
        let text = format!("{lost} rows without a value in some channel are left out");
        common.push(Finding::new("rows_left_out", text).at(file.clone()));
    }
    common.extend(short.iter().map(|stretch| {
        let text = format!("a stretch of {} samples between gaps is left out as too short", stretch.len());
        Finding::new("short_stretch", text).at(table.place(stretch.start))
    }));
    if long.is_empty() {
        let what = format!("no stretch between gaps holds {SHORTEST} samples");
        return Err(Error::unsupported(what).at(file));
    }
    let indices = indices(reading, &long);
    let mut parts = Vec::with_capacity(long.len());
    // From the end on, so that each part takes its rows along and leaves the rest where it was.
    for (stretch, index) in long.into_iter().zip(indices).rev() {
        table.cut(0, stretch.end);
        let mut part = table.split_off(stretch.start);
        part.raw.findings = Vec::new();
        let axis = axis.cut(index as usize, stretch.len());
        let first_row = part.rows.row(0);
        let mut remarks = common.clone();
        let mut regular = match reading.map(|reading| reading.stretch(stretch.start, stretch.end)) {
            Some(own) if regrid::wanted(&part, &own, how) => {
                let axis = axis.with_start(super::axis::start_of(&part, &own));
                regrid::regrid(part, &own, axis, how, &mut remarks)?
            }
            _ => {
                let rows = part.rows.clone();
                Regular::untouched(fill::build(part, axis)?, rows)
            }
        };
        regular.record = regular.record.with_findings(remarks);
        regular.first_row = first_row;
        parts.push(regular);
    }
    parts.reverse();
    Ok(parts)
}

/// Numbers the parts of a file, with a remark on each where there are several.
pub fn number(parts: Vec<Regular>, place_of: impl Fn(usize) -> Place) -> Vec<Regular> {
    let count = parts.len();
    if count == 1 {
        return parts;
    }
    let numbered = |(index, mut part): (usize, Regular)| {
        part.segment = Some(Segment { number: index + 1, count });
        let text = format!("part {} of {count} between gaps: {} samples", index + 1, part.record.len());
        let place = part.first_row.map(&place_of).unwrap_or_default();
        part.record = part.record.with_findings([Finding::new("segment", text).at(place)]);
        part
    };
    parts.into_iter().enumerate().map(numbered).collect()
}

/// Runs of rows that hold a value in every channel, none missing between them.
fn stretches(table: &Table, reading: Option<&StampReading>) -> Vec<Range<usize>> {
    let mut gaps = reading.map_or(&[][..], |reading| &reading.gaps).iter().peekable();
    let mut found: Vec<Range<usize>> = Vec::new();
    for row in 0..table.len() {
        let after_gap = gaps.next_if(|gap| gap.row <= row).is_some();
        if table.raw.channels.iter().any(|channel| !channel.values[row].is_finite()) {
            continue;
        }
        match found.last_mut() {
            Some(last) if last.end == row && !after_gap => last.end = row + 1,
            _ => found.push(row..row + 1),
        }
    }
    found
}

/// Index on the whole grid of the first row of each stretch.
fn indices(reading: Option<&StampReading>, stretches: &[Range<usize>]) -> Vec<u64> {
    let before = |row: usize| -> u64 {
        let gaps = reading.map_or(&[][..], |reading| &reading.gaps);
        gaps[..gaps.partition_point(|gap| gap.row <= row)].iter().map(|gap| gap.missing).sum()
    };
    stretches.iter().map(|stretch| stretch.start as u64 + before(stretch.start)).collect()
}
