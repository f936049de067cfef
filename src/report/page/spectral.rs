//! The page of a spectrum: densities with their limits, lines, bands, levels, road class, and the sum check.

use crate::report::page::shared::{self, DRAWN};
use crate::report::page::{
    Answer, Band, Block, Cell, Figure, FigureSet, Line, Page, Quantity, Section, Table, thinned_along,
};
use crate::report::text::figure;
use crate::report::{ChannelSpectrum, CoefficientsReport, DensityReport, SpectrumReport, Trace};
use crate::settings::Group;

/// The page of a spectrum, with its series.
pub fn spectrum_page(report: &SpectrumReport) -> Page {
    let drawn = report.channels.len().min(DRAWN);
    let traces = report.channels.iter().map(|channel| channel.traces.len()).max().unwrap_or(1);
    let count = shared::points(drawn) * 4 / traces.max(1);
    let mut sections: Vec<Section> = report
        .channels
        .iter()
        .enumerate()
        .map(|(index, channel)| section(channel, (index < DRAWN).then_some(count)))
        .collect();
    let notes: Vec<_> = report.notes.iter().chain(report.channels.iter().flat_map(|c| &c.notes)).collect();
    sections.push(shared::quality(&report.input, &notes));
    let second = report.second.as_ref().map_or_else(String::new, |second| shared::quoted(&second.path));
    sections.push(shared::settings("spectrum", Group::SPECTRUM, &report.input.path, &report.settings, &second));
    let title = match &report.second {
        None => format!("Spectrum of {}", report.input.path),
        Some(second) => format!("Spectra of {} and {}", report.input.path, second.path),
    };
    Page {
        title,
        asked: shared::asked(&report.input, &report.chain),
        answers: report.channels.iter().map(answer).collect(),
        sections,
        caution: report.caution.to_owned(),
    }
}

/// What stands out in a channel: its strongest line, and whether the density holds the record's power.
fn answer(channel: &ChannelSpectrum) -> Answer {
    let name = channel.name.clone();
    let Some(trace) = channel.traces.last() else {
        return Answer { name, sentence: "no spectrum.".to_owned(), figure: String::new() };
    };
    let unit = &trace.unit;
    let power = match (&trace.density, &trace.coefficients) {
        (Some(density), _) => match density.sum_check.difference {
            Some(share) => format!(
                "The lines of the density hold the mean square {} ({unit})² to {:+.2} %.",
                figure(density.sum_check.mean_square, 4),
                100.0 * share
            ),
            None => "The record is silent.".to_owned(),
        },
        (None, Some(found)) => format!("{} coefficients hold 99 % of the energy.", found.for_99_percent),
        _ => String::new(),
    };
    let strongest = match (trace.lines.first(), &trace.density) {
        (Some(line), Some(density)) => format!(
            "Strongest line at {} ± {} {}, amplitude {} ± {} {unit}.",
            figure(line.frequency, 5),
            figure(line.frequency_error, 2),
            density.frequency_unit,
            figure(line.amplitude, 3),
            figure(line.amplitude_error, 2),
        ),
        _ => String::new(),
    };
    Answer { name, sentence: power, figure: strongest }
}

fn section(channel: &ChannelSpectrum, count: Option<usize>) -> Section {
    let mut blocks = Vec::new();
    match count {
        Some(count) => blocks.extend(drawn(channel, count)),
        None => blocks.push(Block::Text(shared::too_many())),
    }
    for trace in &channel.traces {
        if channel.traces.len() > 1 {
            blocks.push(Block::Heading(trace.label.clone()));
        }
        if let (Some(extension), baseline) = (&trace.extension, trace.baseline.as_deref().unwrap_or("none")) {
            blocks.push(Block::Text(format!(
                "Assumed past the ends: {} ({}), baseline {baseline}.",
                extension.kind, extension.transform
            )));
        }
        if let Some(density) = &trace.density {
            blocks.push(Block::Table(formed(density)));
            blocks.extend(tables(trace, density));
        }
        if let Some(found) = &trace.coefficients {
            blocks.push(Block::Text(format!("{}; {}", found.quantity, found.formula)));
            blocks.push(Block::Table(largest(found)));
        }
        blocks.extend(trace.road.as_ref().map(road));
    }
    if let Some(ratio) = &channel.ratio {
        blocks.push(Block::Text(format!(
            "{} over {}: {} of {} lines differ beyond their limits; chance alone would make about {}.",
            ratio.of[0],
            ratio.of[1],
            ratio.differing,
            ratio.ratio.len(),
            figure(ratio.by_chance, 2)
        )));
    }
    Section { heading: channel.name.clone(), blocks }
}

