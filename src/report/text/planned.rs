//! A plan for people: what a run would do, and the gain at and around each corner.

use crate::operator::{ChainDescription, OperatorDescription, PassDescription, PassEnds, Reach, Start};
use crate::report::text::{extension_text, figure, indented, input_line, notes_text, table};
use crate::report::{AxisReport, DespikeReport, Plan, SmoothReport, StrengthSource};
use crate::unit::counted;

/// The plan of a dry run.
pub fn plan_text(plan: &Plan) -> String {
    let mut text = input_line(&plan.input);
    text.push_str(&operators_text(&plan.chain, &plan.input.axis));
    if !plan.gains.is_empty() {
        let mut rows = table(&["corner", "where", "frequency", "gain"]);
        for point in &plan.gains {
            rows.add_row(vec![
                point.corner.clone(),
                match point.octave {
                    0 => "at it".to_owned(),
                    octave => format!("{octave:+} octave"),
                },
                format!("{} {}", figure(point.frequency, 6), point.unit),
                point.gain.map_or_else(|| "above Nyquist".to_owned(), |gain| figure(gain, 6)),
            ]);
        }
        text.push_str(&indented(&rows));
    }
    for channel in &plan.channels {
        let name = crate::place::escape(&channel.name);
        let unit = if channel.unit.is_unknown() { String::new() } else { format!(" [{}]", channel.unit) };
        text.push_str(&format!(
            "{name}{unit}: {}, baseline {}\n",
            extension_text(&channel.extension),
            channel.baseline
        ));
        text.push_str(&treated_text(&name, channel.despike.as_ref(), channel.smoothing.as_ref(), &plan.input.axis));
        if let Some(verdict) = &channel.verdict {
            text.push_str(&format!("{name}: {verdict}\n"));
        }
    }
    text.push_str(&notes_text(&plan.notes));
    for channel in &plan.channels {
        text.push_str(&notes_text(&channel.notes));
    }
    text.push_str("nothing was written\n");
    text
}

/// What was done to the samples of a channel themselves; empty where nothing was.
pub fn treated_text(
    name: &str,
    despike: Option<&DespikeReport>,
    smoothing: Option<&SmoothReport>,
    axis: &AxisReport,
) -> String {
    let mut text = String::new();
    if let Some(DespikeReport { count: 0, .. }) = despike {
        text.push_str(&format!("{name}: no spikes\n"));
    }
    if let Some(smoothing) = smoothing {
        let label = if axis.kind == "time" { "Hz" } else { "1/m" };
        let how = match smoothing.how {
            StrengthSource::Given => "as given",
            StrengthSource::CrossValidation => "by cross-validation",
        };
        let cut_off = match smoothing.cut_off {
            Some(hz) => format!("half gain at {} {label}", figure(hz, 4)),
            None => "over half gain everywhere".to_owned(),
        };
        let outliers = match smoothing.outliers {
            Some(count) => format!(", {count} outliers without weight"),
            None => String::new(),
        };
        text.push_str(&format!(
            "{name}: smoothed with strength {} ({how}), {cut_off}, {} degrees of freedom{outliers}\n",
            figure(smoothing.strength, 4),
            figure(smoothing.degrees_of_freedom, 4),
        ));
    }
    text
}

fn rate_label(axis: &AxisReport) -> &'static str {
    if axis.kind == "time" { "Hz" } else { "samples/m" }
}

/// An operator with its argument; a split is always Gaussian.
fn named(operator: &OperatorDescription) -> String {
    let shape = if operator.option == "split" { " (gaussian, ISO 16610-21)" } else { "" };
    format!("{} {}{shape}", operator.option, operator.value)
}

