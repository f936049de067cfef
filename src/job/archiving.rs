//! `compress`: a record as an archive whose error is guaranteed, and what that took.

use std::io::Write as _;
use std::path::Path;

use rayon::prelude::*;

use crate::basis::Planner;
use crate::codec::{
    ArchivedAxis, ArchivedChannel, ArchivedLayout, Cast, Fidelity, Header, Limit, Made, Origin, Request, Rule, Writer,
    encode,
};
use crate::error::{Error, Finding, Result};
use crate::job::examination::axis_in_words;
use crate::job::intake;
use crate::numeric::noise;
use crate::numeric::rational::Rational;
use crate::place::Place;
use crate::read::{self, Input};
use crate::record::{Axis, ColumnRole, Layout, RateSource, RawChannel, RawRecord, SampleType, Stamps, StatedRate};
use crate::report::page::{DRAWN, Quantity, Restoration};
use crate::report::{ARCHIVE_CAUTION, ArchiveReport, ArchivedReport, OutputReport, SCHEMA, Tool};
use crate::settings::Settings;
use crate::unit::Unit;
use crate::write::Pending;

/// Reads a record, codes it and writes the archive into `output`. Where it is to be `drawn`, the first channels come as
/// recorded and as restored, for the page.
///
/// # Errors
/// Those of reading; `Usage` without a bound or for one that does not fit; nothing is then visible of the output.
pub fn compress(
    input: Input,
    mut output: Pending<'_>,
    settings: &Settings,
    drawn: bool,
) -> Result<(ArchiveReport, Vec<Restoration>)> {
    let Some(request) = settings.archive.request.clone() else {
        return Err(Error::usage("no bound on the error")
            .remedy("give one of --max-error, --rms-error, --lossless, --keep, --corner"));
    };
    let raw = read::read(input, &settings.read)?;
    intake::refuse_notes(settings, &raw.findings)?;
    let rows = raw.channels.iter().map(|channel| channel.values.len()).max().unwrap_or(0);
    if rows == 0 {
        return Err(Error::unsupported("the record holds no samples").at(Place::file(&raw.source.path)));
    }
    let mut notes = raw.findings.clone();
    let (axis, ticks) = axis_of(&raw, rows);
    let layout = if settings.archive.bare { None } else { layout_of(&raw, settings, &mut notes) };
    let planner = Planner::new();
    let even = even_axis(&raw, rows);
    let coded: Vec<Coded> = raw
        .channels
        .par_iter()
        .map(|channel| code(channel, &raw, &request, even.as_ref(), settings, &planner))
        .collect::<Result<_>>()?;

    let header = Header {
        rows: rows as u64,
        axis,
        channels: coded.iter().map(|coded| coded.channel.clone()).collect(),
        layout,
        notes: if settings.archive.bare { Vec::new() } else { raw.metadata.clone() },
        origin: (!settings.archive.bare).then(|| origin_of(&raw, settings)),
    };
    let mut writer = Writer::start(&mut output, &header)?;
    let mut sizes = Vec::new();
    for (stream, coded) in coded.iter().enumerate() {
        sizes.push(write_blocks(&mut writer, stream, &coded.made)?);
    }
    if let Some(ticks) = ticks {
        let made = encode(&ticks, Cast::Double, Limit::Lossless, settings.archive.effort, &planner)?;
        write_blocks(&mut writer, coded.len(), &made)?;
    }
    let bytes = writer.finish()?;
    output.flush()?;
    let written = output.finish()?;
    let count = raw.channels.len().min(DRAWN);
    let (mut channels, mut restorations) = (Vec::new(), Vec::new());
    for ((channel, coded), bytes) in raw.channels.iter().zip(&coded).zip(sizes) {
        let restored: Vec<f64> = coded.made.iter().flat_map(|made| made.restored.iter().copied()).collect();
        let mut told = report(channel, coded, &restored, bytes, even.as_ref(), &mut notes);
        let worst = told.fidelity.max_error_row;
        told.max_error_at = worst.filter(|_| header.axis.is_some()).map(|row| place(&raw, row));
        if drawn && restorations.len() < count {
            let values = [channel.values.as_slice(), restored.as_slice()];
            restorations.push(Restoration::of(
                across(&raw),
                &|row| place(&raw, row),
                coded.limit,
                values,
                worst,
                count,
            ));
        }
        channels.push(told);
    }
    let samples = rows * raw.channels.len();
    let report = ArchiveReport {
        schema: SCHEMA,
        tool: Tool::THIS,
        command: "compress",
        settings: settings.to_map(),
        asked: request.to_string(),
        bounds_rms: matches!(request, Request::Rms(_)),
        path: raw.source.path.clone(),
        sha256: raw.source.sha256.clone(),
        source_bytes: raw.source.bytes,
        rows,
        axis: header.axis.as_ref().map(axis_in_words),
        axis_unit: header.axis.is_some().then(|| Unit::parse(&across(&raw).unit)),
        notes,
        channels,
        bytes,
        bits_per_sample: 8.0 * bytes as f64 / samples as f64,
        ratio_to_source: raw.source.bytes as f64 / bytes as f64,
        ratio_to_doubles: 8.0 * samples as f64 / bytes as f64,
        outputs: vec![OutputReport { path: written.path, sha256: written.sha256 }],
        caution: ARCHIVE_CAUTION,
    };
    Ok((report, restorations))
}