/// The densities or coefficients of a channel over each other, and the gain that was applied.
fn drawn(channel: &ChannelSpectrum, count: usize) -> Option<Block> {
    let first = channel.traces.first()?;
    let (upwards, unit, frequency_unit) = match (&first.density, &first.coefficients) {
        (Some(density), _) => ("density", density.unit.clone(), density.frequency_unit),
        (None, Some(found)) => ("amplitude", found.unit.to_string(), found.frequency_unit),
        _ => return None,
    };
    let (mut lines, mut bands) = (Vec::new(), Vec::new());
    for (index, trace) in channel.traces.iter().enumerate() {
        let style = STYLES[index % STYLES.len()];
        if let Some(series) = trace.density.as_ref().and_then(|density| density.series.as_ref()) {
            let keep = positive(&series.frequency, &series.density);
            let at = |values: &[f64]| keep.iter().map(|&k| values[k]).collect::<Vec<f64>>();
            let places = at(&series.frequency);
            lines.push(Line {
                name: trace.label.clone(),
                style,
                option: None,
                points: thinned_along(&places, &at(&series.density), count),
            });
            let every = (keep.len() / (count / 2).max(1)).max(1);
            let limits = keep.iter().step_by(every).map(|&k| [series.frequency[k], series.lower[k], series.upper[k]]);
            let share = trace.density.as_ref().map_or(0.0, |density| 100.0 * density.confidence);
            let name = format!("{}: {} % limits", trace.label, figure(share, 4));
            bands.push(Band { name, style, points: limits.collect() });
        } else if let Some(series) = trace.coefficients.as_ref().and_then(|found| found.series.as_ref()) {
            let sizes: Vec<f64> = series.amplitude.iter().map(|v| v.abs()).collect();
            let keep = positive(&series.frequency, &sizes);
            let at = |values: &[f64]| keep.iter().map(|&k| values[k]).collect::<Vec<f64>>();
            let points = thinned_along(&at(&series.frequency), &at(&sizes), count);
            lines.push(Line { name: trace.label.clone(), style, option: None, points });
        }
    }
    let along = Quantity::logarithmic("frequency", frequency_unit);
    let mut figures = vec![Figure {
        title: format!("{}: {upwards}", channel.name),
        description: format!(
            "Line chart of the {upwards} of channel {} by frequency, both axes by decades.",
            channel.name
        ),
        x: along.clone(),
        y: Quantity::logarithmic(upwards, unit),
        lines,
        bands,
        spans: Vec::new(),
    }];
    let frequencies = frequencies(first);
    if let (Some(gain), Some(frequency)) = (&channel.gain, frequencies) {
        let keep = positive(frequency, frequency);
        let at = |values: &[f64]| keep.iter().filter_map(|&k| values.get(k).copied()).collect::<Vec<f64>>();
        let points = thinned_along(&at(frequency), &at(gain), count / 2);
        figures.push(Figure {
            title: format!("{}: gain as applied", channel.name),
            description: format!("Gain of the operators on channel {} by frequency.", channel.name),
            x: along,
            y: Quantity::linear("gain", ""),
            lines: vec![Line { name: "gain".to_owned(), style: 6, option: None, points }],
            bands: Vec::new(),
            spans: Vec::new(),
        });
    }
    Some(Block::Figures(FigureSet { choice: None, figures }))
}

/// Styles of the traces: told apart by colour and by dash.
const STYLES: [usize; 4] = [8, 4, 6, 3];

fn frequencies(trace: &Trace) -> Option<&[f64]> {
    let density = trace.density.as_ref().and_then(|density| density.series.as_ref()).map(|s| s.frequency.as_slice());
    density.or_else(|| trace.coefficients.as_ref()?.series.as_ref().map(|s| s.frequency.as_slice()))
}

/// Indices with a frequency and a value that have logarithms.
fn positive(frequency: &[f64], values: &[f64]) -> Vec<usize> {
    (0..frequency.len().min(values.len()))
        .filter(|&k| frequency[k] > 0.0 && values[k] > 0.0 && values[k].is_finite())
        .collect()
}

/// How a density was formed.
fn formed(density: &DensityReport) -> Table {
    let row = |name: &str, value: String| vec![Cell::text(name), Cell::text(value)];
    let range = |[low, high]: [f64; 2]| {
        if low == high { figure(low, 5) } else { format!("{} to {}", figure(low, 4), figure(high, 4)) }
    };
    let unit = density.frequency_unit;
    let mut rows = vec![
        row("quantity", format!("{} in {}", density.quantity, density.unit)),
        row("method", density.method.clone()),
        row("scaling", density.formula.to_owned()),
        row("taken off first", density.detrend.clone()),
    ];
    if let Some(window) = &density.window {
        rows.push(row("window", format!("{} ({})", window.name, window.source)));
    }
    if let Some(segments) = &density.segments {
        rows.push(row(
            "segments",
            format!(
                "{} of {} samples, {} % overlap, {} samples left over",
                segments.count,
                segments.samples,
                figure(100.0 * segments.overlap, 4),
                segments.left_over
            ),
        ));
    }
    if let Some(tapers) = density.tapers {
        rows.push(row("tapers", range(tapers.map(f64::from))));
    }
    let [low, high] = density.limit_factors;
    let check = &density.sum_check;
    let difference = check.difference.map_or_else(String::new, |share| format!(" ({:+.2} %)", 100.0 * share));
    rows.extend([
        row("lines", format!("{} {unit} apart", figure(density.spacing, 6))),
        row("noise bandwidth", format!("{} {unit}", range(density.noise_bandwidth))),
        row("degrees of freedom", range(density.freedom)),
        row(
            "limits",
            format!(
                "{} %: from {} to {} times the estimate",
                figure(100.0 * density.confidence, 4),
                figure(low, 3),
                figure(high, 3)
            ),
        ),
        row(
            "sum check",
            format!("lines sum to {}, mean square {}{difference}", figure(check.sum, 6), figure(check.mean_square, 6)),
        ),
    ]);
    Table { caption: "How the density was formed".to_owned(), head: vec!["what".into(), "value".into()], rows }
}

