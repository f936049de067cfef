//! Published gains of the shapes, their sums, and their series against numerical differentiation.

use super::*;

fn edge(corner: f64, rolloff: Rolloff) -> Edge {
    Edge { corner, rolloff }
}

fn rolloffs() -> Vec<Rolloff> {
    let mut all: Vec<Rolloff> = (1..=32).map(|order| Rolloff::Butterworth { order }).collect();
    all.extend([Rolloff::Gaussian, Rolloff::Brickwall]);
    all.extend([0.001, 0.01, 0.02, 0.03].map(|half_width| Rolloff::Cosine { half_width }));
    all
}

#[test]
fn the_gaussian_is_that_of_profile_filters() {
    // ISO 16610-21:2011, 4.2.1: transmission exp(-pi (alpha lc/l)^2), alpha = sqrt(ln 2/pi) = 0.4697186393498257.
    let alpha = 0.469_718_639_349_825_67_f64;
    let gaussian = edge(0.05, Rolloff::Gaussian);
    assert!((gaussian.split(0.05).0 - 0.5).abs() < 1e-15);
    assert!((gaussian.split(0.05).0 - (-PI * alpha * alpha).exp()).abs() < 1e-15);
    // The same clause at wavelengths l/lc, to 1e-8; the short-wave part is one minus it.
    for (wavelength, long_wave) in [
        (0.25, 1.5259e-5),
        (1.0 / 3.0, 0.001_953_13),
        (0.5, 0.0625),
        (0.8, 0.338_563_89),
        (1.0, 0.5),
        (1.25, 0.641_712_95),
        (2.0, 0.840_896_42),
        (3.0, 0.925_874_71),
        (4.0, 0.957_603_28),
        (5.0, 0.972_654_95),
        (8.0, 0.989_228_01),
        (10.0, 0.993_092_50),
    ] {
        let (low, high) = gaussian.split(0.05 / wavelength);
        assert!((low - long_wave).abs() < 1e-8, "{wavelength}: {low}");
        assert!((high - (1.0 - long_wave)).abs() < 1e-8, "{wavelength}: {high}");
    }
}

#[test]
fn the_gaussian_weighting_function_has_its_standard_width() {
    // ISO 16610-21: sigma = alpha lc/sqrt(2 pi) = 0.18739 lc. The variance of a kernel is -2 s2 of its gain.
    let sigma = (-2.0 * edge(0.01, Rolloff::Gaussian).low_series().s2).sqrt();
    assert!((sigma / 100.0 - 0.18739).abs() < 1e-5, "{sigma}");
}

#[test]
fn butterworth_gains_are_twice_the_decibels_of_one_pass() {
    // Attenuation of the single-pass magnitude, dB, at f/fc = 0.5, 1, 2, 10 (Butterworth 1930: 10 lg(1 + r^2n)).
    for (order, decibels) in [
        (1, [0.9691, 3.0103, 6.9897, 20.0432]),
        (2, [0.2633, 3.0103, 12.3045, 40.0004]),
        (4, [0.0169, 3.0103, 24.0993, 80.0000]),
        (8, [0.0001, 3.0103, 48.1649, 160.0000]),
    ] {
        let low = edge(0.01, Rolloff::Butterworth { order });
        for (ratio, single) in [0.5, 1.0, 2.0, 10.0].into_iter().zip(decibels) {
            let found = -20.0 * low.split(0.01 * ratio).0.log10();
            // The table's last digit, twice.
            assert!((found - 2.0 * single).abs() < 2e-4, "{order} {ratio}: {found}");
        }
        assert!((-20.0 * low.split(0.01).0.log10() - 6.0206).abs() < 1e-5);
    }
    // Two passes reach 1/sqrt 2 at (sqrt 2 - 1)^(1/2n) of the corner; 0.802 for n = 2 in Winter, Biomechanics and Motor
    // Control of Human Movement (from memory).
    for (order, ratio) in [(1, 0.643_594), (2, 0.802_243), (4, 0.895_680), (8, 0.946_404)] {
        let gain = edge(0.01, Rolloff::Butterworth { order }).split(0.01 * ratio).0;
        // A slope of at most 2n/ratio^2 per unit of ratio times the half digit of the table.
        assert!((gain - 0.5_f64.sqrt()).abs() < 5e-7 * 2.0 * f64::from(order), "{order}: {gain}");
    }
}

#[test]
fn low_and_high_add_up_to_one_exactly() {
    for rolloff in rolloffs() {
        let edge = edge(0.03, rolloff);
        for k in 0..=5000 {
            let (low, high) = edge.split(f64::from(k) * 1e-4);
            assert!(low + high == 1.0 && low >= 0.0 && high >= 0.0, "{rolloff:?} {k}: {low} {high}");
        }
        let (low, high) = edge.split(0.03);
        assert!((low - 0.5).abs() < 1e-15 && (high - 0.5).abs() < 1e-15, "{rolloff:?}");
    }
}

