//! What each column is: stamps, a channel, a counter, or something to leave as it is.

use super::dialect::Found;
use super::field::{Dialect, Look, look};
use super::header::Header;
use super::missing::Missing;
use super::name::{Column, name_and_unit};
use super::ticks::Form;
use super::{civil, field, number, shown};
use crate::error::{Error, Finding, Result};
use crate::place::{Place, escape};
use crate::read::ReadOptions;
use crate::read::selection::{self, Candidate};
use crate::unit::Unit;

/// Names of time columns, in lower case, with blanks for underscores.
const TIME_NAMES: &[&str] = &[
    "t",
    "time",
    "times",
    "timestamp",
    "time stamp",
    "elapsed",
    "elapsed time",
    "date",
    "datetime",
    "date time",
    "date/time",
    "clock",
    "utc",
    "epoch",
    "seconds",
    "sec",
    "zeit",
    "zeitstempel",
    "uhrzeit",
    "datum",
    "temps",
    "tiempo",
    "rel time",
    "abs time",
];
/// Names of position columns.
const POSITION_NAMES: &[&str] =
    &["x", "position", "pos", "distance", "dist", "station", "chainage", "location", "arc length", "weg", "travel"];
/// Names of columns that count rows.
const COUNTER_NAMES: &[&str] = &[
    "n",
    "no",
    "no.",
    "nr",
    "nr.",
    "#",
    "index",
    "idx",
    "i",
    "row",
    "sample",
    "samples",
    "sample no",
    "sample number",
    "count",
    "counter",
    "record",
    "rn",
    "scan",
    "frame",
    "seq",
    "sequence",
    "id",
    "point",
];

/// The first rows, as fields.
pub(super) type Rows<'a> = [Vec<field::Field<'a>>];

/// What the columns are.
#[derive(Debug, Clone)]
pub(super) struct Roles {
    /// Field (from 0) of the stamps, and what they are.
    pub(super) stamps: Option<(usize, Form)>,
    /// Unit of the stamps where header or user state one.
    pub(super) stamps_unit: Option<Unit>,
    /// Fields of the wanted channels, ascending.
    pub(super) channels: Vec<usize>,
    pub(super) findings: Vec<Finding>,
}

/// What the first rows of a column hold.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
enum Content {
    Number,
    Stamp(Form),
    Empty,
    Text,
}

/// How the values of a column follow each other.
#[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord)]
enum Motion {
    /// Each above the one before.
    Strict,
    /// Nearly all at or above the one before.
    Rising,
    /// All equal.
    Constant,
    /// Each below the one before.
    Falling,
    Mixed,
}

