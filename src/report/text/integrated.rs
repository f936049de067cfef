//! An integral for people: what its end conditions found, and how uncertain noise leaves it.

use crate::place::escape;
use crate::report::text::figure;
use crate::report::{Amount, AxisReport, IntegralReport};
use crate::unit::Unit;

/// Two lines: the constants, then the uncertainty with the high-pass that would lower it.
pub fn integral_text(name: &str, integral: &IntegralReport, unit: &Unit, axis: &AxisReport) -> String {
    let name = escape(name);
    let shown = |value: f64| with_unit(value, unit);
    let amount = |amount: &Amount| with_unit(amount.value, &amount.unit);
    let solved: Vec<String> =
        [("offset", &integral.offset), ("drift", &integral.drift), ("initial first integral", &integral.initial_first)]
            .into_iter()
            .filter(|(_, found)| found.value != 0.0)
            .map(|(what, found)| format!("{what} {}", amount(found)))
            .chain(
                integral
                    .initial_second
                    .as_ref()
                    .filter(|found| found.value != 0.0)
                    .map(|found| format!("initial second integral {}", amount(found))),
            )
            .collect();
    let solved = if solved.is_empty() { "nothing solved".to_owned() } else { solved.join(", ") };
    let mut text = format!("{name}: end conditions {}: {solved}\n", integral.conditions);
    let sigma = &integral.sigma;
    text.push_str(&format!(
        "{name}: noise of {} a sample leaves a standard deviation of {} in the middle, at most {} at {} {} ({} % of the peak)",
        amount(&integral.noise),
        shown(sigma.middle),
        shown(sigma.largest),
        figure(sigma.at, 6),
        axis.unit,
        figure(100.0 * sigma.relative, 3),
    ));
    if let Some(corner) = &integral.corner {
        text.push_str(&format!(
            "; --highpass {}{} leaves {} inside",
            figure(corner.frequency, 3),
            corner_unit(corner.unit),
            shown(corner.sigma)
        ));
    }
    text.push('\n');
    text
}

fn with_unit(value: f64, unit: &Unit) -> String {
    format!("{} {unit}", figure(value, 3)).trim_end().to_owned()
}

/// As a corner is written: `0.5Hz`, `2/m`.
fn corner_unit(unit: &str) -> &str {
    unit.strip_prefix('1').unwrap_or(unit)
}
