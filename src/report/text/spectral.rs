//! A spectrum for people: how it was formed, whether it holds the record's power, and what stands out.

use crate::place::escape;
use crate::report::text::{extension_text, figure, indented, input_line, notes_text, planned, table};
use crate::report::{ChannelSpectrum, CoefficientsReport, DensityReport, SpectrumReport, Trace};
use crate::unit::Unit;

/// The summary of a spectrum.
pub fn spectrum_text(report: &SpectrumReport) -> String {
    let mut text = input_line(&report.input);
    if let Some(second) = &report.second {
        text.push_str(&input_line(second));
    }
    if report.chain.passes.iter().any(|pass| !pass.operators.is_empty() || pass.turns != 0) {
        text.push_str(&planned::operators_text(&report.chain, &report.input.axis));
    }
    let mut told = String::new();
    for channel in &report.channels {
        for trace in &channel.traces {
            // Channels share their method: it is told again only where it differs.
            let method = method_text(trace);
            if method != told {
                text.push_str(&method);
                told = method;
            }
        }
    }
    for channel in &report.channels {
        text.push_str(&channel_text(channel));
    }
    text.push_str(&notes_text(&report.notes));
    for channel in &report.channels {
        text.push_str(&notes_text(&channel.notes));
    }
    for output in &report.outputs {
        text.push_str(&format!("wrote {}\n", escape(&output.path)));
    }
    text
}

fn method_text(trace: &Trace) -> String {
    let mut text = String::new();
    if let Some(density) = &trace.density {
        text.push_str(&density_text(density));
    }
    if let Some(coefficients) = &trace.coefficients {
        text.push_str(&format!(
            "coefficients: {}\nfrequencies {} {} apart, finer than the record resolves (twice that)\n",
            coefficients.formula,
            figure(coefficients.spacing, 6),
            coefficients.frequency_unit
        ));
    }
    text
}

fn density_text(density: &DensityReport) -> String {
    let unit = density.frequency_unit;
    let along = if unit == "Hz" { "s" } else { "m" };
    let mut text = match (&density.segments, &density.window) {
        (Some(segments), Some(window)) => format!(
            "Welch's density: {} window, {} segment{} of {} samples ({} {along}), {} % overlap, {}\n",
            window.name,
            segments.count,
            if segments.count == 1 { "" } else { "s" },
            segments.samples,
            figure(segments.length, 6),
            figure(100.0 * segments.overlap, 4),
            density.detrend,
        ),
        _ => {
            let [least, most] = density.tapers.unwrap_or_default();
            let count = if least == most { least.to_string() } else { format!("{least} to {most}") };
            format!("density by {count} sine tapers over the whole record, {}\n", density.detrend)
        }
    };
    let range = |[least, most]: [f64; 2]| {
        if least == most { figure(least, 5) } else { format!("{} to {}", figure(least, 4), figure(most, 4)) }
    };
    let [low, high] = density.limit_factors;
    text.push_str(&format!(
        "lines {} {unit} apart, noise bandwidth {} {unit}, up to {} degrees of freedom: {} % limits from {} to {} times the estimate\n",
        figure(density.spacing, 6),
        range(density.noise_bandwidth),
        figure(density.freedom[1], 4),
        figure(100.0 * density.confidence, 4),
        figure(low, 3),
        figure(high, 3),
    ));
    text.push_str(&format!("one-sided: {}\n", density.formula));
    text.push_str(
        "limits hold for noise that is the same throughout; of tones the line and its error below tell more\n",
    );
    text
}

fn channel_text(channel: &ChannelSpectrum) -> String {
    let mut text = String::new();
    for trace in &channel.traces {
        let label = if channel.traces.len() > 1 { format!(", {}", escape(&trace.label)) } else { String::new() };
        text.push_str(&format!("\n{}{label}{}\n", escape(&channel.name), in_brackets(&trace.unit)));
        if let Some(extension) = &trace.extension {
            let baseline = trace.baseline.as_deref().unwrap_or("none");
            text.push_str(&format!("  {}, baseline {baseline}\n", extension_text(extension)));
        }
        if let Some(density) = &trace.density {
            text.push_str(&sum_text(density, &trace.unit));
        }
        if let Some(coefficients) = &trace.coefficients {
            text.push_str(&coefficients_text(coefficients));
        }
        text.push_str(&lines_text(trace));
        text.push_str(&bands_text(trace));
        if let Some(road) = &trace.road {
            text.push_str(&format!(
                "  road class {}: G(0.1/m) = {} m3 ({} to {}: {}), from {} to {} cycles/m; best line: waviness {} ± {}\n",
                road.class,
                figure(road.density_at_reference, 3),
                figure(road.limits[0], 3),
                figure(road.limits[1], 3),
                road.classes,
                figure(road.range[0], 3),
                figure(road.range[1], 3),
                figure(road.waviness, 3),
                figure(road.waviness_error, 2),
            ));
        }
    }
    if let Some(ratio) = &channel.ratio {
        text.push_str(&format!(
            "  {} over {}: {} of {} lines differ beyond their limits (about {} would by chance)\n",
            escape(&ratio.of[0]),
            escape(&ratio.of[1]),
            ratio.differing,
            ratio.ratio.len(),
            figure(ratio.by_chance, 2)
        ));
    }
    text
}

