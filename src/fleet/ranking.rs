//! The channels of a batch by edge error: the worst of them whole, all of them as numbers.

use serde::Serialize;
use serde_json::Value;

use crate::fleet::table::{at, ratio};

/// Channels kept whole at most.
pub const WORST: usize = 200;

/// A channel with its edge error.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct Ranked {
    /// Number of the record in the list.
    pub record: u64,
    /// The record's name.
    pub path: String,
    /// The channel.
    pub channel: String,
    /// Unit of the output.
    pub unit: String,
    /// What was assumed past the ends.
    pub extension: String,
    /// Predicted error at the ends, in `unit`.
    pub edge_error: f64,
    /// The same in per cent of the output's standard deviation.
    pub percent_of_deviation: Option<f64>,
    /// What the error stays below in about 95 of 100 records, in `unit`.
    pub bound: Option<f64>,
    /// The tolerance that it was judged by, in `unit`.
    pub tolerance: f64,
    /// The error in per cent of it.
    pub percent_of_tolerance: f64,
    /// `within`, `borderline` or `outside`.
    pub adequacy: Option<String>,
    /// First and last stamp of the trusted output.
    pub trusted: Option<[f64; 2]>,
    /// Unit of the stamps.
    pub axis_unit: String,
    #[serde(skip)]
    index: usize,
}

/// All channels, ranked by edge error over tolerance.
#[derive(Debug, Clone, Default)]
pub struct Ranking {
    worst: Vec<Ranked>,
    of_deviation: Vec<f64>,
    of_tolerance: Vec<f64>,
}

impl Ranking {
    /// Takes the judged channels of a line of results in.
    pub fn count(&mut self, line: &Value) {
        for (index, channel) in line["channels"].as_array().into_iter().flatten().enumerate() {
            let verdict = &channel["verdict"];
            let share = ratio(&verdict["predicted_error"], &verdict["output_deviation"]).map(|share| 100.0 * share);
            self.of_deviation.extend(share);
            let Some(ratio) = ratio(&verdict["predicted_error"], &verdict["tolerance"]) else { continue };
            self.of_tolerance.push(100.0 * ratio);
            let text = |value: &Value| value.as_str().unwrap_or_default().to_owned();
            let trusted = &channel["trusted"];
            self.worst.push(Ranked {
                record: line["record"].as_u64().unwrap_or_default(),
                path: text(&line["path"]),
                channel: text(&channel["name"]),
                unit: text(&channel["unit"]),
                extension: text(at(channel, "extension.kind")),
                edge_error: verdict["predicted_error"].as_f64().unwrap_or_default(),
                percent_of_deviation: share,
                bound: verdict["bound"].as_f64(),
                tolerance: verdict["tolerance"].as_f64().unwrap_or_default(),
                percent_of_tolerance: 100.0 * ratio,
                adequacy: verdict["adequacy"].as_str().map(str::to_owned),
                trusted: trusted["from"].as_f64().zip(trusted["to"].as_f64()).map(|(from, to)| [from, to]),
                axis_unit: text(at(line, "input.axis.unit")),
                index,
            });
        }
        // Sorted now and then, not at every line: the store stays small and the work linear.
        if self.worst.len() > 4 * WORST {
            self.worst = self.worst();
        }
    }

    /// The worst channels, worst first; alike ones in the order of the list.
    pub fn worst(&self) -> Vec<Ranked> {
        let mut worst = self.worst.clone();
        worst.sort_by(|a, b| {
            let place = |ranked: &Ranked| (ranked.record, ranked.index);
            b.percent_of_tolerance.total_cmp(&a.percent_of_tolerance).then(place(a).cmp(&place(b)))
        });
        worst.truncate(WORST);
        worst
    }

    /// Edge errors of all channels in per cent of their output's standard deviation, smallest first.
    pub fn of_deviation(&self) -> Vec<f64> {
        sorted(&self.of_deviation)
    }

    /// The same in per cent of their tolerance.
    pub fn of_tolerance(&self) -> Vec<f64> {
        sorted(&self.of_tolerance)
    }
}

fn sorted(values: &[f64]) -> Vec<f64> {
    let mut sorted = values.to_vec();
    sorted.sort_by(f64::total_cmp);
    sorted
}

#[cfg(test)]
mod tests {
    use serde_json::json;

    use super::*;

    #[test]
    fn the_worst_are_kept_in_whatever_order_they_come() {
        let line = |record: u64| {
            // Two records in three hundred of every size: alike ones keep the order of the list.
            let error = (record % 300) as f64;
            json!({"record": record, "path": "a", "channels": [{"name": "x", "verdict": {"predicted_error": error, "tolerance": 10.0}}]})
        };
        let (mut up, mut down) = (Ranking::default(), Ranking::default());
        (0..600).for_each(|record| up.count(&line(record)));
        (0..600).rev().for_each(|record| down.count(&line(record)));
        let worst = up.worst();
        assert_eq!(worst, down.worst());
        assert_eq!(worst.len(), WORST);
        let firsts: Vec<(u64, f64)> = worst[..3].iter().map(|w| (w.record, w.percent_of_tolerance)).collect();
        assert_eq!(firsts, [(299, 2990.0), (599, 2990.0), (298, 2980.0)]);
        assert_eq!(up.of_tolerance().len(), 600, "all of them as numbers");
    }
}
