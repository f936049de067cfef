//! A plan for people: what a run would do, and the gain at and around each corner.

use crate::operator::{ChainDescription, Reach};
use crate::report::text::{extension_text, figure, indented, input_line, notes_text, table};
use crate::report::{AxisReport, Plan};

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
    }
    text.push_str(&notes_text(&plan.notes));
    text.push_str("nothing was written\n");
    text
}

/// The operators in the order in which they run, and their reach.
pub fn operators_text(chain: &ChainDescription, axis: &AxisReport) -> String {
    let mut text = String::new();
    let several = chain.passes.len() > 1;
    for (index, pass) in chain.passes.iter().enumerate() {
        let mut parts: Vec<String> =
            pass.operators.iter().map(|operator| format!("{} {}", operator.option, operator.value)).collect();
        parts.dedup(); // a band-pass stands for two gains
        if !pass.operators.is_empty() {
            parts.push(chain.shape.clone());
        }
        match pass.turns {
            0 => {}
            turns if turns > 0 => parts.push(format!("differentiate {turns}")),
            turns => parts.push(format!("integrate {}, starting at rest", -turns)),
        }
        if parts.is_empty() {
            parts.push("no operator: a plain conversion".to_owned());
        }
        let pass_text = if several { format!("pass {}: ", index + 1) } else { String::new() };
        let ends = if index > 0 { ", on the result, even ends" } else { "" };
        text.push_str(&format!("{pass_text}{}{ends}\n", parts.join(", ")));
    }
    let identity = chain.turns == 0 && chain.passes.iter().all(|pass| pass.operators.is_empty());
    if identity {
        return text;
    }
    match chain.reaches.reach {
        Reach::Samples(samples) => {
            text.push_str(&format!(
                "reach {} samples ({} {}): so far from each end the result depends on what is assumed past it",
                figure(samples, 4),
                figure(samples * axis.step, 4),
                axis.unit
            ));
            // Beyond it lies 1e-13 of the response: nothing that a double could show.
            if let Some(numeric) = chain.reaches.numeric.filter(|numeric| *numeric > 0.0) {
                text.push_str(&format!("; to the last digit, {} samples", figure(numeric, 4)));
            }
            text.push('\n');
        }
        Reach::Unbounded => {
            text.push_str("reach unbounded: the whole result depends on what is assumed past the ends\n")
        }
    }
    text
}
