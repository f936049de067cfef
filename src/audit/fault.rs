//! What stamps and missing values say in words: faults that stop a run, and remarks that travel with it.

use crate::error::{Error, Finding};
use crate::place::Place;
use crate::record::{RawRecord, Spacing, Stamps};

use super::stamps::StampReading;

/// A fault with the short name that its finding carries.
pub struct Fault {
    /// Short stable name.
    pub code: &'static str,
    /// What is wrong, where, and what would settle it.
    pub error: Error,
}

impl Fault {
    /// The same as a remark.
    pub fn finding(&self) -> Finding {
        let advice = self.error.advice().map(|advice| format!("; {advice}")).unwrap_or_default();
        Finding::new(self.code, format!("{}{advice}", self.error.what())).at(self.error.place().clone())
    }
}

/// Where a row stands: its line, or its sample number where the record did not come from text.
pub fn row_place(raw: &RawRecord, row: usize) -> Place {
    let place = raw.row_place(row);
    if place.line.is_some() { place } else { Place { sample: Some(row as u64), ..place } }
}

/// A number of stamp units with the digits that the stamps have, without idle zeros.
pub fn decimal(value: f64, tick: f64) -> String {
    let digits = (-tick.log10()).ceil().clamp(0.0, 12.0) as usize;
    let text = format!("{value:.digits$}");
    if text.contains('.') { text.trim_end_matches('0').trim_end_matches('.').to_owned() } else { text }
}

/// A number with at most seven significant digits.
pub fn figure(value: f64) -> String {
    let digits = if value == 0.0 { 0 } else { (6 - value.abs().log10().floor() as i32).clamp(0, 12) as usize };
    let text = format!("{value:.digits$}");
    if text.contains('.') { text.trim_end_matches('0').trim_end_matches('.').to_owned() } else { text }
}

/// The first fault of the stamps that stops a run, if there is one. `place_of` tells where a row stands.
pub fn stamp_fault(stamps: &Stamps, reading: &StampReading, place_of: &dyn Fn(usize) -> Place) -> Option<Fault> {
    let stamp = |row: usize| decimal(stamps.first + stamps.ticks[row] as f64 * stamps.tick, stamps.tick);
    let fault = |code, row: Option<usize>, error: Error, remedy: String| {
        let place = row.map_or_else(|| whole(place_of), place_of);
        Some(Fault { code, error: error.at(place).remedy(remedy) })
    };
    let as_it_stands = "--time-column none with --rate takes the rows as they stand";
    match reading.spacing {
        Spacing::Backwards => {
            let row = reading.backwards?;
            let what = format!("{} after {}", stamp(row), stamp(row.checked_sub(1)?));
            fault("time_goes_back", Some(row), Error::malformed(what), as_it_stands.to_owned())
        }
        Spacing::Repeated => {
            let row = *reading.repeated.first()?;
            let before = place_of(row - 1).line.map_or(format!("row {}", row - 1), |line| format!("line {line}"));
            let more = match reading.repeated.len() {
                1 => String::new(),
                count => format!(", the first of {count} repeated stamps"),
            };
            let what = format!("repeats {before}{more}");
            fault(
                "repeated_stamp",
                Some(row),
                Error::malformed(what),
                "--duplicates drop leaves repeated rows out".to_owned(),
            )
        }
        Spacing::Slipped => {
            let row = reading.slip?;
            let what = "the clock jumps by a part of a step near here";
            let remedy = "--gaps split works on both sides of it, --from and --to cut beside it";
            fault("slipped", Some(row), Error::unsupported(what), remedy.to_owned())
        }
        Spacing::Irregular => {
            let what = match &reading.scatter {
                Some(s) => format!(
                    "the stamps fit no even grid: they scatter by {} of a step, at most {}",
                    figure(s.deviation_steps),
                    figure(s.largest_steps)
                ),
                None => "the stamps fit no even grid".to_owned(),
            };
            fault("irregular", None, Error::unsupported(what), as_it_stands.to_owned())
        }
        Spacing::Unresolved => {
            let what = format!(
                "the stamps are too coarse ({} {}) to tell the rate and whether rows are missing",
                figure(reading.resolution),
                reading.unit
            );
            fault("unresolved", None, Error::unsupported(what), "give --rate".to_owned())
        }
        Spacing::Uniform | Spacing::NearUniform | Spacing::Drifting | Spacing::Jittered | Spacing::Single => {
            let gap = reading.gaps.first()?;
            let samples = |count: u64| if count == 1 { "1 sample".to_owned() } else { format!("{count} samples") };
            let mut what =
                format!("gap of {} {} = {}", decimal(gap.width, stamps.tick), reading.unit, samples(gap.missing));
            if reading.gaps.len() > 1 {
                what += &format!(", the first of {} gaps, {} in all", reading.gaps.len(), samples(reading.missing));
            }
            let remedy = "--gaps fill interpolates, --gaps split works on the stretches between gaps, --from and --to cut beside it";
            fault("gap", Some(gap.row), Error::malformed(what), remedy.to_owned())
        }
    }
}

/// The file alone.
fn whole(place_of: &dyn Fn(usize) -> Place) -> Place {
    Place { file: place_of(0).file, ..Place::default() }
}

/// What is worth saying of stamps that do not stop a run.
pub fn stamp_remarks(reading: &StampReading, place_of: &dyn Fn(usize) -> Place) -> Vec<Finding> {
    let mut remarks = Vec::new();
    let mut say = |code, text: String, row: Option<usize>| {
        let place = row.map_or_else(|| whole(place_of), place_of);
        remarks.push(Finding::new(code, text).at(place));
    };
    let per_unit = if reading.unit.is_length() { "per m" } else { "Hz" };
    let scale = reading.unit.meaning().map_or(1.0, |m| m.scale);
    let rate =
        reading.rate.map_or_else(|| reading.step.map(|h| figure(1.0 / (h * scale))), |r| Some(figure(r.value())));
    let rate = rate.unwrap_or_else(|| "unknown".to_owned());
    if let Some(wrap) = reading.wraps.first() {
        let times = if reading.wraps.len() == 1 { "once".to_owned() } else { format!("{} times", reading.wraps.len()) };
        let code = if wrap.what == "midnight" { "unwrapped_midnight" } else { "unwrapped_clock" };
        say(
            code,
            format!("the clock starts over at {}, {times}; carried on by {} s", wrap.what, wrap.modulus_seconds),
            Some(wrap.row),
        );
    }
    if let Some(rows) = reading.rows_per_stamp {
        say("coarse_stamps", format!("{} rows per stamp, rate {rate} {per_unit}", figure(rows)), None);
    }
    if let Some(s) = reading.scatter {
        let sizes =
            format!("stamps scatter by {} of a step, at most {}", figure(s.deviation_steps), figure(s.largest_steps));
        match reading.spacing {
            Spacing::NearUniform => {
                say("near_uniform", format!("{sizes}: taken as even, rate {rate} {per_unit}"), None)
            }
            Spacing::Jittered => say("jittered", format!("{sizes}, rate {rate} {per_unit} on average"), None),
            Spacing::Drifting => say(
                "drifting",
                format!(
                    "the rate drifts by up to {} ppm, stamps stray up to {} steps from an even grid of {rate} {per_unit}",
                    figure(s.drift_ppm),
                    figure(s.drift_steps)
                ),
                None,
            ),
            _ => {}
        }
    }
    remarks
}
