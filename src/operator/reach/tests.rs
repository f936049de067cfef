//! Reaches against printed tables, closed forms and direct sums.

use std::f64::consts::{LN_2, PI, TAU};

use super::*;
use crate::operator::edge::{Edge, Rolloff};
use crate::operator::gain::Gain;
use crate::operator::{Chain, Request, Shape};
use crate::record::{Axis, RateSource};

fn reach(gain: impl Fn(f64) -> f64, turns: i32, extent_samples: f64, highest: f64) -> f64 {
    Reaches::of(gain, turns, Scale { extent_samples, highest }).reach.samples().expect("bounded")
}

fn low(corner: f64, rolloff: Rolloff) -> (impl Fn(f64) -> f64, f64) {
    let edge = Edge { corner, rolloff };
    (move |f| edge.split(f).0, edge.extent_samples())
}

fn chain(requests: &[(&str, &str)], shape: &str, rate_hz: f64, len: usize) -> Chain {
    let axis = Axis::from_rate_hz(rate_hz, len, RateSource::Given).unwrap();
    let requests: Vec<Request> = requests.iter().map(|(key, value)| Request::parse(key, value).unwrap()).collect();
    Chain::resolve(&requests, &Shape::parse(shape).unwrap(), &axis, len).unwrap().0
}

fn chain_reach(requests: &[(&str, &str)], shape: &str) -> f64 {
    chain(requests, shape, 1000.0, 100_000).reaches().reach.samples().expect("bounded")
}

/// The definition by a direct sum over a response known in closed form, on a span where its tail has died away.
fn summed(response: impl Fn(f64) -> f64, span: usize) -> f64 {
    let sizes: Vec<f64> = (0..span).map(|n| response(n as f64).abs()).collect();
    let total = 2.0 * sizes.iter().sum::<f64>() - sizes[0];
    let mut within = sizes[0];
    let mut r = 0;
    while total - within > 1e-3 * total {
        r += 1;
        within += 2.0 * sizes[r];
    }
    r as f64
}

#[test]
fn reaches_have_the_printed_digits() {
    // Computed for this project with NumPy 2.4 in units of 1/fc; the Gaussian also from the error function:
    // erfc(pi fc R/sqrt(ln 2)) = 1e-3 with erfc(2.326754) = 1e-3 (normal table).
    assert!((0.617 - 2.326_754 * LN_2.sqrt() / PI).abs() < 5e-4);
    let printed = [(1, 1.10), (2, 1.54), (3, 2.03), (4, 2.69), (6, 3.86), (8, 5.02)];
    let (gain, extent) = low(1e-3, Rolloff::Gaussian);
    let found = reach(gain, 0, extent, 1e-3);
    assert!((found / 1000.0 - 0.617).abs() <= 1.5e-3, "{found}"); // half a digit and one sample
    for (order, ratio) in printed {
        let (gain, extent) = low(1e-3, Rolloff::Butterworth { order });
        assert!(extent >= ratio * 1000.0, "{order}: extent {extent}");
        let found = reach(&gain, 0, extent, 1e-3);
        assert!((found / 1000.0 - ratio).abs() <= 6e-3, "{order}: {found}"); // half a digit and one sample
        // The high-pass has the reach of what it leaves out.
        let high = reach(|f| 1.0 - gain(f), 0, extent, 1e-3);
        assert_eq!(high, found, "{order}");
    }
}

#[test]
fn transitions_and_notches_have_the_printed_reaches() {
    // Same source: 3.8..5.1/(f2 - f1), 2.2/bw, Gaussian notch 1.24/bw.
    // The range holds for transitions down to a tenth of the corner; narrower ones reach less of their growing area.
    for (corner, half_width) in [(0.01, 0.01), (0.01, 0.005), (0.05, 0.005), (0.1, 0.002)] {
        let (gain, extent) = low(corner, Rolloff::Cosine { half_width });
        let found = reach(gain, 0, extent, corner);
        if half_width >= 0.05 * corner {
            let ratio = found * 2.0 * half_width;
            assert!((3.75..5.15).contains(&ratio), "{corner} {half_width}: {ratio}");
        }
        // Closed response of the raised cosine of full width w: sin(2 pi fc n)/(pi n) cos(pi w n)/(1 - (2 w n)^2)
        // (the pulse of Nyquist 1928, as in any text on data transmission; from memory).
        let width = 2.0 * half_width;
        let exact = summed(
            |n| {
                let sinc = if n == 0.0 { 2.0 * corner } else { (TAU * corner * n).sin() / (PI * n) };
                let pole = 1.0 - (2.0 * width * n).powi(2);
                // At the pole the quotient has the limit pi/4.
                sinc * if pole.abs() < 1e-9 { PI / 4.0 } else { (PI * width * n).cos() / pole }
            },
            (600.0 / width) as usize,
        );
        // Beyond the span lies a share of (4/600)^2 of the tail, the grid agrees with its quarter to 1e-3.
        assert!((found - exact).abs() <= 1.0 + 1e-3 * exact, "{corner} {half_width}: {found} {exact}");
    }
    let notch = chain_reach(&[("notch", "50Hz:2Hz")], "butterworth:4") * 0.002;
    assert!((notch - 2.2).abs() < 0.05 + 0.002, "{notch}");
    let notch = chain_reach(&[("notch", "50Hz:2Hz")], "gaussian") * 0.002;
    assert!((notch - 1.24).abs() < 0.005 + 0.002, "{notch}");
}

