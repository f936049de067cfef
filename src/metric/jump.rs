//! Jumps of value and slope that an extension makes at the record's ends.

use super::Subject;
use crate::ends::{Ends, Parity};

/// The larger jump of value at an end, in the record's unit. Even mirrors make none, odd mirrors twice the remainder's
/// end value, and a periodic join the difference of the end values.
pub fn value(subject: &Subject) -> Option<f64> {
    let length = subject.ends.length(subject.samples.len());
    let baseline = subject.baseline.polynomial();
    let left = subject.estimates.left.value - baseline.at(0.0);
    let right = subject.estimates.right.value - baseline.at(length);
    Some(match subject.ends {
        Ends::Periodic => (left - right).abs(),
        Ends::Mirror { left: a, right: b, .. } => doubled(a, Parity::Odd, left).max(doubled(b, Parity::Odd, right)),
    })
}

/// The larger jump of slope at an end, per step. Odd mirrors make none, even mirrors twice the remainder's end slope, and
/// a periodic join the difference of the end slopes.
pub fn slope(subject: &Subject) -> Option<f64> {
    let length = subject.ends.length(subject.samples.len());
    let rise = subject.baseline.polynomial().derivative();
    let left = subject.estimates.left.slope - rise.at(0.0);
    let right = subject.estimates.right.slope - rise.at(length);
    Some(match subject.ends {
        Ends::Periodic => (left - right).abs(),
        Ends::Mirror { left: a, right: b, .. } => doubled(a, Parity::Even, left).max(doubled(b, Parity::Even, right)),
    })
}

/// Twice the magnitude where the mirror has the parity that makes the jump.
fn doubled(parity: Parity, jumping: Parity, value: f64) -> f64 {
    if parity == jumping { 2.0 * value.abs() } else { 0.0 }
}
