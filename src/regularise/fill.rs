//! Fills missing rows and values where the content allows it, and builds the record.

use ndarray::Array2;

use crate::audit::fault::figure;
use crate::audit::stamps::StampReading;
use crate::error::{Error, Finding, Result};
use crate::numeric::autoregressive_gap::{burg_of_segments, interpolate};
use crate::numeric::noise;
use crate::numeric::spline::cubic_spline;
use crate::numeric::sum::{mean, standard_deviation};
use crate::place::Place;
use crate::record::{Axis, Record};
use crate::unit::counted;

use super::band::edge_frequency;
use super::table::Table;
use super::{Gaps, RowMap};

/// Largest gap, in cycles of the band edge, that a cubic crosses (error 3e-4 of the RMS without noise).
const CUBIC_CYCLES: f64 = 0.1;
/// Largest gap, in cycles of the band edge, that the autoregressive model crosses; beyond it every filling is a guess.
const MODEL_CYCLES: f64 = 1.0;
/// Noise, as a part of the standard deviation, above which a cubic carries it into the gap.
const CUBIC_NOISE: f64 = 0.03;
/// Samples on each side of a gap that the cubic spline passes through.
const CUBIC_REACH: usize = 24;
/// Highest order of the model.
const ORDER: usize = 32;

/// The record of a table whose rows are all there.
pub fn complete(mut table: Table, axis: Axis, findings: &mut Vec<Finding>) -> Result<(Record, RowMap)> {
    fill_table(&mut table, findings)?;
    let rows = table.rows.clone();
    Ok((build(table, axis)?, rows))
}

/// The record of a table with rows missing: they are put in, then filled.
pub fn expand(
    mut table: Table,
    reading: &StampReading,
    axis: Axis,
    findings: &mut Vec<Finding>,
) -> Result<(Record, RowMap)> {
    let len = axis.len();
    if reading.missing > table.len() as u64 {
        let what = format!("{} of {} rows are missing", reading.missing, len);
        let remedy = "--from and --to cut out a stretch that is there";
        return Err(Error::unsupported(what).at(Place::file(&table.raw.source.path)).remedy(remedy));
    }
    let mut rows = vec![None; len];
    for channel in &mut table.raw.channels {
        let mut values = vec![f64::NAN; len];
        for (row, index) in reading.indices().enumerate() {
            if let (Some(slot), Some(&value)) = (values.get_mut(index as usize), channel.values.get(row)) {
                *slot = value;
            }
        }
        channel.values = values;
    }
    for (row, index) in reading.indices().enumerate() {
        if let Some(slot) = rows.get_mut(index as usize) {
            *slot = table.rows.row(row);
        }
    }
    table.rows = RowMap::Listed(rows);
    complete(table, axis, findings)
}

/// Fills the values that are not finite, as `--gaps fill` does, and tells how. In an error stands the first sample of the
/// gap that cannot be filled.
///
/// # Errors
/// `Unsupported` for a gap at an end, too long for the content, or with too few samples around it.
pub fn fill_gaps(values: Vec<f64>) -> std::result::Result<(Vec<f64>, &'static str), (usize, Error)> {
    match fill(values) {
        Ok(filled) => {
            let how = filled.how();
            Ok((filled.values, how))
        }
        Err(Unfillable { sample, what }) => Err((sample, Error::unsupported(what))),
    }
}

/// Fills all missing values of all channels.
pub fn fill_table(table: &mut Table, findings: &mut Vec<Finding>) -> Result<()> {
    if table.gaps == Gaps::Smooth {
        return hold(table);
    }
    for index in 0..table.raw.channels.len() {
        let values = std::mem::take(&mut table.raw.channels[index].values);
        let filled = fill(values).map_err(|Unfillable { sample, what }| {
            let place = match table.rows.row(sample) {
                Some(_) => table.value_place(index, sample),
                // A row that was never there: the row before it is where to look.
                None => Place { sample: Some(sample as u64), ..table.value_place(index, sample.saturating_sub(1)) },
            };
            Error::unsupported(what).at(place).remedy("--from and --to cut beside it")
        })?;
        let how = filled.how();
        let channel = &mut table.raw.channels[index];
        channel.values = filled.values;
        if filled.count > 0 {
            let share = filled.count as f64 / channel.values.len() as f64;
            let mut text =
                format!("{} filled in {} ({how})", counted(filled.count, "sample"), counted(filled.gaps, "gap"));
            if share > 0.05 {
                text += &format!(": {} % of the record is interpolated", figure((share * 1000.0).round() / 10.0));
            }
            let place = Place::channel(&channel.name).within(&Place::file(&table.raw.source.path));
            findings.push(Finding::new(if share > 0.05 { "much_filled" } else { "filled" }, text).at(place));
        }
    }
    Ok(())
}

/// Lists the missing values of all channels and lets straight lines hold their places.
fn hold(table: &mut Table) -> Result<()> {
    for index in 0..table.raw.channels.len() {
        let channel = &mut table.raw.channels[index];
        channel.missing = (0..channel.values.len()).filter(|&n| !channel.values[n].is_finite()).collect();
        if channel.missing.len() == channel.values.len() {
            let place = table.value_place(index, 0);
            return Err(Error::unsupported("no value is there to smooth").at(place).remedy("leave the channel out"));
        }
        bridge(&mut channel.values);
    }
    Ok(())
}