#[test]
fn a_gaussian_band_agrees_with_its_closed_response() {
    let response = |corner: f64, n: f64| corner * (PI / LN_2).sqrt() * (-(PI * corner * n).powi(2) / LN_2).exp();
    // The difference of low-passes at l and 4 l reaches 2.44 l (printed); here also from its closed response.
    let (short, long) = (1.0 / 400.0, 1.0 / 1600.0);
    let difference = |f: f64| {
        Edge { corner: short, rolloff: Rolloff::Gaussian }.split(f).0
            - Edge { corner: long, rolloff: Rolloff::Gaussian }.split(f).0
    };
    let found = reach(difference, 0, 2.5 * 400.0, short);
    assert_eq!(found, summed(|n| response(short, n) - response(long, n), 8000));
    assert!((found / 400.0 - 2.44).abs() <= 0.0075, "{found}");
    // The product of a low-pass at a and a high-pass at b is the difference of low-passes at a and at
    // 1/sqrt(1/a^2 + 1/b^2): Gaussians multiply to a Gaussian.
    let both = (short.powi(-2) + long.powi(-2)).sqrt().recip();
    let product = chain_reach(&[("bandpass", "400ms..1600ms")], "gaussian");
    assert_eq!(product, summed(|n| response(short, n) - response(both, n), 8000));
}

#[test]
fn a_double_integral_with_high_pass_has_the_printed_reach() {
    // -(1 - B)/w^2, order 4: 2.94 wavelengths (computed for this project with NumPy 2.4).
    let found = chain_reach(&[("integrate", "2"), ("highpass", "1Hz")], "butterworth:4");
    assert!((found / 1000.0 - 2.94).abs() <= 6e-3, "{found}");
    // Order 1 has the closed response (1/2)(1/wc) exp(-wc |n|): -(1/w^2) w^2/(w^2 + wc^2).
    let found = chain_reach(&[("integrate", "2"), ("highpass", "1Hz")], "butterworth:1");
    let exact = 1000.0_f64.ln() / (TAU / 1000.0);
    assert!((found - exact).abs() <= 1.5, "{found} {exact}");
    // A single integral: (1/2) sgn n exp(-wc |n|), without the ringing at the Nyquist frequency.
    let single = chain(&[("integrate", "1"), ("highpass", "1Hz")], "butterworth:1", 1000.0, 100_000);
    let found = single.reaches().reach.samples().unwrap();
    // The taper rounds the step at n = 0 by a sample or two of 159.
    assert!((found - exact).abs() <= 3.0, "{found} {exact}");
    assert_eq!(single.reaches().numeric, None);
}

#[test]
fn a_grid_that_grows_on_demand_finds_what_a_large_one_finds() {
    for (corner, rolloff) in [
        (0.4, Rolloff::Butterworth { order: 1 }),
        (0.2, Rolloff::Butterworth { order: 1 }),
        (0.02, Rolloff::Butterworth { order: 1 }),
        (0.2, Rolloff::Butterworth { order: 4 }),
        (0.02, Rolloff::Butterworth { order: 8 }),
        (0.01, Rolloff::Cosine { half_width: 0.001 }),
        (0.3, Rolloff::Gaussian),
    ] {
        let (gain, extent) = low(corner, rolloff);
        let found = reach(&gain, 0, extent, corner);
        let flipped = |f: f64| if gain(0.5) > 0.5 { 1.0 - gain(f) } else { gain(f) };
        let large = Tail::of(&[kernel::sampled(flipped, 0, 1 << 19)]).reach(PLAIN) as f64;
        assert!((found - large).abs() <= 1.0 + 2e-3 * large, "{corner} {rolloff:?}: {found} {large}");
    }
}

