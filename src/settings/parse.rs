//! From the text of an option to its value, and the defaults that results show.

use std::str::FromStr;

use crate::codec as archive;
use crate::ends::Seat;
use crate::error::{Error, Result};
use crate::numeric::leading_number;
use crate::operator::{Corner, Measure, Range, Request, STEPS, Shape};
use crate::place::escape;
use crate::read::Calibration;
use crate::record::{Format, StatedRate};
use crate::regularise::Bound;
use crate::settings::{Beside, Edges, Settings, spectral};
use crate::unit::Unit;
use crate::verdict::Adequacy;

/// Words of an option and what they stand for; the first is the default.
type Words<T> = &'static [(&'static str, T)];

const SEATS: Words<Seat> = &[("half-sample", Seat::Half), ("whole-sample", Seat::Whole)];
const REQUIRES: Words<Adequacy> = &[("within", Adequacy::Within), ("borderline", Adequacy::Borderline)];
const EDGES: Words<Edges> =
    &[("keep", Edges::Keep), ("mark", Edges::Mark), ("blank", Edges::Blank), ("trim", Edges::Trim)];
const BESIDES: Words<Beside> = &[("sigma", Beside::Sigma), ("corrected", Beside::Corrected)];
const EFFORTS: Words<archive::Effort> =
    &[("2", archive::Effort::Usual), ("1", archive::Effort::Quick), ("3", archive::Effort::Long)];
const FORMATS: Words<Format> = &[("csv", Format::Csv), ("wav", Format::Wav)];

/// The word for regridding where the stamps ask for it.
const REGRID_BY_ITSELF: &str = "auto";

/// Sets the value of a known key.
pub fn set(settings: &mut Settings, key: &str, text: &str) -> Result<()> {
    if STEPS.iter().any(|step| step.key == key) {
        settings.requests.push(Request::parse(key, text)?);
        // In the order of the table whatever the order given: a recipe keeps none, and products round by their order.
        settings.requests.sort_by_key(|request| STEPS.iter().position(|step| step.key == request.step().key));
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
        "memory" => settings.read.memory = Some(bytes(text)?),
        "allow-truncated" => settings.read.allow_truncated = switch(key, text)?,
        "from" => settings.regularise.from = Some(context(key, Bound::parse(text))?),
        "to" => settings.regularise.to = Some(context(key, Bound::parse(text))?),
        "gaps" => settings.regularise.gaps = context(key, text.parse())?,
        "duplicates" => settings.regularise.duplicates = context(key, text.parse())?,
        "regrid" if text == REGRID_BY_ITSELF => settings.regularise.regrid = None,
        "regrid" => settings.regularise.regrid = Some(context(key, text.parse())?),
        "strict" => settings.strict = switch(key, text)?,
        "max-error" => bound(settings, archive::Request::Max(context(key, text.parse())?))?,
        "rms-error" => bound(settings, archive::Request::Rms(context(key, text.parse())?))?,
        "lossless" if switch(key, text)? => bound(settings, archive::Request::Lossless)?,
        "lossless" => {}
        "keep" => bound(settings, archive::Request::Keep(named(key, text, "a number of coefficients")?))?,
        "corner" => bound(settings, archive::Request::Corner(context(key, Corner::parse(text))?))?,
        "effort" => settings.archive.effort = one_of(key, text, EFFORTS)?,
        "bare" => settings.archive.bare = switch(key, text)?,
        "extension" => settings.stage.extension = context(key, text.parse())?,
        "assert" => context(key, settings.assertion.add(text))?,
        "tolerance" => settings.tolerance = context(key, text.parse())?,
        "require" => settings.require = Some(one_of(key, text, REQUIRES)?),
        "edges" => settings.edges = one_of(key, text, EDGES)?,
        "baseline" => settings.stage.baseline = Some(context(key, text.parse())?),
        "seat" => settings.stage.seat = one_of(key, text, SEATS)?,
        "conditions" => settings.conditions = Some(context(key, text.parse())?),
        "offset" => settings.offset = Some(context(key, text.parse())?),
        "insist" => settings.insist = switch(key, text)?,
        "target-sigma" => settings.target_sigma = Some(context(key, text.parse())?),
        "beside" => settings.beside.push(one_of(key, text, BESIDES)?),
        "shape" => settings.shape = context(key, Shape::parse(text))?,
        "running-rms" => settings.running_rms = Some(running(text)?),
        "method" => settings.spectrum.method = context(key, text.parse())?,
        "segment" => settings.spectrum.segment = Some(context(key, text.parse())?),
        "window" => settings.spectrum.window = context(key, crate::spectrum::window(text))?,
        "overlap" => settings.spectrum.overlap = Some(context(key, spectral::share(text))?),
        "detrend" => settings.spectrum.detrend = context(key, text.parse())?,
        "confidence" => settings.spectrum.confidence = context(key, spectral::share(text))?,
        "band" => settings.spectrum.bands.push(context(key, Range::parse(text))?),
        "octaves" => settings.spectrum.octaves = context(key, spectral::fraction(text))?,
        "lines" => settings.spectrum.lines = named(key, text, "a number of lines")?,
        "road" => settings.spectrum.road = switch(key, text)?,
        "against" => settings.spectrum.against = Some(context(key, text.parse())?),
        "format" => settings.format = Some(one_of(key, text, FORMATS)?),
        "encoding" => settings.encoding = Some(text.to_owned()),
        "decimals" => settings.decimals = Some(decimals(text)?),
        other => return Err(Error::usage(format!("the setting {other:?} has no parser"))),
    }
    Ok(())
}