/// Decides what each column is, from its name and its first rows; `later` rows, which may be faulty, tell of columns that are
/// empty at first.
///
/// # Errors
/// `Usage` for columns that do not exist or hold no numbers, and for a position column without a unit; `Unsupported` when
/// no channel is left.
pub(super) fn roles(
    header: &Header,
    rows: &Rows<'_>,
    later: &Rows<'_>,
    found: &Found,
    options: &ReadOptions,
) -> Result<Roles> {
    let columns = &header.columns;
    let named = header.names.is_some();
    let missing = Missing::new(&options.missing, found.dialect.decimal);
    let contents: Vec<Content> =
        (0..columns.len()).map(|field| content(field, rows, later, found.dialect, &missing)).collect();
    let tracks: Vec<Vec<f64>> = (0..columns.len()).map(|field| track(field, rows, found.dialect)).collect();
    let candidates: Vec<Candidate> = (columns.iter().enumerate())
        .map(|(index, c)| Candidate { name: c.name.clone(), header: c.header.clone(), number: index + 1 })
        .collect();
    let at_header = Place { line: header.names.as_ref().map(|lines| lines.start as u64 + 1), ..Place::default() };
    let mut findings = Vec::new();
    let stamps = match options.time_column.as_deref() {
        Some("none") => None,
        Some(wanted) => Some(asked_for(wanted, &candidates, &contents)?),
        None => find(columns, named, &contents, &tracks, options, &mut findings)
            .map_err(|error| error.at(at_header.clone()))?,
    };
    let stamps_unit = stamps.and_then(|field| {
        let header = &columns[field].unit;
        options.time_unit.clone().or_else(|| (header.is_time() || header.is_length()).then(|| header.clone()))
    });
    if let Some(unit) = &options.time_unit
        && !(unit.is_time() || unit.is_length())
    {
        return Err(
            Error::usage(format!("--time-unit {unit}: no unit of time or length")).remedy("for example ms, s, mm, m")
        );
    }
    let mark = |field: usize| {
        let name = escape(&columns[field].name);
        let text = format!("column \"{name}\" tells which samples are trusted: left as it is (--channel)");
        Finding::new("mark_column", text).at(Place { column: Some(field as u64 + 1), ..Place::default() })
    };
    let channels = match &options.channels {
        Some(wanted) => {
            let chosen = selection::select(Some(wanted), &candidates)?;
            for &field in &chosen {
                refuse_unfit(field, &columns[field], contents[field], stamps)?;
            }
            chosen
        }
        None => {
            let fit = |&field: &usize| Some(field) != stamps && contents[field] == Content::Number;
            let measured = |&field: &usize| {
                !counts_rows(&columns[field], &tracks[field]) && !marks_trust(&columns[field], &tracks[field])
            };
            findings.extend((0..columns.len()).filter(fit).filter(|&f| marks_trust(&columns[f], &tracks[f])).map(mark));
            (0..columns.len()).filter(fit).filter(measured).collect()
        }
    };
    if options.channels.is_none() {
        let empty = (0..columns.len()).filter(|&field| contents[field] == Content::Empty);
        findings.extend(empty.map(|field| {
            let name = escape(&columns[field].name);
            let text =
                format!("column \"{name}\" holds no value in the first {} rows: left as it is (--channel)", rows.len());
            Finding::new("empty_column", text).at(Place { column: Some(field as u64 + 1), ..Place::default() })
        }));
    }
    if options.channels.is_none() {
        findings.extend(measured_text(columns, &contents, rows));
    }
    if channels.is_empty() {
        let text = findings.iter().find(|finding| finding.code == "text_column");
        let reason = text.map_or("there are numbers in none beside stamps and counters", |finding| &finding.text);
        return Err(Error::unsupported(format!("no column holds a channel: {reason}"))
            .remedy("name one with --channel, or say --time-column none"));
    }
    let stamps = stamps.map(|field| match contents[field] {
        Content::Stamp(form) => (field, form),
        _ => (field, Form::Number),
    });
    Ok(Roles { stamps, stamps_unit, channels, findings })
}

/// What most of the cells hold that are not missing, in the first rows or else in `later` ones.
fn content(field: usize, rows: &Rows<'_>, later: &Rows<'_>, dialect: Dialect, missing: &Missing) -> Content {
    let looks: Vec<Look> =
        rows.iter().filter_map(|row| row.get(field)).map(|cell| look(cell, dialect, missing)).collect();
    let count = |wanted: &[Look]| looks.iter().filter(|look| wanted.contains(look)).count();
    let (numbers, stamps, texts) = (count(&[Look::Number, Look::Grouped]), count(&[Look::Stamp]), count(&[Look::Text]));
    if texts > numbers + stamps {
        Content::Text
    } else if stamps > numbers {
        let civil = rows.iter().filter_map(|row| civil::parse(&row.get(field)?.text));
        let dates = civil.clone().filter(|stamp| stamp.days.is_some()).count();
        Content::Stamp(if 2 * dates >= civil.count() { Form::Date } else { Form::Clock })
    } else if numbers > 0 {
        Content::Number
    } else if later.is_empty() {
        Content::Empty
    } else {
        content(field, later, &[], dialect, missing)
    }
}

/// Remarks on columns of text whose cells start like numbers: perhaps values with a unit behind them.
fn measured_text(columns: &[Column], contents: &[Content], rows: &Rows<'_>) -> Vec<Finding> {
    let numeric = |text: &[u8]| number::scan(text, b'.').is_some() || number::scan(text, b',').is_some();
    let texts = (0..columns.len()).filter(|&field| contents[field] == Content::Text);
    texts
        .filter_map(|field| {
            let cells: Vec<&[u8]> = rows.iter().filter_map(|row| Some(&*row.get(field)?.text)).collect();
            let shows = cells.iter().filter(|cell| numeric(cell)).count();
            let cell = shown(cells.iter().find(|cell| numeric(cell))?);
            let name = escape(&columns[field].name);
            let text = format!("column \"{name}\" is left as it is: {cell} is no number");
            let place = Place { column: Some(field as u64 + 1), ..Place::default() };
            (2 * shows > cells.len()).then(|| Finding::new("text_column", text).at(place))
        })
        .collect()
}

