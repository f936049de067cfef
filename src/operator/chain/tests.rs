//! The fixed order, the two passes, the carry of polynomials, and the refusals of whole requests.

use proptest::prelude::*;

use super::*;
use crate::error::Kind;
use crate::operator::edge::tests::differentiated;
use crate::operator::{Chain, Request, Shape};
use crate::record::RateSource;
use crate::unit::Unit;

const LEN: usize = 20_000;

fn axis() -> Axis {
    Axis::from_rate_hz(1000.0, LEN, RateSource::Given).unwrap()
}

fn requests(pairs: &[(&str, &str)]) -> Vec<Request> {
    pairs.iter().map(|(key, value)| Request::parse(key, value).unwrap()).collect()
}

fn resolve(pairs: &[(&str, &str)], shape: &str) -> Result<(Chain, Vec<Finding>)> {
    Chain::resolve(&requests(pairs), &Shape::parse(shape).unwrap(), &axis(), LEN)
}

fn chain(pairs: &[(&str, &str)], shape: &str) -> Chain {
    resolve(pairs, shape).unwrap().0
}

const SHAPES: [&str; 7] =
    ["butterworth:1", "butterworth:2", "butterworth:4", "butterworth:32", "gaussian", "cosine:2Hz", "brickwall"];

#[test]
fn band_stop_and_band_pass_add_up_to_one() {
    for shape in SHAPES {
        let pass = chain(&[("bandpass", "2Hz..40Hz")], shape);
        let stop = chain(&[("bandstop", "2Hz..40Hz")], shape);
        let (low, high) = (chain(&[("lowpass", "40Hz")], shape), chain(&[("highpass", "2Hz")], shape));
        for k in 0..=5000 {
            let f = f64::from(k) * 1e-4;
            // Two roundings of numbers up to one.
            assert!((pass.gain(f) + stop.gain(f) - 1.0).abs() <= f64::EPSILON, "{shape} {f}");
            assert_eq!(pass.gain(f), low.gain(f) * high.gain(f), "{shape} {f}");
        }
        let sum = pass.passes()[0].series();
        let other = stop.passes()[0].series();
        assert!((sum.s0 + other.s0 - 1.0).abs() < 1e-15 && sum.s2 + other.s2 == 0.0 && sum.s4 + other.s4 == 0.0);
    }
    // A deep stop keeps its digits: in the middle of 0.1..499 Hz, order 32, both 1 - L and 1 - H are below 1e-20.
    let stop = chain(&[("bandstop", "0.1Hz..499Hz")], "butterworth:32").gain(0.005);
    let exact = (5.0_f64 / 499.0).powi(64) + (0.1_f64 / 5.0).powi(64);
    assert!((stop / exact - 1.0).abs() < 1e-13, "{stop} {exact}");
}

#[test]
fn notches_have_the_full_width_at_half_gain() {
    // (f^2 - f0^2)^2 = (f bw)^2 at f = sqrt(f0^2 + bw^2/4) +- bw/2, exactly bw apart.
    let squared = chain(&[("notch", "50Hz:8Hz")], "butterworth:8");
    let middle = (2500.0_f64 + 16.0).sqrt();
    for f in [middle - 4.0, middle + 4.0] {
        assert!((squared.gain(f / 1000.0) - 0.5).abs() < 1e-14);
    }
    for shape in ["gaussian", "cosine:2Hz", "brickwall"] {
        let notch = chain(&[("notch", "50Hz:8Hz")], shape);
        for f in [46.0, 54.0] {
            assert!((notch.gain(f / 1000.0) - 0.5).abs() < 1e-12, "{shape} {f}: {}", notch.gain(f / 1000.0));
        }
        assert!(notch.gain(0.05).abs() < 1e-15, "{shape}");
    }
    assert_eq!(squared.gain(0.05), 0.0);
    assert_eq!(squared.gain(0.0), 1.0);
    // In wavelengths: 1/(19 ms) - 1/(21 ms) about 50 Hz.
    let period = chain(&[("notch", "20ms:2ms")], "gaussian");
    let half = (1.0 / 0.019 - 1.0 / 0.021) / 2.0;
    assert!((period.gain((50.0 + half) / 1000.0) - 0.5).abs() < 1e-12);
}

