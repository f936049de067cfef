//! From the text of an option to its value, and the defaults that results show.

use std::str::FromStr;

use crate::ends::Seat;
use crate::error::{Error, Result};
use crate::operator::{Request, STEPS, Shape};
use crate::place::escape;
use crate::read::Calibration;
use crate::record::{Format, StatedRate};
use crate::regularise::Bound;
use crate::settings::Settings;
use crate::unit::Unit;

/// Sets the value of a known key.
pub fn set(settings: &mut Settings, key: &str, text: &str) -> Result<()> {
    if STEPS.iter().any(|step| step.key == key) {
        settings.requests.push(Request::parse(key, text)?);
        return Ok(());
    }
    match key {
        "channel" => settings.read.channels.get_or_insert_default().push(text.to_owned()),
        "rate" => settings.read.rate = Some(StatedRate::parse(text)?),
        "time-column" => settings.read.time_column = Some(text.to_owned()),
        "time-unit" => settings.read.time_unit = Some(axis_unit(key, text)?),
        "delimiter" => settings.read.delimiter = Some(delimiter(text)?),
        "decimal" => settings.read.decimal = Some(mark(key, text, b".,")?),
        "thousands" => settings.read.thousands = Some(mark(key, text, b".,' ")?),
        "header-lines" => settings.read.header_lines = Some(named(key, text, "a number of lines")?),
        "missing" => settings.read.missing.push(text.to_owned()),
        "unit" => {
            let (name, unit) = pair(key, text, "NAME=UNIT, such as ax=g")?;
            settings.read.units.push((name.to_owned(), Unit::parse(unit)));
        }
        "calibrate" => settings.read.calibrate.push(calibration(text)?),
        "allow-truncated" => settings.read.allow_truncated = switch(key, text)?,
        "from" => settings.regularise.from = Some(context(key, Bound::parse(text))?),
        "to" => settings.regularise.to = Some(context(key, Bound::parse(text))?),
        "gaps" => settings.regularise.gaps = context(key, text.parse())?,
        "duplicates" => settings.regularise.duplicates = context(key, text.parse())?,
        "regrid" => settings.regularise.regrid = Some(context(key, text.parse())?),
        "strict" => settings.strict = switch(key, text)?,
        "extension" => settings.stage.extension = Some(context(key, text.parse())?),
        "baseline" => settings.stage.baseline = Some(context(key, text.parse())?),
        "seat" => settings.stage.seat = seat(text)?,
        "shape" => settings.shape = context(key, Shape::parse(text))?,
        "format" => settings.format = Some(format(text)?),
        "encoding" => settings.encoding = Some(text.to_owned()),
        "decimals" => settings.decimals = Some(decimals(text)?),
        other => return Err(Error::usage(format!("the setting {other:?} has no parser"))),
    }
    Ok(())
}

/// The default that results show for a key that was not given; `None` where the record or the chain decides.
pub fn default_of(settings: &Settings, key: &str) -> Option<String> {
    match key {
        "gaps" => Some(settings.regularise.gaps.to_string()),
        "duplicates" => Some(settings.regularise.duplicates.to_string()),
        "seat" => Some("half-sample".to_owned()),
        "shape" => Some(settings.shape.to_string()),
        _ => None,
    }
}

/// Names the option in an error.
fn context<T>(key: &str, value: Result<T>) -> Result<T> {
    value.map_err(|error| {
        let named = Error::new(error.kind(), format!("--{key}: {}", error.what()));
        match error.advice() {
            Some(advice) => named.remedy(advice),
            None => named,
        }
    })
}

fn named<T: FromStr>(key: &str, text: &str, wanted: &str) -> Result<T> {
    text.trim().parse().map_err(|_| Error::usage(format!("--{key}: not {wanted}: \"{}\"", escape(text))))
}

fn switch(key: &str, text: &str) -> Result<bool> {
    named(key, text, "true or false")
}

fn decimals(text: &str) -> Result<u8> {
    let count: u8 = named("decimals", text, "a number of decimals")?;
    if count > 17 {
        return Err(Error::usage(format!("--decimals: {count} is more than a double can show")).remedy("use at most 17"));
    }
    Ok(count)
}

fn seat(text: &str) -> Result<Seat> {
    match text {
        "half-sample" => Ok(Seat::Half),
        "whole-sample" => Ok(Seat::Whole),
        _ => Err(Error::usage(format!("--seat: not a seat: \"{}\"", escape(text))).remedy("use half-sample or whole-sample")),
    }
}

fn format(text: &str) -> Result<Format> {
    match text {
        "csv" => Ok(Format::Csv),
        "wav" => Ok(Format::Wav),
        _ => Err(Error::usage(format!("--format: not a format: \"{}\"", escape(text))).remedy("use csv or wav")),
    }
}

fn axis_unit(key: &str, text: &str) -> Result<Unit> {
    let unit = Unit::parse(text);
    if unit.is_time() || unit.is_length() {
        return Ok(unit);
    }
    Err(Error::usage(format!("--{key}: not a unit of time or length: \"{}\"", escape(text))).remedy("use s, ms, us, ns, m, mm or um"))
}

fn delimiter(text: &str) -> Result<u8> {
    match text {
        "tab" | "\t" | "\\t" => Ok(b'\t'),
        "blank" | "space" | " " => Ok(b' '),
        _ => mark("delimiter", text, b",;|"),
    }
}

fn mark(key: &str, text: &str, allowed: &[u8]) -> Result<u8> {
    match text.as_bytes() {
        [byte] if allowed.contains(byte) => Ok(*byte),
        _ => {
            let shown: Vec<String> = allowed.iter().map(|b| format!("'{}'", *b as char)).collect();
            Err(Error::usage(format!("--{key}: \"{}\" cannot be that", escape(text))).remedy(format!("use one of {}", shown.join(" "))))
        }
    }
}

fn pair<'a>(key: &str, text: &'a str, form: &str) -> Result<(&'a str, &'a str)> {
    // The last '=': a channel name may hold one, a unit cannot.
    text.rsplit_once('=')
        .filter(|(name, _)| !name.is_empty())
        .ok_or_else(|| Error::usage(format!("--{key}: \"{}\" is not NAME=VALUE", escape(text))).remedy(format!("write {form}")))
}

/// `ch1=98.1m/s2`: name, factor, unit of the result.
fn calibration(text: &str) -> Result<Calibration> {
    let (name, value) = pair("calibrate", text, "NAME=FACTOR[UNIT], such as ch1=98.1m/s2")?;
    // The longest prefix that is a number: the unit may start with e (as in `1e3`) only after a complete number.
    let split = (1..=value.len())
        .rev()
        .find(|&n| value.is_char_boundary(n) && value[..n].trim().parse::<f64>().is_ok_and(f64::is_finite))
        .ok_or_else(|| {
            Error::usage(format!("--calibrate: no factor in \"{}\"", escape(value))).remedy("write NAME=FACTOR[UNIT], such as ch1=98.1m/s2")
        })?;
    let factor = named("calibrate", &value[..split], "a factor")?;
    let unit = value[split..].trim();
    Ok(Calibration { channel: name.to_owned(), factor, unit: (!unit.is_empty()).then(|| Unit::parse(unit)) })
}
