//! The verdict in words.

use crate::record::Axis;
use crate::unit::Unit;

use super::{Edge, Level, Pick, Trusted, Verdict};

impl Verdict {
    /// The pick among the symmetric extensions in one sentence.
    pub fn pick_sentence(&self) -> String {
        let pick = &self.pick;
        match pick.level {
            Level::SupportedByStructure => {
                let join = self.structure.periodic.map_or(String::new(), |join| {
                    format!(" (T = {:.1}; {} % of interior pairs do)", join.ratio, rounded(100.0 * join.share))
                });
                format!("{} supported by structure: the ends join as smoothly as the interior{join}", pick.name)
            }
            Level::Supported => format!("{} supported: next best is {:.1}x worse", pick.name, margin(pick)),
            Level::Favoured => format!("{} favoured: next best is {:.1}x worse", pick.name, margin(pick)),
            Level::NoClearWinner => {
                let immaterial =
                    if pick.choice_immaterial { ", and the choice is immaterial at this tolerance" } else { "" };
                format!(
                    "no clear winner among {}: the record does not tell them apart{immaterial}",
                    pick.ties.join(", ")
                )
            }
            Level::NotJudged => match self.unjudged {
                Some(reason) => format!("not judged: {reason}"),
                None => "not judged".to_owned(),
            },
        }
    }

    /// The predicted edge error of one extension in `unit` and relative.
    pub fn cost(&self, edge: &Edge, unit: &Unit) -> String {
        let unit = if unit.is_unknown() { String::new() } else { format!(" {unit}") };
        let share = rounded(100.0 * edge.predicted_error / self.output_deviation);
        format!("about {}{unit}, {share} % of output s.d.", rounded(edge.predicted_error))
    }

    /// Edge error in `unit` and trusted span along `axis` of one extension in one sentence.
    pub fn edge_sentence(&self, edge: &Edge, unit: &Unit, axis: &Axis) -> String {
        let len = axis.len();
        let label = if unit.is_unknown() { String::new() } else { format!(" {unit}") };
        let adequacy = edge.adequacy.word();
        let span = match edge.trusted {
            Some(Trusted { first, last }) => {
                let stamp = |n: usize| (axis.stamp(n) * 1e9).round() / 1e9;
                format!("trusted span {first}..{last} of {len} ({}..{} {})", stamp(first), stamp(last), axis.unit())
            }
            None => "no trusted span".to_owned(),
        };
        format!(
            "edge error {} (bound {}{label}, {} %, events outside the record excepted), {adequacy}; {span}",
            self.cost(edge, unit),
            rounded(edge.bound),
            rounded(100.0 * edge.bound / self.output_deviation),
        )
    }
}

fn margin(pick: &Pick) -> f64 {
    pick.margin.unwrap_or(1.0)
}

/// Two significant digits.
fn rounded(value: f64) -> String {
    if value == 0.0 || !value.is_finite() {
        return value.to_string();
    }
    let digits = (1 - value.abs().log10().floor() as i32).clamp(0, 12) as usize;
    format!("{value:.digits$}")
}

#[cfg(test)]
mod tests {
    use super::rounded;

    #[test]
    fn two_digits_are_kept() {
        let cases = [(6.44, "6.4"), (0.3, "0.30"), (37.7, "38"), (0.0123, "0.012"), (0.0, "0"), (1234.0, "1234")];
        for (value, text) in cases {
            assert_eq!(rounded(value), text);
        }
    }
}
