//! Waviness and roughness of a profile: both parts of a split, which add up to it digit by digit.

use crate::audit::level::Level;
use crate::error::{Error, Result};
use crate::job::integral::Column;
use crate::operator::{Chain, Request};
use crate::record::{Axis, Channel};
use crate::report::SplitReport;
use crate::settings::Settings;

/// Both parts of one channel.
pub struct Parts {
    /// What was split: the record, after the filters beside the split.
    pub primary: Vec<f64>,
    pub columns: Vec<Column>,
    pub report: SplitReport,
}

/// Digits of the parts, counted from the largest value: the last of them is some thirty roundings of a double.
const DIGITS: f64 = 14.0;

/// True where a split is asked for.
pub fn is_wanted(settings: &Settings) -> bool {
    split(settings).is_some()
}

/// The corner of the split as written, where one is asked for.
pub fn corner(settings: &Settings) -> Option<&str> {
    split(settings).map(Request::value)
}

/// The chain without the split, where one is asked for: what is split.
///
/// # Errors
/// `Usage` for a split beside operators that are no filters; as `Chain::resolve`.
pub fn primary(chain: &Chain, settings: &Settings, axis: &Axis, len: usize) -> Result<Option<Chain>> {
    if split(settings).is_none() {
        return Ok(None);
    }
    if chain.treatments().resampling.is_some() || chain.treatments().smoothing.is_some() || !chain.is_real() {
        return Err(Error::usage(
            "--split goes with filters alone, not with smoothing, resampling or a sensor's response",
        )
        .remedy("run it on their result"));
    }
    let others: Vec<Request> =
        settings.requests.iter().filter(|request| request.step().key != "split").cloned().collect();
    Chain::resolve(&others, &settings.shape, axis, len).map(|(chain, _)| Some(chain))
}

/// Parts `primary` into `low` and the rest. The low part is rounded to decimals on which sums of doubles are exact to the
/// last digit shown: as written, the parts then add up to a record of no more decimals exactly.
pub fn of(channel: Channel<'_>, corner: &str, mut primary: Vec<f64>, low: Vec<f64>, settings: &Settings) -> Parts {
    let peak = primary.iter().chain(&low).map(|v| v.abs()).fold(0.0, f64::max);
    let places = settings.decimals.map_or_else(|| default_places(peak), i32::from);
    let scale = 10f64.powi(places);
    let rounded = |value: f64| {
        let lattice = (value * scale).round() / scale;
        if lattice.is_finite() { lattice } else { value }
    };
    if settings.decimals.is_some() {
        primary.iter_mut().for_each(|v| *v = rounded(*v));
    }
    let waviness: Vec<f64> = low.into_iter().map(rounded).collect();
    let rest = |(&whole, &part): (&f64, &f64)| {
        let rest = whole - part;
        if rounded(whole) == whole { rounded(rest) } else { rest }
    };
    let roughness: Vec<f64> = primary.iter().zip(&waviness).map(rest).collect();
    let report = SplitReport {
        corner: corner.to_owned(),
        waviness: Level::of(&waviness),
        roughness: Level::of(&roughness),
        decimals: places,
    };
    let unit = if channel.unit.is_unknown() { String::new() } else { format!(" [{}]", channel.unit.label()) };
    let column = |what: &str, values| Column { name: format!("{} {what}{unit}", channel.name), values };
    Parts { columns: vec![column("waviness", waviness), column("roughness", roughness)], primary, report }
}

fn split(settings: &Settings) -> Option<&Request> {
    settings.requests.iter().find(|request| request.step().key == "split")
}

/// Decimals that leave `DIGITS` digits of the peak; powers of ten above 10^22 are no longer exact doubles.
fn default_places(peak: f64) -> i32 {
    if peak > 0.0 && peak.is_finite() { (DIGITS - peak.log10().ceil()).clamp(0.0, 22.0) as i32 } else { 0 }
}
