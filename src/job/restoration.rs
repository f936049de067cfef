//! `restore`: an archive, a stretch of one, or what is left of a damaged one, back as a file.

use std::io::Read;
use std::path::Path;

use ndarray::Array2;

use crate::basis::Planner;
use crate::codec::{self, Archive, ArchivedAxis, ArchivedLayout, Cast, Rule};
use crate::error::{Error, Finding, Result};
use crate::job::conditioning;
use crate::numeric::rational::Rational;
use crate::place::Place;
use crate::read::Input;
use crate::record::{Axis, Format, RateSource, Record};
use crate::regularise::Bound;
use crate::report::{OutputReport, RestoreReport, SCHEMA, Tool};
use crate::settings::Settings;
use crate::unit::Unit;
use crate::write::{self, Content, Pending, RestoredTable, WaveEncoding};

/// Whether damage ends the run.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Damage {
    /// Any damaged byte is an error.
    Refuse,
    /// Undamaged blocks are restored; what is lost is named, and its rows stay blank.
    Recover,
}

/// Restores an archive into `output`, whose name (or `--format`) tells the format; that of the source otherwise. `--from` and
/// `--to` choose a stretch: only its blocks are decoded.
///
/// # Errors
/// `Malformed` with the byte of any damage; `Usage` for a stretch that does not fit the axis; `Unsupported` where the format
/// has no room for what is restored.
pub fn restore(input: Input, mut output: Pending<'_>, settings: &Settings, damage: Damage) -> Result<RestoreReport> {
    if settings.decimals.is_some() {
        return Err(Error::usage("--decimals would round restored samples past their bound")
            .remedy("leave it out: restored samples have the source's decimals"));
    }
    let (path, bytes) = bytes_of(input)?;
    let at_file = |error: Error| error.at(Place::file(&path));
    let archive = match damage {
        Damage::Refuse => Archive::open(&bytes)
            .map_err(|error| at_file(error.remedy("--recover restores the undamaged blocks of a damaged archive")))?,
        Damage::Recover => Archive::recover(&bytes).map_err(at_file)?,
    };
    let planner = Planner::new();
    let header = &archive.header;
    let ticks = match &header.axis {
        Some(ArchivedAxis { rule: Rule::Coded, .. }) => {
            Some(archive.samples(header.channels.len(), 0, header.rows, &planner).map_err(at_file)?)
        }
        _ => None,
    };
    let stamps = StampColumn { axis: header.axis.as_ref(), ticks: ticks.as_deref() };
    let (first, end) = stretch(settings, header.rows, &stamps).map_err(at_file)?;
    let mut samples = Vec::new();
    for stream in 0..header.channels.len() {
        samples.push(archive.samples(stream, first, end, &planner).map_err(at_file)?);
    }
    let mut notes = losses(&archive, &path);
    let format = settings.format.or_else(|| write::writer_by_name(Path::new(output.label())).ok().map(|w| w.format));
    let source = match header.layout {
        Some(ArchivedLayout::Wave { .. }) => Format::Wav,
        _ => Format::Csv,
    };
    // Without a layout of the source: stamps where it had some, then every channel.
    let stamped = header.axis.as_ref().is_some_and(|axis| matches!(axis.rule, Rule::Even(..) | Rule::Coded));
    let plain = ArchivedLayout::Table {
        delimiter: b',',
        decimal: b'.',
        newline: "\n".to_owned(),
        head: None,
        columns: (u64::from(!stamped)..=header.channels.len() as u64).collect(),
    };
    match (format.unwrap_or(source), header.layout.as_ref().unwrap_or(&plain)) {
        (Format::Csv, ArchivedLayout::Table { delimiter, decimal, newline, head, columns }) => {
            let table = RestoredTable {
                delimiter: *delimiter,
                decimal: *decimal,
                newline,
                head: head.as_deref(),
                columns,
                names: header.channels.iter().map(|c| (c.name.as_str(), c.unit.as_str())).collect(),
                decimals: header.channels.iter().map(|c| decimals_of(c.cast)).collect(),
                samples: &samples,
                stamps: &|row| stamps.text(first + row),
                stamps_name: stamps.name(),
            };
            table.write(&mut output)?;
        }
        (format, _) => {
            let record = record_of(&archive, samples, &stamps, first).map_err(at_file)?;
            let encoding = encoding_of(settings, header.layout.as_ref())?;
            let content = Content { encoding, ..Content::new(&record) };
            let writer = write::writer(format);
            notes.extend((writer.check)(&content)?);
            (writer.write)(&content, &mut output)?;
        }
    }
    let written = output.finish()?;
    Ok(RestoreReport {
        schema: SCHEMA,
        tool: Tool::THIS,
        command: "restore",
        settings: settings.to_map(),
        path,
        first,
        rows: end - first,
        notes,
        outputs: vec![OutputReport { path: written.path, sha256: written.sha256 }],
    })
}