/// Lines, bands and levels.
fn tables(trace: &Trace, density: &DensityReport) -> Vec<Block> {
    let unit = &trace.unit;
    let number = |value: f64, digits: usize| Cell::Number(Some(value), digits);
    let mut found = Vec::new();
    let mut add = |caption: &str, head: Vec<String>, rows: Vec<Vec<Cell>>| {
        if !rows.is_empty() {
            found.push(Block::Table(Table { caption: caption.to_owned(), head, rows }));
        }
    };
    let lines = trace.lines.iter().map(|line| {
        vec![
            number(line.frequency, 6),
            number(line.frequency_error, 2),
            number(line.amplitude, 4),
            number(line.amplitude_error, 2),
            number(line.rms, 4),
            number(line.above_noise_db, 3),
            number(100.0 * line.steadiness, 3),
        ]
    });
    let head = [
        format!("frequency [{}]", density.frequency_unit),
        "±".to_owned(),
        format!("amplitude [{unit}]"),
        "±".to_owned(),
        format!("RMS [{unit}]"),
        "above noise [dB]".to_owned(),
        "steady [%]".to_owned(),
    ];
    add("Spectral lines, interpolated between the bins", head.into(), lines.collect());
    let bands = trace.bands.iter().map(|band| {
        vec![
            Cell::text(band.text.clone()),
            number(band.rms, 4),
            number(band.lower, 4),
            number(band.upper, 4),
            number(band.lines, 4),
            number(100.0 * band.share, 3),
        ]
    });
    let limits = |first: &str| -> Vec<String> {
        vec![first.to_owned(), format!("RMS [{unit}]"), "from".to_owned(), "to".to_owned(), "lines".to_owned()]
    };
    let mut head = limits("band");
    head.push("of the mean square [%]".to_owned());
    add("Bands", head, bands.collect());
    let octaves = trace.octaves.iter().filter(|band| band.rms.is_some()).map(|band| {
        vec![
            number(band.nominal, 5),
            Cell::Number(band.rms, 4),
            Cell::Number(band.lower, 4),
            Cell::Number(band.upper, 4),
            number(band.lines, 4),
            Cell::Number(band.level_db, 4),
        ]
    });
    let mut head = limits("mid-frequency [Hz]");
    let reference = trace.octaves.iter().find_map(|band| band.reference);
    head.push(reference.map_or_else(|| "level".to_owned(), |r| format!("level [dB re {r}]")));
    add("Band levels, ideal bands", head, octaves.collect());
    found
}

fn largest(found: &CoefficientsReport) -> Table {
    let along = if found.frequency_unit == "Hz" { "s" } else { "m" };
    let rows = found.largest.iter().map(|row| {
        vec![
            Cell::text(format!("{} {}", row.index, if row.cosine { "cos" } else { "sin" })),
            Cell::Number(Some(row.frequency), 6),
            Cell::Number(Some(row.half_cycles), 6),
            Cell::Number(row.wavelength, 5),
            Cell::Number(Some(row.value), 5),
            Cell::Number(Some(row.amplitude), 5),
            Cell::Number(Some(100.0 * row.share), 3),
        ]
    });
    let head = [
        "coefficient".to_owned(),
        format!("frequency [{}]", found.frequency_unit),
        "half-cycles".to_owned(),
        format!("wavelength [{along}]"),
        "value".to_owned(),
        format!("amplitude [{}]", found.unit),
        "of the energy [%]".to_owned(),
    ];
    Table { caption: "The coefficients of most energy".to_owned(), head: head.into(), rows: rows.collect() }
}

fn road(found: &crate::report::RoadReport) -> Block {
    Block::Text(format!(
        "Road class {} (ISO 8608): displacement density {} m³ at 0.1 cycles/m ({} to {}: {}), from {} to {} cycles/m; best line: \
         waviness {} ± {}.",
        found.class,
        figure(found.density_at_reference, 3),
        figure(found.limits[0], 3),
        figure(found.limits[1], 3),
        found.classes,
        figure(found.range[0], 3),
        figure(found.range[1], 3),
        figure(found.waviness, 3),
        figure(found.waviness_error, 2),
    ))
}