/// Joins what is finite by straight lines, and holds the first and last value outwards.
pub fn bridge(values: &mut [f64]) {
    let mut before: Option<usize> = None;
    for n in 0..values.len() {
        if !values[n].is_finite() {
            continue;
        }
        let (from, start) = before.map_or((0, values[n]), |at| (at + 1, values[at]));
        let steps = (n + 1 - from) as f64;
        for k in from..n {
            let share = if before.is_some() { (k + 1 - from) as f64 / steps } else { 1.0 };
            values[k] = start + share * (values[n] - start);
        }
        before = Some(n);
    }
    if let Some(at) = before {
        let last = values[at];
        values[at + 1..].fill(last);
    }
}

/// The record of complete channels; each channel's own memory is given back as it is taken over.
pub fn build(table: Table, axis: Axis) -> Result<Record> {
    let file = Place::file(&table.raw.source.path);
    let (count, len) = (table.raw.channels.len(), axis.len());
    let (mut names, mut units) = (Vec::new(), Vec::new());
    let mut all = Vec::new();
    let mut missing = Vec::new();
    for channel in table.raw.channels {
        missing.push(if table.gaps == Gaps::Smooth { channel.missing } else { Vec::new() });
        names.push(channel.name);
        units.push(channel.unit);
        if count == 1 {
            all = channel.values;
        } else {
            all.reserve_exact((count * len).saturating_sub(all.len()));
            all.extend_from_slice(&channel.values);
        }
    }
    let samples = Array2::from_shape_vec((count, len), all)
        .map_err(|_| Error::malformed("the columns differ in length").at(file.clone()))?;
    let record = Record::new(axis, names, units, samples).map_err(|error| error.at(file))?;
    Ok(record.with_missing(missing))
}

/// A gap that cannot be filled, and why.
struct Unfillable {
    sample: usize,
    what: String,
}

/// A channel without gaps.
struct Filled {
    values: Vec<f64>,
    count: usize,
    gaps: usize,
    by_cubic: usize,
}

impl Filled {
    fn how(&self) -> &'static str {
        match (self.by_cubic, self.gaps - self.by_cubic) {
            (_, 0) => "cubic spline",
            (0, _) => "autoregressive model",
            _ => "cubic spline and autoregressive model",
        }
    }
}

fn fill(mut values: Vec<f64>) -> std::result::Result<Filled, Unfillable> {
    let gaps = gaps(&values);
    let count = gaps.iter().map(|(from, to)| to - from).sum();
    let mut filled = Filled { values: Vec::new(), count, gaps: gaps.len(), by_cubic: 0 };
    if gaps.is_empty() {
        filled.values = values;
        return Ok(filled);
    }
    if let Some(&(from, _)) = gaps.iter().find(|&&(from, to)| from == 0 || to == values.len()) {
        return Err(Unfillable { sample: from, what: "values are missing at an end of the record".to_owned() });
    }
    let edge = edge_frequency(&values);
    let known: Vec<f64> = values.iter().copied().filter(|v| v.is_finite()).collect();
    let noisy = noise::sigma(&known) > CUBIC_NOISE * standard_deviation(&known);
    let centre = mean(&known);
    drop(known);
    let mut unknown = Vec::new();
    let original = values.clone();
    for &(from, to) in &gaps {
        let cycles = (to - from) as f64 * edge;
        if cycles > MODEL_CYCLES {
            let what = format!(
                "{} missing samples span {} cycles of the content: too many to fill",
                to - from,
                figure(cycles)
            );
            return Err(Unfillable { sample: from, what });
        }
        if cycles <= CUBIC_CYCLES && !noisy {
            cross(&original, &mut values, from, to);
            filled.by_cubic += 1;
        } else {
            unknown.extend(from..to);
        }
    }
    if !unknown.is_empty() {
        for value in &mut values {
            *value -= centre;
        }
        let segments: Vec<&[f64]> = values.split(|v| !v.is_finite()).filter(|s| !s.is_empty()).collect();
        let longest = segments.iter().map(|s| s.len()).max().unwrap_or(0);
        let filter = burg_of_segments(&segments, ORDER.min(longest / 3));
        if !filter.is_some_and(|filter| interpolate(&mut values, &unknown, &filter)) {
            let what = "the samples around are too few to fill it from".to_owned();
            return Err(Unfillable { sample: unknown[0], what });
        }
        for value in &mut values {
            *value += centre;
        }
    }
    filled.values = values;
    Ok(filled)
}

/// Runs without a value, as (first, one past the last).
fn gaps(values: &[f64]) -> Vec<(usize, usize)> {
    let mut found: Vec<(usize, usize)> = Vec::new();
    for n in 0..values.len() {
        if values[n].is_finite() {
            continue;
        }
        match found.last_mut() {
            Some((_, to)) if *to == n => *to += 1,
            _ => found.push((n, n + 1)),
        }
    }
    found
}

/// Crosses one gap by the spline through the samples next to it.
fn cross(original: &[f64], values: &mut [f64], from: usize, to: usize) {
    let finite = |&n: &usize| original[n].is_finite();
    let mut places: Vec<usize> = (0..from).rev().filter(finite).take(CUBIC_REACH).collect();
    places.reverse();
    places.extend((to..original.len()).filter(finite).take(CUBIC_REACH));
    let x: Vec<f64> = places.iter().map(|&n| n as f64 - from as f64).collect();
    let y: Vec<f64> = places.iter().map(|&n| original[n]).collect();
    let crossed = cubic_spline(&x, &y, (0..to - from).map(|n| n as f64));
    values[from..to].copy_from_slice(&crossed);
}
