//! A comparison of extensions for people.

use crate::compare::standings_text;
use crate::place::escape;
use crate::report::text::{figure, indented, input_line, notes_text, planned, table, unmet_text};
use crate::report::{ChannelComparison, Comparison};
use crate::verdict::Adequacy;

/// Every extension side by side, then the verdict in one sentence a channel.
pub fn comparison_text(report: &Comparison) -> String {
    let mut text = input_line(&report.input);
    text.push_str(&planned::operators_text(&report.chain, &report.input.axis));
    for channel in &report.channels {
        text.push_str(&channel_text(channel, report));
    }
    text.push_str(&notes_text(&report.notes));
    for channel in &report.channels {
        text.push_str(&notes_text(&channel.notes));
    }
    text.push_str(&unmet_text(&report.unmet));
    text
}

fn channel_text(channel: &ChannelComparison, report: &Comparison) -> String {
    let unit = if channel.unit.is_unknown() { String::new() } else { format!(" [{}]", channel.unit) };
    let mut text = format!("\n{}{unit}\n", escape(&channel.name));
    let Some(verdict) = &channel.verdict else {
        let reason = channel.not_judged.map_or(String::new(), |reason| format!(": {reason}"));
        text.push_str(&format!("  nothing to judge{reason}\n"));
        if !channel.assertions.is_empty() {
            text.push_str(&format!("  asserted {}\n", standings_text(&channel.assertions)));
        }
        return text;
    };
    let mut rows = table(&[
        "extension",
        "edge error",
        "% of s.d.",
        "bound",
        "adequacy",
        "trusted",
        "jump",
        "slope jump",
        "leakage dB",
        "excess dB",
        "decay",
    ]);
    for row in &channel.candidates {
        let shown = |value: Option<f64>| value.map_or_else(|| "-".to_owned(), |v| figure(v, 3));
        let metric = |key: &str| shown(row.metrics.get(key).and_then(serde_json::Value::as_f64));
        let name = if row.reference { format!("({})", row.name) } else { row.name.to_owned() };
        rows.add_row(vec![
            name,
            shown(row.predicted_error),
            shown(row.relative_error.map(|r| 100.0 * r)),
            shown(row.bound),
            row.adequacy.map_or("-", adequacy_word).to_owned(),
            match row.trusted {
                Some(span) => format!("{}..{}", span.first, span.last),
                None if row.adequacy.is_some() => "none".to_owned(),
                None => "-".to_owned(),
            },
            metric("value_jump"),
            metric("slope_jump"),
            metric("leakage_share_db"),
            metric("leakage_excess_db"),
            metric("decay_exponent"),
        ]);
    }
    text.push_str(&indented(&rows));
    if let Some(ends) = &channel.edge {
        let side = |name: &str, end: &crate::baseline::EndEstimate| {
            format!(
                "{name} end: value {} ± {}, slope {} ± {} a step",
                figure(end.value, 4),
                figure(end.value_error, 2),
                figure(end.slope, 4),
                figure(end.slope_error, 2)
            )
        };
        text.push_str(&format!(
            "  {}; {}; noise {}\n",
            side("left", &ends.left),
            side("right", &ends.right),
            figure(ends.noise, 3)
        ));
    }
    if let Some(veto) = &channel.veto {
        let above = figure(veto.excess_over_even_db, 2);
        text.push_str(&format!("  leakage speaks against {}: {above} dB above even\n", veto.extension));
    }
    text.push_str(&format!("  {}\n", verdict.sentence));
    text.push_str(&format!("  condition would take {}", channel.takes));
    match &channel.trusted {
        Some(span) => text.push_str(&format!(
            ", trusted from {} to {} {}\n",
            figure(span.from, 6),
            figure(span.to, 6),
            report.input.axis.unit
        )),
        None => text.push('\n'),
    }
    text
}

fn adequacy_word(adequacy: Adequacy) -> &'static str {
    match adequacy {
        Adequacy::Within => "within",
        Adequacy::Borderline => "borderline",
        Adequacy::Outside => "outside",
    }
}