/// The bytes of an archive, and its name.
pub(super) fn bytes_of(input: Input) -> Result<(String, Vec<u8>)> {
    let mut bytes = Vec::new();
    match input {
        Input::Path(path) => {
            let name = path.display().to_string();
            let bytes = std::fs::read(&path)
                .map_err(|error| Error::malformed(format!("cannot read it: {error}")).at(Place::file(&name)))?;
            Ok((name, bytes))
        }
        Input::Stream(mut stream) => {
            stream.read_to_end(&mut bytes)?;
            Ok(("-".to_owned(), bytes))
        }
    }
}

/// Stamps as the archive tells them.
struct StampColumn<'a> {
    axis: Option<&'a ArchivedAxis>,
    ticks: Option<&'a [f64]>,
}

impl StampColumn<'_> {
    fn name(&self) -> String {
        let Some(axis) = self.axis else { return String::new() };
        if axis.name.is_empty() { format!("t [{}]", axis.unit) } else { format!("{} [{}]", axis.name, axis.unit) }
    }

    /// Ticks of a row from the origin of the axis; `None` where they are lost or there are none.
    fn ticks(&self, row: u64) -> Option<i64> {
        let axis = self.axis?;
        let since = match self.ticks {
            Some(ticks) => ticks.get(row as usize).filter(|t| t.is_finite()).map(|t| *t as i64),
            None => axis.ticks(row),
        }?;
        axis.first.checked_add(since)
    }

    /// The stamp of a row in the axis unit, counted from the first row where the source told dates.
    fn stamp(&self, row: u64) -> Option<f64> {
        let axis = self.axis?;
        match axis.rule {
            Rule::Stated(p, q) => Some(row as f64 * q as f64 / p as f64),
            Rule::StatedDouble(rate) => Some(row as f64 / rate),
            Rule::Even(..) | Rule::Coded => {
                let origin = if axis.civil.is_some() { axis.first } else { 0 };
                Some((self.ticks(row)? - origin) as f64 * axis.tick)
            }
        }
    }

    /// The stamp as text: exact decimals where a tick is a power of ten.
    fn text(&self, row: u64) -> String {
        let (Some(axis), Some(ticks)) = (self.axis, self.ticks(row)) else { return String::new() };
        let decimals = -axis.tick.log10();
        let whole = decimals.round();
        if (decimals - whole).abs() < 1e-9 && (0.0..=18.0).contains(&whole) {
            let (power, digits) = (10_i128.pow(whole as u32), whole as usize);
            let (sign, size) = (if ticks < 0 { "-" } else { "" }, i128::from(ticks).abs());
            return match digits {
                0 => format!("{sign}{size}"),
                _ => format!("{sign}{}.{:0digits$}", size / power, size % power),
            };
        }
        format!("{}", ticks as f64 * axis.tick)
    }
}

/// First row and the row past the last that `--from` and `--to` choose.
fn stretch(settings: &Settings, rows: u64, stamps: &StampColumn<'_>) -> Result<(u64, u64)> {
    let (from, to) = (&settings.regularise.from, &settings.regularise.to);
    if from.is_none() && to.is_none() {
        return Ok((0, rows));
    }
    let Some(axis) = stamps.axis else {
        return Err(Error::usage("the archive has no axis to cut by").remedy("restore it whole"));
    };
    let unit = Unit::parse(&axis.unit);
    let base = match axis.rule {
        Rule::Stated(..) | Rule::StatedDouble(_) => Unit::parse(if unit.is_length() { "m" } else { "s" }),
        _ => unit,
    };
    let bound = |bound: &Option<Bound>| bound.as_ref().map(|bound| bound.in_unit(&base)).transpose();
    let (from, to) = (bound(from)?, bound(to)?);
    let slack = 1e-6 * axis.tick.min(stamps.stamp(1).zip(stamps.stamp(0)).map_or(1.0, |(b, a)| (b - a).abs()));
    let is_in = |row: u64| stamps.stamp(row).is_some_and(|s| from.is_none_or(|from| s >= from - slack));
    let first = first_where(rows, stamps.ticks.is_none(), is_in);
    let is_past = |row: u64| stamps.stamp(row).is_some_and(|s| to.is_some_and(|to| s > to + slack));
    let end = first_where(rows, stamps.ticks.is_none(), is_past);
    if first >= end {
        return Err(Error::unsupported("no row lies between --from and --to"));
    }
    Ok((first, end))
}

