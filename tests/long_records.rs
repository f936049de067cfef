//! Long records worked on in blocks equal the transform of their own length.

use endgrain::baseline::{Baseline, BaselineKind, Scale};
use endgrain::basis::Planner;
use endgrain::condition::{Layout, Span, apply, apply_whole};
use endgrain::ends::{Ends, Seat};
use endgrain::numeric::sum::rms;
use endgrain::operator::{Chain, Pass, Request, Shape};
use endgrain::record::{Axis, RateSource};

mod random;

use random::Random;

fn pass(requests: &[(&str, &str)], shape: &str, len: usize) -> Pass {
    let axis = Axis::from_rate_hz(1000.0, len, RateSource::Given).expect("an axis");
    let requests: Vec<Request> =
        requests.iter().map(|(key, value)| Request::parse(key, value).expect("a request")).collect();
    let shape = Shape::parse(shape).expect("a shape");
    Chain::resolve(&requests, &shape, &axis, len).expect("a chain").0.passes()[0].clone()
}

/// A walk held together, a tone and an offset: the record of a sensor that drifts.
fn record(len: usize) -> Vec<f64> {
    let mut random = Random(len as u64);
    let tone = random.logarithmic(0.1, 1.0);
    let mut place = 0.0;
    let value = |n: usize| {
        place = 0.999 * place + random.normal();
        100.0 + place + 20.0 * (n as f64 * tone).sin()
    };
    (0..len).map(value).collect()
}

/// Largest difference of the two ways over the RMS of what goes in and comes out, whichever is larger.
fn apart(x: &[f64], ends: Ends, kind: BaselineKind, pass: &Pass) -> f64 {
    let planner = Planner::new();
    let baseline = Baseline::fit(kind, x, ends, Scale::assumed(x.len())).expect("a baseline");
    let short = apply(x, ends, &baseline, pass, Span::whole(x), &planner).expect("samples");
    let long = apply_whole(x, ends, &baseline, pass, Span::whole(x), &planner).expect("samples");
    assert!(short.parseval < 1e-13 && long.parseval < 1e-13, "{} {}", short.parseval, long.parseval);
    let far = short.output.iter().zip(&long.output).map(|(a, b)| (a - b).abs()).fold(0.0, f64::max);
    far / rms(&long.output).max(rms(x))
}

#[test]
fn blocks_equal_the_transform_of_the_whole_under_every_end() {
    let len = 65_537;
    let x = record(len);
    let low = pass(&[("lowpass", "20Hz")], "butterworth:4", len);
    let slope = pass(&[("lowpass", "10Hz"), ("differentiate", "1")], "gaussian", len);
    for pass in [&low, &slope] {
        assert!(Layout::of(pass, len).is_some_and(|layout| layout.step < len));
        for ends in Ends::all() {
            let kind = match ends {
                Ends::Mirror { left, right, .. } if left != right => BaselineKind::Level(None),
                Ends::Mirror { .. } => BaselineKind::Line,
                Ends::Periodic => BaselineKind::None,
            };
            let far = apart(&x, ends, kind, pass);
            assert!(far < 1e-12, "{} {:?} {}: {far:e}", ends.name(), ends.seat(), pass.turns());
        }
    }
}

#[test]
fn every_operator_that_dies_away_equals_the_transform_of_the_whole() {
    let len = 70_001;
    let x = record(len);
    let cases: &[(&[(&str, &str)], &str)] = &[
        (&[("highpass", "5Hz")], "butterworth:4"),
        (&[("bandpass", "5Hz..30Hz")], "gaussian"),
        (&[("bandstop", "20Hz..40Hz"), ("lowpass", "30Hz")], "butterworth:6"),
        (&[("lowpass", "8Hz"), ("differentiate", "2")], "butterworth:8"),
        (&[("lowpass", "40Hz")], "cosine:30Hz"),
        // One block a little longer than the record.
        (&[("lowpass", "0.3Hz")], "gaussian"),
    ];
    let mut cut = 0;
    for (requests, shape) in cases {
        let pass = pass(requests, shape, len);
        cut += usize::from(Layout::of(&pass, len).is_some());
        for (ends, kind) in [(Ends::EVEN, BaselineKind::None), (Ends::ODD.seated(Seat::Whole), BaselineKind::Trend(3))]
        {
            let far = apart(&x, ends, kind, &pass);
            assert!(far < 1e-12, "{requests:?} {shape} {}: {far:e}", ends.name());
        }
    }
    assert!(cut >= 5, "only {cut} of {} are worked on in blocks", cases.len());
}