/// The operators in the order in which they run, and their reach.
pub fn operators_text(chain: &ChainDescription, axis: &AxisReport) -> String {
    let mut text = String::new();
    let several = chain.passes.len() > 1;
    for (index, pass) in chain.passes.iter().enumerate() {
        let mut parts: Vec<String> = Vec::new();
        if index == 0 && chain.despike {
            parts.push("spikes replaced".to_owned());
        }
        let is_filter = |operator: &&OperatorDescription| {
            !matches!(operator.kind, "weighting" | "response" | "smoothing" | "anti_alias")
        };
        // Smoothing and resampling are told at the end, whether they have a gain or not.
        let first = pass.operators.iter().filter(|operator| matches!(operator.kind, "weighting" | "response"));
        parts.extend(first.map(|operator| format!("{} {}", operator.option, operator.value)));
        let before = parts.len();
        parts.extend(pass.operators.iter().filter(is_filter).map(named));
        parts.dedup(); // a band-pass stands for two gains
        // The roll-off belongs to the filters alone, and a split is always Gaussian.
        let shaped = pass.operators.iter().filter(is_filter).any(|operator| operator.option != "split");
        if parts.len() > before && shaped {
            parts.push(chain.shape.clone());
        }
        match pass.turns {
            0 => {}
            turns if turns > 0 => parts.push(format!("differentiate {turns}")),
            turns => {
                let conditions = chain.conditions.as_deref().unwrap_or_default();
                parts.push(format!("integrate {}, end conditions {conditions}", -turns));
                parts.extend(chain.offset.as_ref().map(|offset| format!("offset {offset} taken off")));
            }
        }
        let last = index + 1 == chain.passes.len();
        let smooths = pass.robust || pass.operators.iter().any(|operator| operator.kind == "smoothing");
        if let Some(smooth) = chain.smooth.as_ref().filter(|smooth| smooths || (last && smooth.starts_with("auto"))) {
            parts.push(format!("smooth {smooth}"));
        }
        if let Some(grid) = chain.resampling.as_ref().filter(|_| pass.resamples) {
            let against =
                if grid.rate < grid.rate_in { ", raised cosine from 0.8 of the new Nyquist frequency" } else { "" };
            parts.push(format!("resample to {} {}{against}", figure(grid.rate, 8), rate_label(axis)));
        }
        if parts.is_empty() {
            parts.push("no operator: a plain conversion".to_owned());
        }
        let pass_text = if several { format!("pass {}: ", index + 1) } else { String::new() };
        let ends = match pass.ends {
            PassEnds::EvenWithoutBaseline => ", on the result, even ends",
            PassEnds::Chosen if index > 0 => ", on the result",
            PassEnds::Chosen => "",
        };
        text.push_str(&format!("{pass_text}{}{ends}\n", parts.join(", ")));
    }
    if let Some(grid) = &chain.resampling {
        let unit = &axis.unit;
        let kept = match grid.start {
            Start::Kept => "as in the record".to_owned(),
            Start::Centre => format!(
                "{} {unit} {} the first of the record: half the difference of the steps",
                figure(grid.shift.abs(), 6),
                if grid.shift < 0.0 { "before" } else { "after" }
            ),
        };
        text.push_str(&format!(
            "{} samples at {} {} from {} {unit} on, {kept}\n",
            grid.samples,
            figure(grid.rate, 8),
            rate_label(axis),
            figure(grid.first_stamp, 10)
        ));
    }
    let plain = |pass: &PassDescription| pass.operators.is_empty();
    let identity = chain.turns == 0 && chain.passes.iter().all(plain);
    if identity {
        return text;
    }
    match chain.reaches.reach {
        Reach::Samples(samples) => {
            text.push_str(&format!(
                "reach {} ({} {}): so far from each end the result depends on what is assumed past it",
                counted(figure(samples, 4), "sample"),
                figure(samples * axis.step, 4),
                axis.unit
            ));
            // Beyond it lies 1e-13 of the response: nothing that a double could show.
            if let Some(numeric) = chain.reaches.numeric.filter(|numeric| *numeric > 0.0) {
                text.push_str(&format!("; to the last digit, {}", counted(figure(numeric, 4), "sample")));
            }
            text.push('\n');
        }
        Reach::Unbounded => {
            text.push_str("reach unbounded: the whole result depends on what is assumed past the ends\n")
        }
    }
    text
}