/// Where a row stands: its stamp, or its time or position at the stated rate, or its number.
fn place(raw: &RawRecord, row: usize) -> f64 {
    match (&raw.stamps, &raw.stated_rate) {
        (Some(stamps), _) => stamps.first + stamps.ticks.get(row).copied().unwrap_or(0) as f64 * stamps.tick,
        (None, Some(rate)) => row as f64 / rate.rate_base,
        (None, None) => row as f64,
    }
}

/// What `place` counts.
fn across(raw: &RawRecord) -> Quantity {
    let along = |unit: &Unit| if unit.is_length() { "position" } else { "time" };
    match (&raw.stamps, &raw.stated_rate) {
        (Some(stamps), _) => Quantity::linear(along(&stamps.unit), stamps.unit.label()),
        (None, Some(rate)) => Quantity::linear(along(&rate.unit), base_unit(rate).label()),
        (None, None) => Quantity::linear("row", ""),
    }
}

/// Seconds or metres: what a stated rate counts in.
fn base_unit(rate: &StatedRate) -> Unit {
    Unit::parse(if rate.unit.is_length() { "m" } else { "s" })
}

/// A channel as coded.
struct Coded {
    channel: ArchivedChannel,
    limit: Limit,
    made: Vec<Made>,
}

fn code(
    channel: &RawChannel,
    raw: &RawRecord,
    request: &Request,
    even: Option<&Axis>,
    settings: &Settings,
    planner: &Planner,
) -> Result<Coded> {
    let named = |error: Error| error.at(Place::channel(&channel.name)).at(Place::file(&raw.source.path));
    if let Some(n) = channel.values.iter().position(|v| v.is_infinite()) {
        let place = Place { sample: Some(n as u64), ..Place::channel(&channel.name) };
        return Err(named(
            Error::unsupported("an infinite value").at(place).remedy("declare its spelling with --missing"),
        ));
    }
    let values: Vec<f64> = channel.values.iter().copied().filter(|v| !v.is_nan()).collect();
    let single = matches!(&raw.layout, Layout::Wave(wave) if wave.sample_type == SampleType::Float(32));
    let cast = Cast::of(&values, single);
    let limit = request.resolve(&values, &channel.unit, even).map_err(named)?;
    let made = encode(&channel.values, cast, limit, settings.archive.effort, planner).map_err(named)?;
    let error = match limit {
        Limit::Max(bound) | Limit::Rms(bound) => Some(bound),
        Limit::Lossless | Limit::Keep(_) => None,
    };
    let bound = if settings.archive.bare { String::new() } else { request.to_string() };
    let channel = ArchivedChannel {
        name: channel.name.clone(),
        unit: channel.unit.label().to_owned(),
        cast,
        bound,
        error: error.filter(|_| !settings.archive.bare),
    };
    Ok(Coded { channel, limit, made })
}

fn write_blocks<W: std::io::Write>(writer: &mut Writer<W>, stream: usize, made: &[Made]) -> Result<u64> {
    let mut bytes = 0;
    for block in made {
        bytes += writer.block(stream, block.first, block.rows, &block.gaps, block.coded.as_ref())?;
    }
    Ok(bytes)
}

/// The axis of the archive, and the ticks where they must be coded.
fn axis_of(raw: &RawRecord, rows: usize) -> (Option<ArchivedAxis>, Option<Vec<f64>>) {
    if let Some(stamps) = &raw.stamps {
        let mut axis = ArchivedAxis {
            unit: stamps.unit.label().to_owned(),
            name: stamps.name.clone(),
            tick: stamps.tick,
            first: first_tick(stamps),
            civil: stamps.civil.clone(),
            rule: Rule::Coded,
        };
        if let Some((p, q)) = even_ticks(&stamps.ticks) {
            axis.rule = Rule::Even(p, q);
            return (Some(axis), None);
        }
        return (Some(axis), Some(stamps.ticks.iter().take(rows).map(|tick| *tick as f64).collect()));
    }
    let axis = raw.stated_rate.as_ref().map(|rate| {
        let rule = match Rational::exactly(rate.rate_base) {
            Some(rate) => Rule::Stated(rate.numerator, rate.denominator),
            None => Rule::StatedDouble(rate.rate_base),
        };
        ArchivedAxis { unit: rate.unit.label().to_owned(), name: String::new(), tick: 1.0, first: 0, civil: None, rule }
    });
    (axis, None)
}