#[test]
fn series_of_products_and_notches_agree_with_numerical_differentiation() {
    for (pairs, shape) in [
        (&[("notch", "50Hz:20Hz")][..], "butterworth:4"),
        (&[("notch", "50Hz:60Hz")], "gaussian"),
        (&[("notch", "50Hz:95Hz")], "gaussian"),
        (&[("bandpass", "40Hz..60Hz")], "gaussian"),
        (&[("bandstop", "40Hz..60Hz")], "gaussian"),
        (&[("bandstop", "40Hz..60Hz")], "butterworth:1"),
        (&[("lowpass", "50Hz"), ("notch", "50Hz:60Hz"), ("highpass", "60Hz")], "butterworth:1"),
        (&[("lowpass", "50Hz"), ("lowpass", "70Hz"), ("bandstop", "40Hz..60Hz")], "butterworth:2"),
    ] {
        let chain = chain(pairs, shape);
        let series = chain.passes()[0].series();
        assert!((series.s0 - chain.gain(0.0)).abs() < 1e-15, "{pairs:?} {shape}");
        let (s2, s4) = differentiated(|f| chain.gain(f), series.s0, 0.05 * 0.02);
        let wc2 = (std::f64::consts::TAU * 0.05_f64).powi(2);
        // Truncation and rounding as for single edges, with the larger coefficients of the notches.
        assert!((s2 - series.s2).abs() * wc2 < 1e-6, "{pairs:?} {shape}: {s2} {}", series.s2);
        assert!((s4 - series.s4).abs() * wc2 * wc2 < 2e-3, "{pairs:?} {shape}: {s4} {}", series.s4);
    }
}

#[test]
fn polynomial_records_pass_filters_exactly() {
    // A record c0 + c1 t + c2 t^2 is known beyond its ends, so the filter is a plain weighted sum: with the Gaussian
    // weighting function (closed form) its result is b + c2 sigma^2, sigma = alpha lc/sqrt(2 pi) (ISO 16610-21).
    let low = chain(&[("lowpass", "10Hz")], "gaussian");
    let b = Polynomial::from_powers(1000.0, &[2.0, -0.03, 4e-5]);
    let carried = low.passes()[0].carry(&b);
    let alpha = (std::f64::consts::LN_2 / std::f64::consts::PI).sqrt();
    let variance = (alpha * 100.0).powi(2) / std::f64::consts::TAU;
    for x in [0.0, 250.0, 1000.0] {
        assert!((carried.at(x) - b.at(x) - 4e-5 * variance).abs() < 1e-12, "{x}");
    }
    // The same by brute force.
    let weights: Vec<f64> = (-500..=500).map(|n| (-0.5 * f64::from(n * n) / variance).exp()).collect();
    let total: f64 = weights.iter().sum();
    let summed: f64 = (-500..=500).zip(&weights).map(|(n, w)| w / total * b.at(300.0 + f64::from(n))).sum();
    assert!((carried.at(300.0) - summed).abs() < 1e-12, "{} {summed}", carried.at(300.0));
    // Lines pass every low-pass unchanged and no high-pass at all; constants and lines integrate in closed form.
    let line = Polynomial::from_powers(1000.0, &[2.0, -0.03]);
    for shape in SHAPES {
        let (low, high) = (chain(&[("lowpass", "10Hz")], shape), chain(&[("highpass", "10Hz")], shape));
        for x in [0.0, 400.0, 1000.0] {
            assert!((low.passes()[0].carry(&line).at(x) - line.at(x)).abs() < 1e-12);
            assert!(high.passes()[0].carry(&line).at(x).abs() < 1e-12);
            let integral = low.passes()[0].carry(&line).integral().at(x);
            assert!((integral - (2.0 * x - 0.015 * x * x)).abs() < 1e-12 * 1.3e4, "{shape} {x}"); // relative to the largest value
        }
    }
    // In seconds instead of samples.
    let seconds = Polynomial::from_powers(1.0, &[2.0, -30.0, 40.0]);
    assert!((low.passes()[0].carry_stepped(&seconds, 1e-3).at(0.25) - carried.at(250.0)).abs() < 1e-12);
}

#[test]
fn the_order_of_requests_does_not_matter() {
    let mut pairs = [
        ("highpass", "1Hz"),
        ("notch", "50Hz:2Hz"),
        ("lowpass", "200Hz"),
        ("lowpass", "180Hz"),
        ("bandstop", "90Hz..110Hz"),
        ("integrate", "2"),
    ];
    let reference = chain(&pairs, "butterworth:2");
    let described = serde_json::to_string(&reference.describe(&axis())).unwrap();
    for turn in 0..pairs.len() {
        pairs.rotate_left(1);
        if turn.is_multiple_of(2) {
            pairs.swap(0, 3);
        }
        let other = chain(&pairs, "butterworth:2");
        for k in 0..=500 {
            let f = f64::from(k) * 1e-3;
            assert_eq!(other.gain(f).to_bits(), reference.gain(f).to_bits());
        }
        assert_eq!(serde_json::to_string(&other.describe(&axis())).unwrap(), described);
    }
}