/// The first of `rows` rows that passes; by halving where rows that pass follow those that do not.
fn first_where(rows: u64, ascending: bool, passes: impl Fn(u64) -> bool) -> u64 {
    if !ascending {
        return (0..rows).find(|row| passes(*row)).unwrap_or(rows);
    }
    let (mut low, mut high) = (0, rows);
    while low < high {
        let middle = low + (high - low) / 2;
        if passes(middle) { high = middle } else { low = middle + 1 }
    }
    low
}

/// Decimals of a decimal grid.
fn decimals_of(cast: Cast) -> Option<u8> {
    let Cast::Grid { numerator: 1.0, denominator } = cast else { return None };
    let decimals = denominator.log10().round();
    ((0.0..=15.0).contains(&decimals) && 10_f64.powi(decimals as i32) == denominator).then_some(decimals as u8)
}

fn losses(archive: &Archive<'_>, path: &str) -> Vec<Finding> {
    let one = |lost: &codec::Lost| {
        let what = match lost.rows {
            Some((stream, first, rows)) => {
                let name = archive.header.channels.get(stream).map_or("the stamps", |c| c.name.as_str());
                format!("lost: rows {first}..{} of {name}: {}", first + (rows as u64).saturating_sub(1), lost.why)
            }
            None => format!("lost: {}", lost.why),
        };
        Finding::new("lost_block", what).at(Place::byte(lost.at as u64, None).within(&Place::file(path)))
    };
    archive.lost.iter().map(one).collect()
}

/// As a record, for formats that hold no gaps.
fn record_of(archive: &Archive<'_>, samples: Vec<Vec<f64>>, stamps: &StampColumn<'_>, first: u64) -> Result<Record> {
    let header = &archive.header;
    let rows = samples.first().map_or(0, Vec::len);
    for (channel, samples) in header.channels.iter().zip(&samples) {
        if let Some(n) = samples.iter().position(|v| v.is_nan()) {
            let place = Place { sample: Some(first + n as u64), ..Place::channel(&channel.name) };
            return Err(Error::unsupported("a row without a value, for which this format has no room")
                .at(place)
                .remedy("write text with --format csv"));
        }
    }
    let axis = match stamps.axis {
        Some(axis) => {
            let unit = Unit::parse(&axis.unit);
            match axis.rule {
                Rule::Even(p, q) => {
                    let (start, step) = (stamps.stamp(first).unwrap_or(0.0), axis.tick * p as f64 / q as f64);
                    Axis::new(unit, start, step, rows, RateSource::Stamps)?
                }
                Rule::Stated(p, q) => {
                    let base = Unit::parse(if unit.is_length() { "m" } else { "s" });
                    let axis = Axis::new(
                        base,
                        stamps.stamp(first).unwrap_or(0.0),
                        q as f64 / p as f64,
                        rows,
                        RateSource::Header,
                    )?;
                    match Rational::new(p, q) {
                        Some(rate) => axis.with_rate(rate),
                        None => axis,
                    }
                }
                Rule::StatedDouble(rate) => Axis::from_rate_hz(rate, rows, RateSource::Header)?,
                Rule::Coded => {
                    return Err(Error::unsupported("stamps that are not even, for which this format has no room")
                        .remedy("write text with --format csv"));
                }
            }
        }
        None => Axis::from_rate_hz(1.0, rows, RateSource::Given)?,
    };
    let names = header.channels.iter().map(|c| c.name.clone()).collect();
    let units = header.channels.iter().map(|c| Unit::parse(&c.unit)).collect();
    let count = samples.len();
    let flat: Vec<f64> = samples.into_iter().flatten().collect();
    let array =
        Array2::from_shape_vec((count, rows), flat).map_err(|_| Error::malformed("channels of unequal length"))?;
    Record::new(axis, names, units, array)
}

/// The sample type of a WAV output: as asked, else that of the source.
fn encoding_of(settings: &Settings, layout: Option<&ArchivedLayout>) -> Result<WaveEncoding> {
    if settings.encoding.is_some() {
        return conditioning::encoding_of(settings);
    }
    Ok(match layout {
        Some(ArchivedLayout::Wave { float: false, bits: 0..=16, .. }) => WaveEncoding::Pcm16,
        Some(ArchivedLayout::Wave { float: false, bits: 17..=24, .. }) => WaveEncoding::Pcm24,
        Some(ArchivedLayout::Wave { float: false, .. }) => WaveEncoding::Pcm32,
        Some(ArchivedLayout::Wave { float: true, bits: 64, .. }) => WaveEncoding::Float64,
        Some(ArchivedLayout::Wave { .. }) => WaveEncoding::Float32,
        _ => WaveEncoding::Float64,
    })
}