/// The first stamp in ticks: from the civil time where there is one, since doubles do not hold nanoseconds since 1970.
fn first_tick(stamps: &Stamps) -> i64 {
    let civil = stamps.civil.as_deref().and_then(|text| text.parse::<jiff::Timestamp>().ok());
    let tick_ns = stamps.tick * stamps.unit.meaning().map_or(1.0, |meaning| meaning.scale) * 1e9;
    match civil {
        Some(stamp) if tick_ns >= 1.0 && tick_ns == tick_ns.round() && stamp.as_nanosecond() % tick_ns as i128 == 0 => {
            (stamp.as_nanosecond() / tick_ns as i128) as i64
        }
        _ => (stamps.first / stamps.tick).round() as i64,
    }
}

/// p / q ticks a row such that every tick is row x p / q to the nearest; the plainest fraction that does.
fn even_ticks(ticks: &[i64]) -> Option<(u64, u64)> {
    let rows = ticks.len() as u64;
    let last = u64::try_from(*ticks.last()?).ok()?;
    if rows < 2 || last == 0 {
        return (rows == 1).then_some((1, 1));
    }
    // Each tick keeps the ratio between (tick - 1/2) / row and (tick + 1/2) / row.
    let (mut low, mut high) = (0.0_f64, f64::INFINITY);
    for (row, tick) in ticks.iter().enumerate().skip(1) {
        low = low.max((*tick as f64 - 0.5) / row as f64);
        high = high.min((*tick as f64 + 0.5) / row as f64);
    }
    let whole = Rational::new(last, rows - 1).filter(|r| r.denominator == 1);
    let found = whole.or_else(|| Rational::plainest(low.max(1e-9), high))?;
    let (p, q) = (u128::from(found.numerator), u128::from(found.denominator));
    let fits = |(row, tick): (usize, &i64)| i128::from(*tick) == ((2 * row as u128 * p + q) / (2 * q)) as i128;
    ticks.iter().enumerate().all(fits).then_some((found.numerator, found.denominator))
}

/// The axis of evenly spaced rows, for corners.
fn even_axis(raw: &RawRecord, rows: usize) -> Option<Axis> {
    match (&raw.stamps, &raw.stated_rate) {
        (Some(stamps), _) => {
            let (p, q) = even_ticks(&stamps.ticks)?;
            let step = stamps.tick * p as f64 / q as f64;
            Axis::new(stamps.unit.clone(), stamps.first, step, rows, RateSource::Stamps).ok()
        }
        (None, Some(rate)) => Axis::new(base_unit(rate), 0.0, 1.0 / rate.rate_base, rows, RateSource::Header).ok(),
        (None, None) => None,
    }
}

fn layout_of(raw: &RawRecord, settings: &Settings, notes: &mut Vec<Finding>) -> Option<ArchivedLayout> {
    match &raw.layout {
        Layout::Wave(wave) => {
            let (bits, float) = match wave.sample_type {
                SampleType::Integer(bits) => (bits, false),
                SampleType::Float(bits) => (bits, true),
            };
            Some(ArchivedLayout::Wave { rate_hz: wave.rate_hz, bits, float })
        }
        Layout::Table(table) => {
            let dropped = table.columns.iter().filter(|role| **role == ColumnRole::Untouched).count();
            if dropped > 0 {
                let text = format!("{dropped} columns that hold no archived channel are left out");
                notes.push(Finding::new("columns_left_out", text).at(Place::file(&raw.source.path)));
            }
            let columns = table.columns.iter().filter_map(|role| match role {
                ColumnRole::Stamps => Some(0),
                ColumnRole::Channel(channel) => Some(*channel as u64 + 1),
                // The dates are part of the stamps, which come back as seconds.
                ColumnRole::Dates | ColumnRole::Untouched => None,
            });
            // A header whose columns or units no longer hold would say what is not so.
            let kept = dropped == 0 && settings.read.units.is_empty() && settings.read.calibrate.is_empty();
            let civil = raw.stamps.as_ref().is_some_and(|stamps| stamps.civil.is_some());
            if civil {
                let text = "dates and clock times come back as seconds since 1970";
                notes.push(Finding::new("stamps_as_seconds", text).at(Place::file(&raw.source.path)));
            }
            Some(ArchivedLayout::Table {
                delimiter: table.delimiter,
                decimal: table.decimal,
                newline: table.newline.to_owned(),
                head: (kept && !civil).then(|| table.head.clone()),
                columns: columns.collect(),
            })
        }
    }
}

