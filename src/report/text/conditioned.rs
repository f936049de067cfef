//! The summary of a conditioned record.

use std::collections::BTreeSet;

use crate::compare::standings_text;
use crate::place::escape;
use crate::report::text::integrated::integral_text;
use crate::report::text::{extension_text, figure, indented, input_line, notes_text, table, unmet_text};
use crate::report::{ChannelReport, Report, SplitReport};

/// A short summary for people: what was read, assumed, done and written, with RMS and peak before and after.
pub fn summary(report: &Report) -> String {
    let mut text = input_line(&report.input);
    text.push_str(&super::planned::operators_text(&report.chain, &report.input.axis));
    let assumed: BTreeSet<String> = report.channels.iter().map(|c| extension_text(&c.extension)).collect();
    for line in assumed {
        text.push_str(&format!("{line}\n"));
    }
    let mut rows = table(&["channel", "ends", "baseline", "RMS in", "RMS out", "peak in", "peak out", "unit"]);
    for channel in &report.channels {
        let shown = |value: Option<f64>| value.map_or_else(|| "-".to_owned(), |v| figure(v, 4));
        let unit = if channel.unit == channel.unit_in {
            channel.unit.to_string()
        } else {
            format!("{} -> {}", channel.unit_in, channel.unit)
        };
        rows.add_row(vec![
            escape(&channel.name),
            channel.extension.kind.clone(),
            channel.baseline.kind.clone(),
            shown(channel.rms.before),
            shown(channel.rms.after),
            shown(channel.level.before.as_ref().map(|l| l.peak)),
            shown(channel.level.after.as_ref().map(|l| l.peak)),
            unit,
        ]);
    }
    text.push_str(&indented(&rows));
    for channel in &report.channels {
        let name = escape(&channel.name);
        let (despike, smoothing) = (channel.despike.as_ref(), channel.smoothing.as_ref());
        text.push_str(&super::planned::treated_text(&name, despike, smoothing, &report.input.axis));
    }
    let axis_unit = report.input.axis.unit.to_string();
    text.push_str(&super::exposed::exposures_text(&report.channels, &axis_unit, report.caution));
    for channel in &report.channels {
        if let Some(verdict) = &channel.verdict {
            text.push_str(&format!("{}: {}\n", escape(&channel.name), verdict.sentence));
        } else if !channel.assertions.is_empty() {
            text.push_str(&format!("{}: asserted {}\n", escape(&channel.name), standings_text(&channel.assertions)));
        }
    }
    for channel in &report.channels {
        if let Some(split) = &channel.split {
            text.push_str(&split_text(channel, split));
        }
    }
    for channel in &report.channels {
        if let Some(integral) = &channel.integral {
            text.push_str(&integral_text(&channel.name, integral, &channel.unit, &report.input.axis));
        }
    }
    text.push_str(&notes_text(&report.notes));
    for channel in &report.channels {
        text.push_str(&notes_text(&channel.notes));
    }
    text.push_str(&unmet_text(&report.unmet));
    for output in &report.outputs {
        if output.path == "-" {
            text.push_str("wrote to standard output\n");
        } else {
            text.push_str(&format!("wrote {0} and {0}.json\n", escape(&output.path)));
        }
    }
    text
}

/// `z: split at 8mm, waviness RMS 12.3 um, roughness RMS 1.2 um; end treatment: ...`.
fn split_text(channel: &ChannelReport, split: &SplitReport) -> String {
    let rms = |level: &Option<crate::audit::level::Level>| {
        let value = level.as_ref().map_or_else(|| "-".to_owned(), |l| figure(l.rms, 4));
        format!("{value} {}", channel.unit).trim_end().to_owned()
    };
    format!(
        "{}: split at {}, waviness RMS {}, roughness RMS {}; end treatment: {}\n",
        escape(&channel.name),
        split.corner,
        rms(&split.waviness),
        rms(&split.roughness),
        channel.extension.end_treatment
    )
}
