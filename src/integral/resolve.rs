//! End conditions related to one channel: displacements in its unit, stretches on its axis, the offset as a number.

use crate::error::{Error, Result};
use crate::numeric::sum;
use crate::operator::{Chain, Conditions, Drift, Offset, Quantity};
use crate::place::Place;
use crate::record::{Axis, Channel};
use crate::unit::Unit;

use super::constants::Solver;

/// End conditions ready to be solved.
#[derive(Debug, Clone, PartialEq)]
pub struct Resolved {
    /// What is solved.
    pub solver: Solver,
    /// Offset of the sensor, in the record's unit; 0 where none is given.
    pub offset: f64,
    /// Samples that the offset is the mean of; `None` where it is given or not taken off.
    pub offset_samples: Option<usize>,
}

/// Relates the end conditions of `chain` to `channel`. `factor` takes numbers in steps to the unit of the output, `unit`.
///
/// # Errors
/// `Usage` for quantities in a unit that does not fit, conditions on the second integral of a single one, stretches off
/// the record, and an offset beside conditions that solve it.
pub fn resolve(channel: Channel<'_>, chain: &Chain, unit: &Unit, factor: f64) -> Result<Resolved> {
    let conditions = chain.conditions();
    let option = format!("--conditions {conditions}");
    let row = conditions.row();
    if row.twice && chain.turns() == -1 {
        return Err(Error::usage(format!("{option} tells of the second integral, and there is one"))
            .remedy("use --integrate 2, or --conditions rest, start-rest, steady or still"));
    }
    let displacement = |value: &Quantity| {
        value.in_unit(unit).map(|value| value / factor).ok_or_else(|| {
            Error::usage(format!("{option}: {} gives \"{unit}\"", channel.unit))
                .at(Place::channel(channel.name))
                .remedy(format!("give the displacement of --conditions {} in {}", row.name, shown(unit)))
        })
    };
    let solver = match conditions {
        Conditions::StartRest => Solver::StartRest,
        Conditions::Rest => Solver::Rest,
        Conditions::RestTo(value) => Solver::RestTo(displacement(value)?),
        Conditions::StartRestTo(value) => Solver::StartRestTo(displacement(value)?),
        Conditions::Pinned(value) => Solver::Pinned(value.as_ref().map_or(Ok(0.0), displacement)?),
        Conditions::ZeroMean => Solver::ZeroMean,
        Conditions::Steady(drift) => Solver::Steady { drift: *drift == Drift::Solved },
        Conditions::Still(stretches) => {
            let len = channel.samples.len() as f64;
            let share = |stretch: &[Quantity; 2]| {
                let [from, to] = indices(stretch, channel.axis, "--conditions still")?;
                Ok([(from + 0.5) / len, (to + 0.5) / len])
            };
            Solver::Still(stretches.iter().map(share).collect::<Result<_>>()?)
        }
    };
    let Some(offset) = chain.offset() else { return Ok(Resolved { solver, offset: 0.0, offset_samples: None }) };
    if !conditions.takes_offset() {
        return Err(Error::usage(format!("--offset {offset}: {option} finds the offset itself or leaves it"))
            .remedy("leave --offset out, or use --conditions start-rest or pinned"));
    }
    match offset {
        Offset::Value(value) => {
            let offset = value.in_unit(channel.unit).ok_or_else(|| {
                Error::usage(format!("--offset {value}: the record is in \"{}\"", channel.unit))
                    .at(Place::channel(channel.name))
                    .remedy(format!("give --offset in {}", shown(channel.unit)))
            })?;
            Ok(Resolved { solver, offset, offset_samples: None })
        }
        Offset::Stretch(stretch) => {
            let [from, to] = indices(stretch, channel.axis, "--offset")?;
            // Rounding of a bound by a hundredth of a step does not matter.
            let first = (from - 0.01).ceil().max(0.0) as usize;
            let end = ((to + 0.01).floor().max(-1.0) + 1.0).min(channel.samples.len() as f64) as usize;
            if first + 2 > end {
                return Err(Error::usage(format!("--offset {offset}: fewer than two samples"))
                    .remedy("name a stretch inside the record, from its first stamp to its last"));
            }
            let offset = sum::mean(&channel.samples[first..end]);
            Ok(Resolved { solver, offset, offset_samples: Some(end - first) })
        }
    }
}

/// Both bounds of a stretch in samples from the first one.
fn indices(stretch: &[Quantity; 2], axis: &Axis, option: &str) -> Result<[f64; 2]> {
    let index = |bound: &Quantity| {
        bound.in_unit(axis.unit()).map(|stamp| (stamp - axis.start()) / axis.step()).ok_or_else(|| {
            Error::usage(format!("{option}: {bound} is no place on an axis in {}", axis.unit()))
                .remedy(format!("give {option} in {}", axis.unit()))
        })
    };
    let [from, to] = [index(&stretch[0])?, index(&stretch[1])?];
    if from >= to {
        return Err(Error::usage(format!("{option}: {}..{} does not run upwards", stretch[0], stretch[1]))
            .remedy("write the earlier bound first"));
    }
    Ok([from, to])
}

fn shown(unit: &Unit) -> String {
    if unit.is_unknown() { "the unit that --unit gives the channel".to_owned() } else { unit.to_string() }
}