fn origin_of(raw: &RawRecord, settings: &Settings) -> Origin {
    let name =
        Path::new(&raw.source.path).file_name().map_or_else(|| "-".to_owned(), |n| n.to_string_lossy().into_owned());
    let map = settings.to_map();
    let given = map.iter().filter_map(|(key, value)| match value {
        serde_json::Value::String(text) => settings.is_given(key).then(|| format!("--{key} {text}")),
        serde_json::Value::Bool(true) => Some(format!("--{key}")),
        serde_json::Value::Array(texts) => {
            let texts: Vec<String> = texts.iter().filter_map(|t| t.as_str()).map(|t| format!("--{key} {t}")).collect();
            (!texts.is_empty()).then(|| texts.join(" "))
        }
        _ => None,
    });
    Origin {
        name,
        sha256: raw.source.sha256.clone(),
        bytes: raw.source.bytes,
        tool: format!("{} {}", Tool::THIS.name, Tool::THIS.version),
        settings: given.collect::<Vec<_>>().join(" "),
    }
}

fn report(
    channel: &RawChannel,
    coded: &Coded,
    restored: &[f64],
    bytes: u64,
    even: Option<&Axis>,
    notes: &mut Vec<Finding>,
) -> ArchivedReport {
    let values: Vec<f64> = channel.values.iter().copied().filter(|v| !v.is_nan()).collect();
    let sigma = if values.len() < 8 { 0.0 } else { noise::sigma(&values) };
    let (error, noise_bits) = match coded.limit {
        // Half the logarithm of 2 pi e less that of a width 2 E: 1.05 + log2(sigma / E) bits a sample.
        Limit::Max(bound) if bound > 0.0 && sigma > 0.0 => {
            (Some(bound), Some((1.05 + (sigma / bound).log2()).max(0.0)))
        }
        // Rate of Gaussian noise at that distortion.
        Limit::Rms(bound) if bound > 0.0 && sigma > 0.0 => (Some(bound), Some((sigma / bound).log2().max(0.0))),
        Limit::Max(bound) | Limit::Rms(bound) => (Some(bound), None),
        Limit::Lossless | Limit::Keep(_) => (None, None),
    };
    if let (Some(error), Some(cost)) = (error, noise_bits)
        && error < 0.25 * sigma
    {
        let text = format!(
            "the bound is far below the noise: about {cost:.1} bits a sample go into keeping noise; a bound near {} {} keeps the rest",
            crate::report::figure(sigma, 2),
            channel.unit
        );
        notes.push(Finding::new("bound_below_noise", text).at(Place::channel(&channel.name)));
    }
    // The mode that holds most rows speaks for the channel.
    let blocks = || coded.made.iter().filter_map(|made| made.coded.as_ref().map(|block| (made, block)));
    let mode = blocks().max_by_key(|(made, _)| made.rows).map(|(_, block)| block.mode);
    let runner_up = blocks().max_by_key(|(made, _)| made.rows).and_then(|(made, _)| made.runner_up);
    let kept: Option<usize> = blocks().map(|(_, block)| block.kept.map(|(kept, _)| kept)).sum();
    let top =
        blocks().filter_map(|(made, block)| block.kept.map(|(_, top)| top as f64 / made.rows as f64)).reduce(f64::max);
    let parseval: Option<f64> = match coded.limit {
        Limit::Keep(_) => {
            let dropped: Option<f64> = blocks().map(|(_, block)| block.dropped).sum();
            dropped.map(|energy| (energy / values.len().max(1) as f64).sqrt())
        }
        _ => None,
    };
    ArchivedReport {
        name: channel.name.clone(),
        unit: channel.unit.clone(),
        error,
        bytes,
        bits_per_sample: 8.0 * bytes as f64 / channel.values.len().max(1) as f64,
        ratio_to_doubles: 8.0 * channel.values.len() as f64 / bytes.max(1) as f64,
        mode,
        blocks: coded.made.len(),
        runner_up: runner_up.map(|(mode, _)| mode),
        runner_up_bytes: runner_up.map(|(_, bytes)| bytes),
        fidelity: Fidelity::of(&channel.values, restored),
        max_error_at: None,
        parseval_rmse: parseval,
        kept,
        // Coefficient k of N samples stands for k / (2 N) cycles a step.
        cut_off: top.zip(even).map(|(top, axis)| top / 2.0 / axis.step_base()),
        noise: (sigma > 0.0).then_some(sigma),
        noise_bits,
    }
}