/// What an output of a format shows for the keys that the settings leave to it.
pub fn resolved(settings: &Settings, format: Format) -> Vec<(&'static str, String)> {
    let name = spelling(FORMATS, format).unwrap_or_default();
    let encoding = (format == Format::Wav && settings.encoding.is_none()).then(|| ("encoding", FLOAT32.to_owned()));
    [("format", name)].into_iter().chain(encoding).collect()
}

/// Sample type of WAV output unless told otherwise, as `write` names it.
const FLOAT32: &str = "float32";

/// The default that results show for a key that was not given; `None` where the record or the chain decides.
pub fn default_of(settings: &Settings, key: &str) -> Option<String> {
    match key {
        "gaps" => Some(settings.regularise.gaps.to_string()),
        "duplicates" => Some(settings.regularise.duplicates.to_string()),
        "regrid" => Some(REGRID_BY_ITSELF.to_owned()),
        "extension" => Some(settings.stage.extension.to_string()),
        "method" => Some(settings.spectrum.method.to_string()),
        "window" => Some(settings.spectrum.window.name.to_owned()),
        "detrend" => Some(settings.spectrum.detrend.to_string()),
        "confidence" => Some(format!("{}%", 100.0 * settings.spectrum.confidence)),
        "octaves" => Some("none".to_owned()),
        "lines" => Some(settings.spectrum.lines.to_string()),
        "tolerance" => Some(settings.tolerance.to_string()),
        "target-sigma" => Some(settings.target_sigma.as_ref().map_or_else(|| "5%".to_owned(), ToString::to_string)),
        "edges" => spelling(EDGES, settings.edges),
        "seat" => spelling(SEATS, settings.stage.seat),
        "shape" => Some(settings.shape.to_string()),
        _ => None,
    }
}

/// One bound and no other.
fn bound(settings: &mut Settings, request: archive::Request) -> Result<()> {
    if settings.archive.request.is_some() {
        return Err(Error::usage("more than one bound on the error")
            .remedy("give one of --max-error, --rms-error, --lossless, --keep, --corner"));
    }
    settings.archive.request = Some(request);
    Ok(())
}