#[test]
fn small_gains_keep_their_digits() {
    for order in [1, 2, 4, 8, 32] {
        let edge = edge(0.1, Rolloff::Butterworth { order });
        let (small, large) = (1e-3_f64, 0.4_f64);
        // 1/(1 + (fc/f)^2n) and 1/(1 + (f/fc)^2n) by logarithms; the exponent's rounding is magnified 2n ln r times.
        let n = 2.0 * f64::from(order);
        let high = (-(n * (0.1 / small).ln()).exp().ln_1p()).exp();
        let low = (-(n * (large / 0.1).ln()).exp().ln_1p()).exp();
        assert!((edge.split(small).1 / high - 1.0).abs() < 1e-13, "{order}");
        assert!((edge.split(large).0 / low - 1.0).abs() < 1e-13, "{order}");
    }
    let gaussian = edge(0.1, Rolloff::Gaussian);
    // 1 - 2^-x = x ln 2 (1 - x ln 2/2 + ...), x = 1e-12.
    assert!((gaussian.split(1e-7).1 / (LN_2 * 1e-12) - 1.0).abs() < 1e-12);
}

#[test]
fn extremes_of_frequency_stay_numbers() {
    for rolloff in rolloffs() {
        for corner in [1e-15, 0.03, 0.499_999] {
            for f in [0.0, f64::MIN_POSITIVE, 1e-12, 0.25, 0.5] {
                let (low, high) = edge(corner, rolloff).split(f);
                assert!((0.0..=1.0).contains(&low) && (0.0..=1.0).contains(&high), "{rolloff:?} {corner} {f}");
            }
            let series = edge(corner, rolloff).low_series();
            assert!(series.s2.is_finite() && series.s4.is_finite());
        }
    }
}

/// s2 and s4 from gains at h, 2h, 3h, with an error of the sixth order: solved from G - s0 = s2 w^2 + s4 w^4 + s6 w^6.
pub(crate) fn differentiated(gain: impl Fn(f64) -> f64, s0: f64, h: f64) -> (f64, f64) {
    let tau = std::f64::consts::TAU;
    let at = |m: f64| (gain(m * h) - s0) / (m * m);
    // Each is s2 h^2 + s4 h^4 m^2 + s6 h^6 m^4 in units of (2 pi)^2.
    let (a, b, c) = (at(1.0), at(2.0), at(3.0));
    let first = (b - a) / 3.0;
    let second = (c - b) / 5.0;
    let s6 = (second - first) / 8.0;
    let s4 = first - 5.0 * s6;
    let s2 = a - s4 - s6;
    let w2 = (tau * h).powi(2);
    (s2 / w2, s4 / (w2 * w2))
}

#[test]
fn series_agree_with_numerical_differentiation() {
    for rolloff in rolloffs() {
        let edge = edge(0.03, rolloff);
        let series = edge.low_series();
        let wc2 = (std::f64::consts::TAU * 0.03_f64).powi(2);
        let step = 0.03 * 0.02;
        for (series, side) in [(series, 0), (series.complement(), 1)] {
            let gain = |f: f64| if side == 0 { edge.split(f).0 } else { edge.split(f).1 };
            assert_eq!(series.s0, gain(0.0), "{rolloff:?}");
            let (s2, s4) = differentiated(gain, series.s0, step);
            // Truncation: the eighth order of a unit curve, (3 x 0.02)^6 and (3 x 0.02)^4; rounding 2^-52/0.02^4.
            assert!((s2 - series.s2).abs() * wc2 < 1e-7, "{rolloff:?}: {s2} {}", series.s2);
            assert!((s4 - series.s4).abs() * wc2 * wc2 < 2e-5, "{rolloff:?}: {s4} {}", series.s4);
        }
    }
    // Closed forms: Gaussian s2 = -ln 2/wc^2; order 1 s2 = -1/wc^2; order 2 s4 = -1/wc^4.
    let wc2 = (std::f64::consts::TAU * 0.03_f64).powi(2);
    let series = |rolloff| edge(0.03, rolloff).low_series();
    assert!((series(Rolloff::Gaussian).s2 * wc2 + LN_2).abs() < 1e-14);
    assert!((series(Rolloff::Butterworth { order: 1 }).s2 * wc2 + 1.0).abs() < 1e-14);
    assert!((series(Rolloff::Butterworth { order: 2 }).s4 * wc2 * wc2 + 1.0).abs() < 1e-14);
}
