//! Edge errors of derivatives and integrals: in the unit of the output, and the same by either way of computing.

use super::*;
use crate::operator::{Request, Shape as Rolloff};
use crate::record::{Axis, RateSource};
use crate::unit::Unit;
use crate::verdict::{Formed, Past, Tolerance};

const LEN: usize = 4000;

/// A wander with a trend.
fn wander() -> Vec<f64> {
    let mut state = 77u64;
    let mut draw = || {
        state = state.wrapping_mul(6364136223846793005).wrapping_add(1442695040888963407);
        (state >> 11) as f64 / (1u64 << 53) as f64 - 0.5
    };
    let (mut value, mut drift) = (0.0, 0.0);
    let mut step = |n: usize| {
        drift = 0.99 * drift + draw();
        value = 0.97 * value + drift;
        value + 0.05 * n as f64
    };
    (0..LEN).map(&mut step).collect()
}

fn chain_of(pairs: &[(&str, &str)], axis: &Axis) -> Chain {
    let requests: Vec<Request> = pairs.iter().map(|(k, v)| Request::parse(k, v).expect("a request")).collect();
    Chain::resolve(&requests, &Rolloff::parse("butterworth:4").expect("a shape"), axis, LEN).expect("a chain").0
}

#[test]
fn edge_errors_of_a_derivative_follow_the_rate() {
    let samples = wander();
    let unit = Unit::parse("m/s2");
    let errors = [(100.0, "2Hz"), (1000.0, "20Hz")].map(|(rate, corner)| {
        let axis = Axis::from_rate_hz(rate, LEN, RateSource::Given).expect("an axis");
        let chain = chain_of(&[("lowpass", corner), ("differentiate", "1")], &axis);
        let channel = Channel { name: "a", unit: &unit, axis: &axis, samples: &samples };
        let judged =
            judge(channel, &chain, Seat::Half, &ToleranceRequest::default(), &Planner::new()).expect("a judgement");
        let verdict = judged.verdict.expect("a verdict");
        let forecast = verdict.edge("forecast").expect("a row").predicted_error;
        (verdict.edge("even").expect("a row").predicted_error, forecast, verdict.output_deviation)
    });
    // The same samples ten times as fast: every slope is ten times as steep.
    let [slow, fast] = errors;
    for (a, b) in [(slow.0, fast.0), (slow.1, fast.1), (slow.2, fast.2)] {
        assert!((b / a / 10.0 - 1.0).abs() < 1e-9, "{a} {b}");
    }
}

#[test]
fn a_derivative_has_the_same_edges_from_blocks_and_from_whole_outputs() {
    let samples = wander();
    let unit = Unit::parse("m");
    let axis = Axis::from_rate_hz(100.0, LEN, RateSource::Given).expect("an axis");
    let planner = Planner::new();
    for (turns, corner) in [("1", "2Hz"), ("2", "2Hz"), ("1", "0.8Hz")] {
        let chain = chain_of(&[("lowpass", corner), ("differentiate", turns)], &axis);
        let channel = Channel { name: "d", unit: &unit, axis: &axis, samples: &samples };
        let (_, factor) = scaling(channel, &chain);
        let gain = |f: f64| factor * turned(chain.gain(f), f, chain.turns());
        let shortest_wavelength = chain.shortest_wavelength_samples().expect("a corner");
        let response = Response::of(Shape { gain: &gain, turns: chain.turns(), shortest_wavelength }, LEN);
        let estimates = verdict::estimates(&samples, &response, noise::sigma(&samples));
        let evidence = Evidence::gather(&samples, Evidence::block_length(shortest_wavelength)).expect("blocks");
        let forecast = Forecast::combine(&evidence, &response);
        let output = |extension: Extension<'_>| {
            let outcome = match extension {
                Extension::Symmetric(c) => condition(channel, &chain, c.ends, c.baseline, &planner),
                Extension::Continued { left, right } => {
                    condition_continued(channel, &chain, left, right, Seat::Half, &planner)
                }
            };
            outcome.expect("an output").output
        };
        let [left, right] = [Side::Left, Side::Right].map(|side| forecast.continuation(side));
        let foretold = output(Extension::Continued { left: &left, right: &right });
        let [near, whole] = [Formed::InOnePass, Formed::Otherwise].map(|formed| {
            let case = Case {
                samples: &samples,
                past: Ok(Past { evidence: &evidence, forecast: &forecast, foretold: &foretold }),
                structure: verdict::Structure::default(),
                estimates,
                response: &response,
                output: &output,
                formed,
                tolerance: Tolerance::Share(0.1),
            };
            Verdict::of(&case, FlatEnds::Ignored)
        });
        for (a, b) in near.edges.iter().zip(&whole.edges) {
            // Blocks of a 64th of a wavelength, and a thousandth of the kernel beyond two reaches of a trend.
            let ratio = a.predicted_error / b.predicted_error;
            assert!((ratio - 1.0).abs() < 0.03, "{} {turns} {corner}: {ratio}", a.name);
        }
    }
}

#[test]
fn a_displacement_is_judged_by_what_its_two_passes_write() {
    let samples: Vec<f64> = wander().windows(2).map(|w| w[1] - w[0] - 0.05).chain([0.0]).collect();
    let unit = Unit::parse("m/s2");
    let axis = Axis::from_rate_hz(100.0, LEN, RateSource::Given).expect("an axis");
    let chain = chain_of(&[("integrate", "2"), ("highpass", "0.5Hz")], &axis);
    assert!(chain.passes().len() == 2);
    let channel = Channel { name: "a", unit: &unit, axis: &axis, samples: &samples };
    let judged = judge(channel, &chain, Seat::Half, &ToleranceRequest::default(), &Planner::new()).expect("judged");
    let verdict = judged.verdict.expect("a verdict");
    assert_eq!(verdict.edges.len(), 11);
    assert!(verdict.edges.iter().all(|e| e.predicted_error.is_finite() && e.predicted_error > 0.0));
}