/// The values of a column as far as they are numbers or stamps.
fn track(field: usize, rows: &Rows<'_>, dialect: Dialect) -> Vec<f64> {
    let value = |text: &[u8]| {
        field::number(text, dialect).or_else(|| {
            let civil = civil::parse(text)?;
            let fraction = civil.fraction as f64 / 10_f64.powi(i32::from(civil.decimals));
            Some((civil.days.unwrap_or(0) * 86_400 + civil.seconds) as f64 + fraction)
        })
    };
    rows.iter().filter_map(|row| value(&row.get(field)?.text)).collect()
}

fn motion(track: &[f64]) -> Motion {
    let ups = track.windows(2).filter(|pair| pair[1] > pair[0]).count();
    let downs = track.windows(2).filter(|pair| pair[1] < pair[0]).count();
    let steps = track.len().saturating_sub(1);
    match (ups, downs) {
        (0, 0) => Motion::Constant,
        (_, 0) if ups == steps => Motion::Strict,
        (0, _) if downs == steps => Motion::Falling,
        _ if ups > 0 && downs * 10 <= steps => Motion::Rising,
        _ => Motion::Mixed,
    }
}

/// True when nine tenths of the steps are within a fifth of the median step.
fn steady(track: &[f64]) -> bool {
    let mut steps: Vec<f64> = track.windows(2).map(|pair| pair[1] - pair[0]).collect();
    steps.sort_by(f64::total_cmp);
    let Some(&median) = steps.get(steps.len() / 2) else { return false };
    let near = steps.iter().filter(|step| (*step - median).abs() <= 0.2 * median).count();
    steps.len() >= 2 && median > 0.0 && near * 10 >= steps.len() * 9
}

fn plain(name: &str) -> String {
    name.to_lowercase().replace(['_', '-'], " ").split_whitespace().collect::<Vec<_>>().join(" ")
}

/// True for a usual name of a time column, its unit aside.
pub(super) fn is_time_name(header: &str) -> bool {
    let name = plain(&name_and_unit(header).0);
    let name = name.as_str();
    TIME_NAMES.contains(&name) || name.starts_with("time ") || name.starts_with("timestamp") || name.ends_with(" time")
}

/// A counter: named as one, and one more on each row.
fn counts_rows(column: &Column, track: &[f64]) -> bool {
    let named =
        COUNTER_NAMES.contains(&plain(&column.name).as_str()) || column.header.is_empty() && column.name == "c1";
    named
        && column.unit.meaning().is_none()
        && track.len() >= 3
        && track.windows(2).all(|pair| pair[1] - pair[0] == 1.0)
}

/// A column that tells which samples are trusted, as outputs have it: named so, perhaps with a channel before and a number
/// behind, and 0 or 1 on each row.
fn marks_trust(column: &Column, track: &[f64]) -> bool {
    let name = column.name.trim_end_matches(|c: char| c.is_ascii_digit()).trim_end();
    let named = name == "trusted" || name.ends_with(" trusted");
    named && column.unit.is_unknown() && track.iter().all(|flag| *flag == 0.0 || *flag == 1.0)
}

fn asked_for(wanted: &str, candidates: &[Candidate], contents: &[Content]) -> Result<usize> {
    let by_number = wanted.parse::<usize>().is_ok() && !candidates.iter().any(|candidate| candidate.name == wanted);
    let wanted = if by_number { format!("#{wanted}") } else { wanted.to_owned() };
    let field = selection::find(&wanted, candidates, "--time-column")?;
    match contents[field] {
        Content::Number | Content::Stamp(_) => Ok(field),
        Content::Empty | Content::Text => {
            let what = format!("--time-column {}: the column holds no stamps", escape(&wanted));
            Err(Error::usage(what).remedy("name another, or say --time-column none and give --rate"))
        }
    }
}

