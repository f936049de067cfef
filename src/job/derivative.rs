//! What noise makes of a derivative, told beside it.

use crate::condition::{Outcome, scaling};
use crate::error::Finding;
use crate::numeric::{floor, sum};
use crate::operator::Chain;
use crate::place::Place;
use crate::record::Channel;
use crate::report::figure;

/// Noise above this share of the result's RMS is told.
const MUCH: f64 = 0.1;
/// Points of the integral over frequency.
const POINTS: usize = 2000;

/// A remark where the record's noise makes up much of its derivative: white noise of sigma a sample leaves
/// sigma sqrt(2 integral over f from 0 to 1/2 of (G (2 pi f)^turns)^2), without a filter sigma pi/sqrt(3) per step.
pub fn remark(channel: Channel<'_>, chain: &Chain, outcome: &Outcome) -> Option<Finding> {
    let turns = chain.turns();
    let whole = sum::standard_deviation(&outcome.output);
    if turns <= 0 || whole <= 0.0 {
        return None;
    }
    let power = |n: usize| {
        let f = (n as f64 + 0.5) / (2 * POINTS) as f64;
        (chain.gain(f) * (std::f64::consts::TAU * f).powi(turns)).powi(2)
    };
    let mean: f64 = (0..POINTS).map(power).sum::<f64>() / POINTS as f64;
    let (_, factor) = scaling(channel, chain);
    let noise = floor::sigma(channel.samples) * mean.sqrt() * factor.abs();
    let share = noise / whole;
    (share > MUCH).then(|| {
        let text = format!(
            "noise makes up about {} {}, {} % of the derivative's standard deviation; a --lowpass lowers that",
            figure(noise, 3),
            outcome.unit,
            figure(100.0 * share.min(1.0), 3)
        );
        Finding::new("derivative_of_noise", text).at(Place::channel(channel.name))
    })
}