fn sum_text(density: &DensityReport, unit: &Unit) -> String {
    let check = &density.sum_check;
    let square = match unit.to_string() {
        label if label.is_empty() => label,
        label if label.chars().all(char::is_alphabetic) => format!(" {label}2"),
        label => format!(" ({label})2"),
    };
    let difference = match check.difference {
        Some(share) => format!(" ({:+.2} %)", 100.0 * share),
        None => String::new(),
    };
    let identity = match check.rounding {
        Some(rounding) => format!("; weighted mean square equal to {}", figure(rounding, 1)),
        None => String::new(),
    };
    format!(
        "  density in {}: lines sum to {}{square}, mean square {}{square}{difference}{identity}\n",
        density.unit,
        figure(check.sum, 6),
        figure(check.mean_square, 6),
    )
}

fn coefficients_text(found: &CoefficientsReport) -> String {
    let mut rows = table(&["coefficient", "frequency", "half-cycles", "wavelength", "value", "amplitude", "energy"]);
    let along = if found.frequency_unit == "Hz" { "s" } else { "m" };
    for row in &found.largest {
        rows.add_row(vec![
            format!("{} {}", row.index, if row.cosine { "cos" } else { "sin" }),
            format!("{} {}", figure(row.frequency, 6), found.frequency_unit),
            figure(row.half_cycles, 6),
            row.wavelength.map_or_else(|| "-".to_owned(), |w| format!("{} {along}", figure(w, 5))),
            figure(row.value, 5),
            figure(row.amplitude, 5),
            format!("{:.2} %", 100.0 * row.share),
        ]);
    }
    format!(
        "  energy of samples and coefficients equal to {}; {} coefficients hold 99 % of it\n{}",
        figure(found.parseval, 1),
        found.for_99_percent,
        indented(&rows)
    )
}

fn lines_text(trace: &Trace) -> String {
    let Some(density) = trace.density.as_ref().filter(|_| !trace.lines.is_empty()) else { return String::new() };
    let mut rows = table(&["line", "±", "amplitude", "±", "RMS", "above noise", "steady"]);
    for line in &trace.lines {
        rows.add_row(vec![
            format!("{} {}", figure(line.frequency, 6), density.frequency_unit),
            figure(line.frequency_error, 2),
            figure(line.amplitude, 4),
            figure(line.amplitude_error, 2),
            figure(line.rms, 4),
            format!("{:.1} dB", line.above_noise_db),
            format!("{:.0} %", 100.0 * line.steadiness),
        ]);
    }
    indented(&rows)
}

fn bands_text(trace: &Trace) -> String {
    let mut text = String::new();
    if !trace.bands.is_empty() {
        let mut rows = table(&["band", "RMS", "from", "to", "lines", "of the mean square"]);
        for band in &trace.bands {
            rows.add_row(vec![
                band.text.clone(),
                figure(band.rms, 4),
                figure(band.lower, 4),
                figure(band.upper, 4),
                figure(band.lines, 4),
                format!("{:.2} %", 100.0 * band.share),
            ]);
        }
        text.push_str(&indented(&rows));
    }
    if trace.octaves.iter().any(|band| band.rms.is_some()) {
        let reference = trace.octaves.iter().find_map(|band| band.reference);
        let level = reference.map_or_else(String::new, |r| format!("dB re {r}"));
        let mut rows = table(&["mid-frequency", "RMS", "from", "to", "lines", &level]);
        for band in trace.octaves.iter().filter(|band| band.rms.is_some()) {
            let shown = |value: Option<f64>| value.map_or_else(|| "-".to_owned(), |v| figure(v, 4));
            rows.add_row(vec![
                format!("{} Hz", figure(band.nominal, 6)),
                shown(band.rms),
                shown(band.lower),
                shown(band.upper),
                figure(band.lines, 4),
                band.level_db.map_or_else(String::new, |db| format!("{db:.1}")),
            ]);
        }
        text.push_str(&indented(&rows));
    }
    text
}

fn in_brackets(unit: &Unit) -> String {
    if unit.is_unknown() { String::new() } else { format!(" [{unit}]") }
}
