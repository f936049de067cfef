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
    let mut text = format!("{}: {format}, {} bytes, ", escape(&report.path), report.bytes);
    match &report.axis {
        Some(axis) => text.push_str(&format!("{}\n", axis_text(axis, report.audit.rows))),
        None => text.push_str(&format!("{}\n", counted(report.audit.rows, "row"))),
    }
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
    let mut rows = table(&[
        "channel", "unit", "mean", "RMS", "peak", "crest", "kurtosis", "noise", "step", "bits", "clipped", "spikes",
        "missing", "ends",
    ]);
    for channel in &report.audit.channels {
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
            if channel.unit.is_unknown() { "-".to_owned() } else { channel.unit.to_string() },
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
    text.push_str(&indented(&rows));
    text.push_str(&format!("{}\n", report.audit.estimate.sentence()));
    text.push_str(&notes_text(&report.audit.findings));
    if let Some(refusal) = &report.refusal {
        text.push_str(&format!("a run would be refused: {}\n", escape(refusal)));
    }
    text
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
