//! An audit for people: one block a record.

use crate::audit::clip::{Certainty, Clipping};
use crate::audit::endstate::Motion;
use crate::place::escape;
use crate::record::Format;
use crate::report::AuditReport;
use crate::report::text::{axis_text, figure, indented, notes_text, table};
use crate::unit::counted;

/// The audit of one file.
pub fn audit_text(report: &AuditReport) -> String {
    let format = match report.format {
        Format::Csv => "CSV",
        Format::Wav => "WAV",
    };
    let mut text = format!("{}: {format}, {} bytes, {} rows\n", escape(&report.path), report.bytes, report.audit.rows);
    if let Some(stamps) = &report.audit.stamps {
        let gaps = if stamps.missing > 0 {
            format!(", {} missing in {}", counted(stamps.missing, "row"), counted(stamps.gaps.len(), "gap"))
        } else {
            String::new()
        };
        text.push_str(&format!(
            "stamps {}, resolution {} {}{gaps}\n",
            spacing_text(stamps.spacing),
            figure(stamps.resolution, 4),
            stamps.unit
        ));
    }
    for (index, record) in report.records.iter().enumerate() {
        let name = if report.records.len() > 1 { format!("record {}: ", index + 1) } else { String::new() };
        match (&record.axis, record.parts) {
            (Some(axis), 0 | 1) => text.push_str(&format!("{name}{}\n", axis_text(axis, record.samples))),
            (Some(axis), parts) => text.push_str(&format!(
                "{name}{} samples in {parts} parts between gaps, {} {}\n",
                record.samples,
                figure(axis.rate, 8),
                if axis.kind == "time" { "Hz" } else { "samples/m" }
            )),
            (None, _) => text.push_str(&format!("{name}no regular record\n")),
        }
        if record.repaired > 0 {
            text.push_str(&format!("{} samples would be filled in\n", record.repaired));
        }
        text.push_str(&channels_text(report, &record.channels));
        if let Some(refusal) = &record.refusal {
            text.push_str(&format!("a run would be refused: {}\n", escape(refusal)));
        }
    }
    let estimate = &report.audit.estimate;
    text.push_str(&format!(
        "a run will take about {} MiB and {} s\n",
        estimate.bytes.div_ceil(1 << 20),
        figure(estimate.seconds, 1)
    ));
    text.push_str(&notes_text(&report.audit.findings));
    if !report.requirement_met {
        text.push_str("not clean: --require is not met\n");
    }
    text
}

/// The channels of one record.
fn channels_text(report: &AuditReport, names: &[String]) -> String {
    let mut rows = table(&[
        "channel", "unit", "from", "mean", "RMS", "peak", "crest", "kurtosis", "noise", "step", "bits", "clipped",
        "spikes", "missing", "ends",
    ]);
    let chosen = report.audit.channels.iter().zip(&report.unit_sources).filter(|(c, _)| names.contains(&c.name));
    for (channel, source) in chosen {
        let level = channel.level.as_ref();
        let shown = |value: Option<f64>| value.map_or_else(|| "-".to_owned(), |v| figure(v, 4));
        let ends = match channel.end.as_ref().map(|end| end.motion) {
            Some(Motion::AtRest) => "at rest",
            Some(Motion::Between) => "nearly at rest",
            Some(Motion::Moving) => "moving",
            None => "-",
        };
        rows.add_row(vec![
            escape(&channel.name),
            if channel.unit.is_unknown() { "-".to_owned() } else { escape(channel.unit.label()) },
            source.unwrap_or("-").to_owned(),
            shown(level.map(|l| l.mean)),
            shown(level.map(|l| l.rms)),
            shown(level.map(|l| l.peak)),
            shown(level.and_then(|l| l.crest_factor)),
            shown(level.and_then(|l| l.kurtosis)),
            shown(channel.noise),
            shown(channel.quantisation.lsb),
            shown(channel.quantisation.bits.map(|bits| (bits * 10.0).round() / 10.0)),
            clipped_text(&channel.clipping),
            channel.spikes.count.to_string(),
            channel.missing.to_string(),
            ends.to_owned(),
        ]);
    }
    indented(&rows)
}

fn clipped_text(clipping: &Clipping) -> String {
    let sides = [&clipping.low, &clipping.high];
    let found: Vec<_> = sides.into_iter().flatten().collect();
    if found.is_empty() {
        return "no".to_owned();
    }
    let count: usize = found.iter().map(|clip| clip.count).sum();
    let certain = found.iter().any(|clip| clip.certainty == Certainty::Certain);
    format!("{count} {}", if certain { "certain" } else { "likely" })
}

fn spacing_text(spacing: crate::record::Spacing) -> &'static str {
    use crate::record::Spacing;
    match spacing {
        Spacing::Uniform => "even to their print resolution",
        Spacing::NearUniform => "even but for deviations too small to matter",
        Spacing::Drifting => "drifting",
        Spacing::Slipped => "slipped: the clock jumped by a part of a step",
        Spacing::Jittered => "jittered",
        Spacing::Irregular => "irregular",
        Spacing::Unresolved => "too coarse to tell the spacing",
        Spacing::Repeated => "repeated",
        Spacing::Backwards => "going back",
        Spacing::Single => "single",
    }
}