#[test]
fn turned_gaussians_agree_with_their_closed_responses() {
    let s = (PI * 0.005_f64).powi(2) / LN_2;
    let plain = |n: f64| (-s * n * n).exp();
    let low = ("lowpass", "5Hz");
    let first = chain_reach(&[low, ("differentiate", "1")], "gaussian");
    assert_eq!(first, summed(|n| n * plain(n), 4000));
    let second = chain_reach(&[low, ("differentiate", "2")], "gaussian");
    assert_eq!(second, summed(|n| (4.0 * s * s * n * n - 2.0 * s) * plain(n), 4000));
}

#[test]
fn reaches_scale_with_the_wavelength() {
    for shape in ["gaussian", "butterworth:1", "butterworth:2", "butterworth:4", "butterworth:8", "butterworth:32"] {
        let at = |wavelength: f64| {
            let chain = chain(&[("lowpass", &format!("{wavelength}s"))], shape, 1.0, 1_000_000_000);
            (chain.reaches().reach.samples().unwrap() / wavelength, chain.reaches().numeric.map(|r| r / wavelength))
        };
        let (base, numeric) = at(2000.0);
        // From 2,000 samples to 1e9, across the reduced scale: one sample of 2,000, and one of the grid's 16 per reach.
        for wavelength in [1000.0, 4000.0, 1e5, 2e5, 1e7, 1e9] {
            let (found, far) = at(wavelength);
            assert!((found / base - 1.0).abs() < 1.5e-3, "{shape} {wavelength}: {found} {base}");
            if let (Some(numeric), Some(far)) = (numeric, far) {
                // Rounding decides the last decade of a tail that falls by 30 decibels a reach.
                assert!((far / numeric - 1.0).abs() < 0.05, "{shape} {wavelength}: {far} {numeric}");
            }
        }
        // The larger of two grids is exact to its own step.
        let ((a, _), (b, _)) = (at(1e6), at(2e6));
        assert!((a / b - 1.0).abs() < 1e-4, "{shape}: {a} {b}");
    }
}

#[test]
fn numeric_reaches_follow_the_decay_of_the_response() {
    // Order 4: nearest pole at wc exp(i 3 pi/8 ...), decay exp(-wc sin(pi/8) n); from 1e-3 to 1e-13 of the area take
    // ln(1e10)/(wc sin(pi/8)) samples more.
    let chain = chain(&[("lowpass", "1Hz")], "butterworth:4", 1000.0, 100_000);
    let (plain, numeric) = (chain.reaches().reach.samples().unwrap(), chain.reaches().numeric.unwrap());
    let more = 1e10_f64.ln() / (TAU * 1e-3 * (PI / 8.0).sin());
    // Half a wave of the ripple under the envelope.
    assert!((numeric - plain - more).abs() < 600.0, "{plain} {numeric} {more}");
    // Gaussian: erfc(z) = 1e-13 at z = 5.2646 (asymptotic series exp(-z^2)/(z sqrt pi) (1 - 1/(2 z^2) + ...)).
    let (gain, extent) = low(1e-3, Rolloff::Gaussian);
    let found = Reaches::of(gain, 0, Scale { extent_samples: extent, highest: 1e-3 }).numeric.unwrap();
    let z = found * PI * 1e-3 / LN_2.sqrt();
    assert!((z - 5.2646).abs() < 0.02, "{z}");
}

#[test]
fn kinks_at_nyquist_have_no_numeric_reach() {
    for (shape, corner) in [("butterworth:4", "100Hz"), ("butterworth:2", "10Hz"), ("butterworth:1", "1Hz")] {
        let chain = chain(&[("lowpass", corner)], shape, 1000.0, 100_000);
        assert!(chain.reaches().reach.samples().is_some(), "{shape} {corner}");
        assert_eq!(chain.reaches().numeric, None, "{shape} {corner}");
    }
}