#[test]
fn an_integral_has_its_high_pass_in_a_second_pass() {
    let both = chain(&[("bandpass", "2Hz..40Hz"), ("notch", "50Hz:2Hz"), ("integrate", "2")], "gaussian");
    let (low, high) =
        (chain(&[("lowpass", "40Hz"), ("notch", "50Hz:2Hz")], "gaussian"), chain(&[("highpass", "2Hz")], "gaussian"));
    let [first, second] = both.passes() else { panic!("two passes") };
    assert_eq!((first.turns(), first.ends()), (-2, PassEnds::Chosen));
    assert_eq!((second.turns(), second.ends()), (0, PassEnds::EvenWithoutBaseline));
    for k in 0..=500 {
        let f = f64::from(k) * 1e-3;
        assert_eq!((first.gain(f), second.gain(f)), (low.gain(f), high.gain(f)));
    }
    assert_eq!(both.turns(), -2);
    assert_eq!(first.reaches().reach, Reach::Unbounded);
    assert!(both.reaches().reach.samples().is_some() && second.reaches().reach.samples().is_some());
    // Everything else is one pass.
    for (pairs, turns) in [
        (&[][..], 0),
        (&[("integrate", "1")], -1),
        (&[("integrate", "1"), ("lowpass", "40Hz")], -1),
        (&[("bandpass", "2Hz..40Hz"), ("highpass", "1Hz")], 0),
        (&[("differentiate", "2"), ("highpass", "1Hz")], 2),
    ] {
        let chain = chain(pairs, "gaussian");
        assert_eq!((chain.passes().len(), chain.turns(), chain.passes()[0].turns()), (1, turns, turns), "{pairs:?}");
        assert_eq!(chain.passes()[0].ends(), PassEnds::Chosen);
    }
    assert!(chain(&[], "gaussian").passes()[0].is_identity());
    assert_eq!(chain(&[], "gaussian").shortest_wavelength_samples(), None);
    let found = both.shortest_wavelength_samples().unwrap();
    assert!((found - 20.0).abs() < 1e-12, "the notch is the highest corner: {found}");
    assert!((both.longest_wavelength_samples().unwrap() - 500.0).abs() < 1e-10);
}

#[test]
fn requests_that_contradict_themselves_are_refused_in_full() {
    for (pairs, shape, kind, message) in [
        (
            &[("integrate", "1"), ("differentiate", "2")][..],
            "gaussian",
            Kind::Usage,
            "--integrate 1 and --differentiate 2 exclude each other; leave out --integrate or --differentiate",
        ),
        (
            &[("integrate", "1"), ("lowpass", "40Hz"), ("integrate", "1")],
            "gaussian",
            Kind::Usage,
            "--integrate is given more than once; write --integrate 2 for twice",
        ),
        (
            &[("bandpass", "2Hz..600Hz")],
            "gaussian",
            Kind::Unsupported,
            "--bandpass 600Hz: at or above the Nyquist frequency of 500 Hz; choose a corner below 500 Hz for --bandpass",
        ),
        (
            &[("highpass", "0.8mm")],
            "gaussian",
            Kind::Usage,
            "--highpass 0.8mm: a corner in length, but the record's axis is time in s; give --highpass as in 40Hz or 2.5s",
        ),
        (
            &[("notch", "50Hz:100Hz")],
            "gaussian",
            Kind::Unsupported,
            "--notch 50Hz:100Hz: the notch does not fit between zero and the Nyquist frequency of 500 Hz; choose a narrower width for --notch",
        ),
        (
            &[("notch", "499Hz:4Hz")],
            "butterworth:4",
            Kind::Unsupported,
            "--notch 499Hz:4Hz: the notch does not fit between zero and the Nyquist frequency of 500 Hz; choose a narrower width for --notch",
        ),
        (
            &[("notch", "50Hz:2Hz")],
            "cosine:4Hz",
            Kind::Usage,
            "--notch 50Hz:2Hz: narrower than the transition of --shape cosine:4Hz, so nothing would be stopped; choose a narrower transition for --shape",
        ),
        (
            &[("notch", "50Hz:98Hz")],
            "cosine:4Hz",
            Kind::Unsupported,
            "--shape cosine:4Hz: the transitions about --notch 50Hz:98Hz do not fit between zero and the Nyquist frequency; choose a narrower transition for --shape",
        ),
    ] {
        let error = resolve(pairs, shape).unwrap_err();
        assert_eq!((error.kind(), error.to_string().as_str()), (kind, message));
    }
    let profile = Axis::new(Unit::parse("mm"), 0.0, 0.5, 1000, RateSource::Given).unwrap();
    let error = Chain::resolve(&requests(&[("lowpass", "0.8mm")]), &Shape::Gaussian, &profile, 1000).unwrap_err();
    assert_eq!(
        error.to_string(),
        "--lowpass 0.8mm = 1250 1/m: at or above the Nyquist frequency of 1000 1/m; choose a corner below 1000 1/m for --lowpass"
    );
}