fn refuse_unfit(field: usize, column: &Column, content: Content, stamps: Option<usize>) -> Result<()> {
    let what = match content {
        _ if stamps == Some(field) => "is the time column",
        Content::Text => "holds text",
        Content::Stamp(_) => "holds stamps",
        Content::Number | Content::Empty => return Ok(()),
    };
    Err(Error::usage(format!("--channel {}: the column {what}", escape(&column.name)))
        .remedy("name a column of numbers"))
}

/// The time or position column that names and first rows show.
fn find(
    columns: &[Column],
    named: bool,
    contents: &[Content],
    tracks: &[Vec<f64>],
    options: &ReadOptions,
    findings: &mut Vec<Finding>,
) -> Result<Option<usize>> {
    let single = tracks.iter().all(|track| track.len() <= 1);
    let mut best: Option<(Motion, usize)> = None;
    let mut doubtful = None;
    for (field, column) in columns.iter().enumerate() {
        let motion = motion(&tracks[field]);
        let usual = named && is_time_name(&column.name) && (column.unit.is_unknown() || column.unit.is_time());
        let fits = match contents[field] {
            Content::Stamp(_) => motion <= Motion::Rising || single || usual && motion != Motion::Mixed,
            Content::Number => usual && motion != Motion::Mixed || column.unit.is_time() && motion == Motion::Strict,
            Content::Empty | Content::Text => false,
        };
        if fits && best.is_none_or(|(known, _)| motion < known) {
            best = Some((motion, field));
        } else if usual && !fits {
            doubtful = Some(field);
        }
    }
    if let Some((_, field)) = best {
        return Ok(Some(field));
    }
    if let Some(field) = position(columns, contents, tracks, options)? {
        return Ok(Some(field));
    }
    let first = motion(&tracks[0]);
    let rises = contents[0] == Content::Number && first <= Motion::Rising && steady(&tracks[0]);
    let others = contents.iter().skip(1).any(|content| *content == Content::Number);
    let unsure =
        |text: String| Finding::new("time_column_unsure", format!("{text}; if it is the time, say --time-column"));
    if let Some(field) = doubtful {
        let name = escape(&columns[field].name);
        findings.push(unsure(format!("column \"{name}\" does not rise and is not taken for the time")));
    } else if rises && others && !counts_rows(&columns[0], &tracks[0]) {
        let name = escape(&columns[0].name);
        if !named && first == Motion::Strict {
            let text = "there is no header: the first column rises steadily and is taken for the time (--time-column)";
            findings.push(Finding::new("time_column_guessed", text));
            return Ok(Some(0));
        }
        let but = if named { "but is not named as time" } else { "but not on every row" };
        findings.push(unsure(format!("column \"{name}\" rises steadily {but}")));
    }
    Ok(None)
}

/// A column of positions along a profile: named as one, in a unit of length, and strictly monotonic.
fn position(
    columns: &[Column],
    contents: &[Content],
    tracks: &[Vec<f64>],
    options: &ReadOptions,
) -> Result<Option<usize>> {
    let axes = columns.iter().any(|column| matches!(plain(&column.name).as_str(), "y" | "z"));
    for (field, column) in columns.iter().enumerate() {
        let name = plain(&column.name);
        let moves = tracks[field].len() >= 2 && matches!(motion(&tracks[field]), Motion::Strict | Motion::Falling);
        if contents[field] != Content::Number || !POSITION_NAMES.contains(&name.as_str()) || !moves || columns.len() < 2
        {
            continue;
        }
        let given = options.time_unit.as_ref().is_some_and(Unit::is_length);
        if column.unit.is_length() || given && column.unit.is_unknown() {
            return Ok(Some(field));
        }
        // Axes of an accelerometer are named x, y, z.
        if column.unit.is_unknown() && !(name == "x" && axes) && options.rate.is_none() {
            let what = format!("column \"{}\" looks like positions but states no unit", escape(&column.name));
            return Err(Error::usage(what)
                .at(Place { column: Some(field as u64 + 1), ..Place::default() })
                .remedy("give it with --time-unit (such as mm), or say --time-column none"));
        }
    }
    Ok(None)
}