#[test]
fn the_kink_law_agrees_with_the_sum() {
    // Order 1 at 0.2 cycles per sample: beyond a few waves only the kink is left, 2 |G'(pi)|/(pi r) of unit area, with
    // G = 1/(1 + x^2), x = w/wc, G' = -2 x/(wc (1 + x^2)^2).
    let (gain, extent) = low(0.2, Rolloff::Butterworth { order: 1 });
    let found = reach(&gain, 0, extent, 0.2);
    let (wc, x) = (TAU * 0.2, 2.5_f64);
    let exact = 2.0 * (2.0 * x / (wc * (1.0 + x * x).powi(2))) / (PI * 1e-3);
    assert!((found / exact - 1.0).abs() < 0.05, "{found} {exact}");
    let law = Kink::of(&gain, 0, Parity::Even, 1.0).reach(1e-3).unwrap();
    assert!((law / exact - 1.0).abs() < 1e-3, "{law} {exact}");
}

#[test]
fn brick_walls_are_found_by_their_growth_with_the_grid() {
    for corner in [0.25, 0.01, 1e-3, 1e-6] {
        let (gain, _) = low(corner, Rolloff::Brickwall);
        let found = Reaches::of(gain, 0, Scale { extent_samples: 4.0 / corner, highest: corner });
        assert_eq!(found, Reaches { reach: Reach::Unbounded, numeric: None }, "{corner}");
    }
    let chain = chain(&[("bandpass", "2Hz..40Hz")], "brickwall", 1000.0, 100_000);
    assert_eq!(chain.reaches().reach, Reach::Unbounded);
    assert_eq!(Reach::Unbounded.within(500), 500.0);
    assert_eq!(serde_json::to_string(&Reach::Unbounded).unwrap(), "null");
}

#[test]
fn bare_derivatives_and_integrals_are_unbounded() {
    for requests in [
        &[("differentiate", "1")][..],
        &[("integrate", "1")],
        &[("integrate", "2"), ("lowpass", "40Hz")],
        &[("differentiate", "1"), ("highpass", "1Hz")],
    ] {
        assert_eq!(chain(requests, "gaussian", 1000.0, 100_000).reaches().reach, Reach::Unbounded, "{requests:?}");
    }
    let nothing = chain(&[], "gaussian", 1000.0, 100_000);
    assert_eq!(*nothing.reaches(), Reaches { reach: Reach::Samples(0.0), numeric: Some(0.0) });
}

#[test]
fn wide_bands_keep_the_reach_of_their_long_corner() {
    // Far apart, the low-pass is a single sample to the high-pass: half of the area lies in it, so the reach of the
    // band is that of the high-pass at 2e-3 of the area, 0.88..1 of the 99.9 % reach (a Gaussian: erfc^-1(2e-3) =
    // 2.1851 against 2.3268, normal table).
    for (low, slack) in [("0.1Hz", 0.003), ("0.01Hz", 0.003)] {
        let found = chain(&[("bandpass", &format!("{low}..100Hz"))], "gaussian", 1000.0, 100_000_000);
        let long = 1000.0 / low.trim_end_matches("Hz").parse::<f64>().unwrap();
        let exact = 2.1851 * LN_2.sqrt() / PI * long;
        let samples = found.reaches().reach.samples().unwrap();
        assert!((samples / exact - 1.0).abs() < slack, "{low}: {samples} {exact}");
    }
    // Beyond one grid: the sum of the parts' extents, never less than the truth.
    let found = chain(&[("bandpass", "0.0001Hz..100Hz")], "gaussian", 1000.0, 100_000_000);
    let exact = 2.1851 * LN_2.sqrt() / PI * 1e7;
    let samples = found.reaches().reach.samples().unwrap();
    assert!(samples >= exact && samples < 1.3 * exact, "{samples} {exact}");
    assert_eq!(found.reaches().numeric, None);
}

#[test]
fn every_extent_covers_the_reach() {
    let mut rolloffs: Vec<Rolloff> = (1..=32).map(|order| Rolloff::Butterworth { order }).collect();
    rolloffs.extend([Rolloff::Gaussian, Rolloff::Cosine { half_width: 1e-3 }, Rolloff::Cosine { half_width: 2e-4 }]);
    for rolloff in rolloffs {
        let (gain, extent) = low(1e-3, rolloff);
        let found = reach(gain, 0, extent, 1e-3);
        assert!(found <= extent + 1.0 && extent < 2.0 * found, "{rolloff:?}: {found} {extent}");
    }
    for shape in ["gaussian", "butterworth:4"] {
        let chain = chain(&[("notch", "50Hz:2Hz")], shape, 1000.0, 100_000);
        let part: &dyn Gain = &*chain.passes()[0].parts[0].gain;
        let found = chain.reaches().reach.samples().unwrap();
        assert!(found <= part.extent_samples() * 1.02 + 1.0, "{shape}: {found} {}", part.extent_samples());
    }
}