#[test]
fn remarks_travel_with_the_chain() {
    let codes = |pairs: &[(&str, &str)], shape: &str| -> Vec<&str> {
        resolve(pairs, shape).unwrap().1.iter().map(|finding| finding.code).collect()
    };
    assert_eq!(codes(&[("lowpass", "40Hz")], "gaussian"), [""; 0]);
    assert_eq!(codes(&[("highpass", "0.04Hz")], "gaussian"), ["corner_longer_than_record", "reach_over_quarter"]);
    assert_eq!(codes(&[("highpass", "0.02Hz")], "gaussian"), ["corner_longer_than_record", "reach_exceeds_record"]);
    assert_eq!(codes(&[("lowpass", "2Hz"), ("highpass", "40Hz")], "gaussian"), ["no_pass_band"]);
    assert_eq!(codes(&[("lowpass", "40Hz")], "brickwall"), ["reach_unbounded"]);
    assert_eq!(codes(&[("integrate", "2")], "gaussian"), [""; 0]);
}

#[test]
fn descriptions_and_check_points_are_plain_data() {
    let chain = chain(&[("bandpass", "2Hz..400Hz"), ("integrate", "1")], "gaussian");
    let json = serde_json::to_value(chain.describe(&axis())).unwrap();
    assert_eq!(json["shape"], "gaussian");
    assert_eq!(json["turns"], -1);
    assert_eq!(json["passes"][0]["operators"][0]["kind"], "low_pass");
    assert_eq!(json["passes"][0]["reach_samples"], serde_json::Value::Null);
    let high = &json["passes"][1]["operators"][0];
    assert_eq!(json["passes"][1]["ends"], "even_without_baseline");
    assert_eq!((&high["option"], &high["value"]), (&"bandpass".into(), &"2Hz..400Hz".into()));
    let corner = &high["corners"][0];
    assert_eq!((&corner["text"], &corner["unit"]), (&"2Hz".into(), &"Hz".into()));
    assert!((corner["frequency"].as_f64().unwrap() - 2.0).abs() < 1e-12);
    assert!((corner["gain"].as_f64().unwrap() - 0.5).abs() < 1e-15);
    assert!((json["reach"].as_f64().unwrap() - json["reach_samples"].as_f64().unwrap() / 1000.0).abs() < 1e-12);

    let points = chain.check_points(&axis());
    let rows: Vec<_> = points.iter().map(|p| (p.corner.as_str(), p.octave, p.frequency.round(), p.gain)).collect();
    assert_eq!(rows.len(), 6);
    assert_eq!(rows[2].1, 1);
    assert_eq!(rows[2].3, None, "800 Hz is above the Nyquist frequency");
    // One octave below the lower corner a Gaussian high-pass has 1 - 2^-1/4 (ISO 16610-21), times the low-pass, 2^-1/160000.
    let exact = (1.0 - 0.5_f64.powf(0.25)) * 0.5_f64.powf(1.0 / 160_000.0);
    assert_eq!((rows[3].0, rows[3].1, rows[3].2), ("2Hz", -1, 1.0));
    assert!((rows[3].3.unwrap() - exact).abs() < 1e-14);
}

proptest! {
    #![proptest_config(ProptestConfig::with_cases(64))]
    #[test]
    fn no_combination_panics(
        rows in proptest::collection::vec((0..STEPS.len(), 1e-3..600.0_f64, 1e-3..600.0_f64), 0..5),
        shape in 0..SHAPES.len(),
        len in 1..100_000_usize,
        rate in 1e-3..1e5_f64,
    ) {
        let axis = Axis::from_rate_hz(rate, len, RateSource::Given).unwrap();
        let requests: Vec<Request> = rows.iter().filter_map(|&(row, a, b)| {
            let key = STEPS[row].key;
            let value = match key {
                "lowpass" | "highpass" => format!("{a}Hz"),
                "bandpass" | "bandstop" => format!("{}Hz..{}Hz", a.min(b), a.max(b)),
                "notch" => format!("{a}Hz:{b}Hz"),
                _ => "1".to_owned(),
            };
            Request::parse(key, &value).ok()
        }).collect();
        if let Ok((chain, _)) = Chain::resolve(&requests, &Shape::parse(SHAPES[shape]).unwrap(), &axis, len) {
            for f in [0.0, 0.1, 0.5] {
                prop_assert!((-0.1..=1.1).contains(&chain.gain(f)));
            }
            for pass in chain.passes() {
                let series = pass.series();
                prop_assert!(series.s0.is_finite() && series.s2.is_finite() && series.s4.is_finite());
            }
            if let Some(samples) = chain.reaches().reach.samples() {
                prop_assert!(samples.is_finite() && samples >= 0.0);
            }
            prop_assert!(chain.check_points(&axis).len().is_multiple_of(3));
        }
    }
}