fn one_of<T: Copy>(key: &str, text: &str, words: Words<T>) -> Result<T> {
    words.iter().find(|(word, _)| *word == text).map(|(_, value)| *value).ok_or_else(|| {
        let known: Vec<&str> = words.iter().map(|(word, _)| *word).collect();
        Error::usage(format!("--{key}: \"{}\" is not known", escape(text)))
            .remedy(format!("use {}", known.join(" or ")))
    })
}

fn spelling<T: PartialEq>(words: Words<T>, value: T) -> Option<String> {
    words.iter().find(|(_, known)| *known == value).map(|(word, _)| (*word).to_owned())
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
        return Err(
            Error::usage(format!("--decimals: {count} is more than a double can show")).remedy("use at most 17")
        );
    }
    Ok(count)
}

/// Bytes from text such as `500MB` or `4GiB`.
///
/// # Errors
/// `Usage` for anything else.
pub fn bytes(text: &str) -> Result<u64> {
    const SIZES: [(&str, u64); 8] = [
        ("kB", 1_000),
        ("MB", 1_000_000),
        ("GB", 1_000_000_000),
        ("TB", 1_000_000_000_000),
        ("KiB", 1 << 10),
        ("MiB", 1 << 20),
        ("GiB", 1 << 30),
        ("TiB", 1 << 40),
    ];
    let size = SIZES.iter().find_map(|(unit, size)| Some((text.strip_suffix(unit)?.trim(), *size)));
    let bytes = size.and_then(|(count, size)| {
        let count = count.parse::<f64>().ok().filter(|count| count.is_finite() && *count > 0.0)?;
        Some((count * size as f64) as u64) // saturates
    });
    bytes.ok_or_else(|| {
        Error::usage(format!("--memory: not a size: \"{}\"", escape(text))).remedy("write it as 500MB or 4GiB")
    })
}

fn running(text: &str) -> Result<f64> {
    let fault = || {
        Error::usage(format!("--running-rms: no time: \"{}\"", escape(text)))
            .remedy("write it with its unit as 1s or 125ms")
    };
    match context("running-rms", Corner::parse(text)) {
        Ok(time) if time.measure() == Measure::Period => Ok(time.base()),
        _ => Err(fault()),
    }
}

fn axis_unit(key: &str, text: &str) -> Result<Unit> {
    let unit = Unit::parse(text);
    if unit.is_time() || unit.is_length() {
        return Ok(unit);
    }
    Err(Error::usage(format!("--{key}: not a unit of time or length: \"{}\"", escape(text)))
        .remedy("use s, ms, us, ns, m, mm or um"))
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
            Err(Error::usage(format!("--{key}: \"{}\" cannot be that", escape(text)))
                .remedy(format!("use one of {}", shown.join(" "))))
        }
    }
}

fn pair<'a>(key: &str, text: &'a str, form: &str) -> Result<(&'a str, &'a str)> {
    // The last '=': a channel name may hold one, a unit cannot.
    text.rsplit_once('=').filter(|(name, _)| !name.is_empty()).ok_or_else(|| {
        Error::usage(format!("--{key}: \"{}\" is not NAME=VALUE", escape(text))).remedy(format!("write {form}"))
    })
}

/// `ch1=98.1m/s2`: name, factor, unit of the result.
fn calibration(text: &str) -> Result<Calibration> {
    let (name, value) = pair("calibrate", text, "NAME=FACTOR[UNIT], such as ch1=98.1m/s2")?;
    let (factor, unit) = leading_number::split(value).ok_or_else(|| {
        Error::usage(format!("--calibrate: no factor, or more than one, in \"{}\"", escape(value)))
            .remedy("write NAME=FACTOR[UNIT], such as ch1=98.1m/s2")
    })?;
    Ok(Calibration { channel: name.to_owned(), factor, unit: (!unit.is_empty()).then(|| Unit::parse(unit)) })
}
