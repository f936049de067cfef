//! Decides the axis: stamps, a given rate, or the header's, and what is to be said when they disagree.

use crate::audit::fault::figure;
use crate::audit::stamps::StampReading;
use crate::error::{Error, Finding, Result};
use crate::numeric::rational::Rational;
use crate::place::Place;
use crate::record::{Axis, RateSource, Spacing, StatedRate};
use crate::unit::Unit;

use super::table::Table;

/// The axis of the rows that are there, and remarks about rates that disagree. Its length is the number of rows plus
/// those missing between them.
///
/// # Errors
/// `Unsupported` when neither stamps nor a stated rate tell the step.
pub fn decide(table: &Table, reading: Option<&StampReading>) -> Result<(Axis, Vec<Finding>)> {
    let file = Place::file(&table.raw.source.path);
    let stated = table.raw.stated_rate.as_ref().filter(|rate| rate.rate_base > 0.0 && rate.rate_base.is_finite());
    let len = table.len() + reading.map_or(0, |r| r.missing as usize);
    let measured = reading.and_then(|reading| Some((reading, reading.step?)));
    let unknown = || {
        Error::unsupported("nothing tells the sampling rate").at(file.clone()).remedy("give --rate, or --time-column")
    };
    let axis = match (measured, stated) {
        (Some((reading, step)), None) => from_stamps(table, reading, step, len)?,
        (Some((reading, step)), Some(rate)) if !rate.given => {
            let axis = from_stamps(table, reading, step, len)?;
            let remark = disagreement(rate, reading, step).map(|text| {
                let text =
                    format!("{} states {}, {text}; the stamps are used", rate.origin, with_unit(rate, rate.rate_base));
                Finding::new("stated_rate_differs", text).at(file.clone())
            });
            return Ok((axis, remark.into_iter().collect()));
        }
        (measured, Some(rate)) => {
            let source = if rate.given { RateSource::Given } else { RateSource::Header };
            let axis = from_rate(table, reading, rate, source, len)?;
            let remark = measured.and_then(|(reading, step)| {
                let text = disagreement(rate, reading, step)?;
                let text = format!(
                    "{} sets {}, {text}; {} is used",
                    rate.origin,
                    with_unit(rate, rate.rate_base),
                    rate.origin
                );
                Some(Finding::new("rate_overrides_stamps", text).at(file.clone()))
            });
            return Ok((axis, remark.into_iter().collect()));
        }
        (None, None) => return Err(unknown()),
    };
    Ok((axis, Vec::new()))
}

fn from_stamps(table: &Table, reading: &StampReading, step: f64, len: usize) -> Result<Axis> {
    let mut axis = Axis::new(reading.unit.clone(), start_of(table, reading), step, len, RateSource::Stamps)?;
    if let Some(rate) = reading.rate {
        axis = axis.with_rate(rate);
    }
    if let Some(interval) = reading.interval {
        axis = axis.with_interval(interval);
    }
    Ok(dated(axis.with_spacing(reading.spacing), table))
}

fn from_rate(
    table: &Table,
    reading: Option<&StampReading>,
    rate: &StatedRate,
    source: RateSource,
    len: usize,
) -> Result<Axis> {
    let base = if rate.unit.is_length() { "m" } else { "s" };
    let (unit, start) = match reading {
        Some(reading) if reading.unit.is_time() == (base == "s") => (reading.unit.clone(), start_of(table, reading)),
        _ => (Unit::parse(base), 0.0),
    };
    let scale = unit.meaning().map_or(1.0, |m| m.scale);
    let first_sample = match table.rows.row(0) {
        // A cut of a record without stamps keeps the distance from its first row.
        Some(row) if reading.is_none() => row as f64 / row_rate(table, rate),
        _ => 0.0,
    };
    let mut axis = Axis::new(unit, start + first_sample / scale, 1.0 / (rate.rate_base * scale), len, source)?;
    if let Some(plain) = Rational::exactly(rate.rate_base) {
        axis = axis.with_rate(plain);
    }
    if let Some(reading) = reading {
        axis = axis.with_spacing(reading.spacing);
        // An interval that the rate contradicts belongs to the remark, not to the axis.
        if let Some([low, high]) = reading.interval
            && (low..=high).contains(&axis.step())
        {
            axis = axis.with_interval([low, high]);
        }
    }
    Ok(dated(axis, table))
}

/// Rows of the file per second or metre: a channel at a lower rate takes only every k-th.
fn row_rate(table: &Table, rate: &StatedRate) -> f64 {
    match table.rows {
        super::RowMap::Even { every, .. } => rate.rate_base * every as f64,
        _ => rate.rate_base,
    }
}

/// The first stamp; civil stamps count from the first row of the file, whose date the axis carries.
pub fn start_of(table: &Table, reading: &StampReading) -> f64 {
    match &table.raw.stamps {
        Some(stamps) if stamps.civil.is_some() => stamps.ticks.first().map_or(0.0, |&t| t as f64 * stamps.tick),
        Some(stamps) => stamps.first + stamps.ticks.first().map_or(0.0, |&t| t as f64 * stamps.tick),
        None => reading.first,
    }
}

fn dated(axis: Axis, table: &Table) -> Axis {
    match table.raw.stamps.as_ref().and_then(|stamps| stamps.civil.as_ref()) {
        Some(civil) => axis.with_epoch(civil.clone()),
        None => axis,
    }
}

/// In words, how the stamps contradict a stated rate; `None` when they do not.
fn disagreement(rate: &StatedRate, reading: &StampReading, step: f64) -> Option<String> {
    let scale = reading.unit.meaning().map_or(1.0, |m| m.scale);
    if reading.unit.is_time() != rate.unit.is_time() {
        return Some(format!("the stamps are in {}", reading.unit));
    }
    let per = |step: f64| 1.0 / (step * scale);
    let [low, high] = match reading.interval {
        Some([shortest, longest]) => [per(longest), per(shortest)],
        // Without a hard interval a tenth of a percent counts as agreement.
        None => [per(step) * 0.999, per(step) * 1.001],
    };
    // A step of a single coarse difference may have no upper bound.
    let high = if high > 0.0 { high } else { f64::INFINITY };
    let slack = 1e-9 * rate.rate_base;
    if (low - slack..=high + slack).contains(&rate.rate_base) && reading.spacing != Spacing::Irregular {
        return None;
    }
    Some(format!("the stamps show {} ({} to {})", with_unit(rate, per(step)), figure(low), figure(high)))
}

fn with_unit(rate: &StatedRate, value: f64) -> String {
    format!("{} {}", figure(value), if rate.unit.is_length() { "per m" } else { "Hz" })
}
