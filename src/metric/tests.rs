//! Leakage, decay and jumps against closed forms.

use std::f64::consts::PI;

use super::*;
use crate::baseline::{Baseline, BaselineKind, EndEstimates, Scale};
use crate::basis::Planner;
use crate::ends::Ends;
use crate::numeric::polynomial::Polynomial;

const N: usize = 1024;
/// Half cycles per record above which the table counts.
const FAR: f64 = 32.0;

/// Samples of a function of x/L on the half-sample seat.
fn sampled(function: impl Fn(f64) -> f64) -> Vec<f64> {
    (0..N).map(|n| function((n as f64 + 0.5) / N as f64)).collect()
}

fn measured<T>(samples: &[f64], ends: Ends, powers: &[f64], measure: impl Fn(&Subject) -> T) -> T {
    let scaled: Vec<f64> = powers.iter().enumerate().map(|(j, p)| p / (N as f64).powi(j as i32)).collect();
    let baseline = Baseline::exact(BaselineKind::Line, Polynomial::from_powers(N as f64, &scaled));
    let estimates = EndEstimates::of(samples, ends, Scale { shortest_wavelength: 32.0, zone: 32 });
    let subject = Subject::of(samples, ends, &baseline, &estimates, &Planner::new()).expect("samples");
    measure(&subject)
}

/// Sum over k > `from` of the mean square of a series' terms, its slow tail included to a millionth.
fn tail(from: usize, term: impl Fn(f64) -> f64) -> f64 {
    (from + 1..3_000_000).rev().map(|k| term(k as f64)).sum()
}

fn is_odd(k: f64) -> bool {
    k % 2.0 == 1.0
}

/// exp(-3), the end value of the third test function.
fn end() -> f64 {
    (-3.0_f64).exp()
}

/// exp(-3 x) - 1 - (exp(-3) - 1) x: sine coefficient k on 0..1, from the integrals of each part.
fn sine_of_bent_rest(k: f64) -> f64 {
    let (w, sign) = (k * PI, if is_odd(k) { -1.0 } else { 1.0 });
    let exponential = w * (1.0 - sign * end()) / (9.0 + w * w);
    2.0 * (exponential - (1.0 - sign) / w + (end() - 1.0) * sign / w)
}

#[test]
fn leakage_is_the_tail_of_the_fourier_series() {
    // Each row: function, its variance, ends, baseline in powers of x/L, and the exact tail of its continuous series.
    // Sampling folds the tail above the sampling rate back, which at N = 1024 moves it by less than 0.05 dB.
    let (line, half_sine, bent) = (|x: f64| x, |x: f64| (PI * x).sin(), |x: f64| (-3.0 * x).exp());
    let line_variance = 1.0 / 12.0;
    let sine_variance = 0.5 - 4.0 / (PI * PI);
    let bent_variance = (1.0 - end() * end()) / 6.0 - ((1.0 - end()) / 3.0).powi(2);
    let arch = |m: f64| 8.0 / (PI * (1.0 - 4.0 * m * m)).powi(2);
    type Row<'a> = (&'a str, Vec<f64>, f64, Ends, &'a [f64], f64);
    let chord = [1.0, end() - 1.0];
    let rows: [Row; 10] = [
        ("line periodic", sampled(line), line_variance, Ends::Periodic, &[], tail(16, |m| 0.5 / (PI * m).powi(2))),
        (
            "line even",
            sampled(line),
            line_variance,
            Ends::EVEN,
            &[],
            tail(32, |k| if is_odd(k) { 8.0 / (PI * k).powi(4) } else { 0.0 }),
        ),
        ("line odd-zero", sampled(line), line_variance, Ends::ODD, &[], tail(32, |k| 2.0 / (PI * k).powi(2))),
        (
            "line odd-mean",
            sampled(line),
            line_variance,
            Ends::ODD,
            &[0.5],
            tail(32, |k| if is_odd(k) { 0.0 } else { 2.0 / (PI * k).powi(2) }),
        ),
        ("half-sine periodic", sampled(half_sine), sine_variance, Ends::Periodic, &[], tail(16, arch)),
        ("half-sine even", sampled(half_sine), sine_variance, Ends::EVEN, &[], tail(16, arch)),
        (
            "exp periodic",
            sampled(bent),
            bent_variance,
            Ends::Periodic,
            &[],
            tail(16, |m| 2.0 * (1.0 - end()).powi(2) / (9.0 + (2.0 * PI * m).powi(2))),
        ),
        (
            "exp periodic-line",
            sampled(bent),
            bent_variance,
            Ends::Periodic,
            &chord,
            // (1 - e)(1/(3 + iw) + i/w) = (1 - e)(3i/w)/(3 + iw), w = 2 pi m.
            tail(16, |m| {
                let w = 2.0 * PI * m;
                2.0 * ((1.0 - end()) * 3.0 / w).powi(2) / (9.0 + w * w)
            }),
        ),
        (
            "exp even",
            sampled(bent),
            bent_variance,
            Ends::EVEN,
            &[],
            tail(32, |k| {
                let sign = if is_odd(k) { -1.0 } else { 1.0 };
                0.5 * (6.0 * (1.0 - sign * end()) / (9.0 + (k * PI).powi(2))).powi(2)
            }),
        ),
        (
            "exp odd-ends",
            sampled(bent),
            bent_variance,
            Ends::ODD,
            &chord,
            tail(32, |k| 0.5 * sine_of_bent_rest(k).powi(2)),
        ),
    ];
    for (name, samples, variance, ends, powers, sum) in rows {
        let found = measured(&samples, ends, powers, |s| leakage::share_beyond(s, FAR));
        let difference = 10.0 * (found / (sum / variance)).log10();
        assert!(difference.abs() < 0.05, "{name}: {difference} dB off {} dB", 10.0 * (sum / variance).log10());
    }
}

#[test]
fn what_a_basis_holds_exactly_does_not_leak() {
    assert_eq!(measured(&sampled(|x| x), Ends::ODD, &[0.0, 1.0], leakage::share_db), None);
    assert_eq!(measured(&sampled(|x| x), Ends::Periodic, &[0.0, 1.0], leakage::share_db), None);
    let half_sine = measured(&sampled(|x| (PI * x).sin()), Ends::ODD, &[], |s| leakage::share_beyond(s, FAR));
    // One function of the basis: rounding of ten stages on 1024 samples.
    assert!(half_sine < 1e-28, "{half_sine}");
}

#[test]
fn coefficients_fall_by_the_order_of_the_first_jump() {
    // Textbook orders: a jump k^-1, a kink k^-2, a jump of curvature k^-3, of the third derivative k^-4. The octaves
    // with one or two functions, and the folded top ones, move the slope by up to 0.1 per order.
    let bent = sampled(|x| (-3.0 * x).exp());
    let slopes = [0.0, -3.0, (3.0 - 3.0 * end()) / 2.0];
    let cases: [(Ends, &[f64], f64); 5] = [
        (Ends::Periodic, &[], 1.0),
        (Ends::ODD, &[], 1.0),
        (Ends::EVEN, &[], 2.0),
        (Ends::ODD, &[1.0, end() - 1.0], 3.0),
        (Ends::EVEN, &slopes, 4.0),
    ];
    for (ends, powers, order) in cases {
        let found = measured(&bent, ends, powers, decay::exponent).expect("many octaves");
        assert!((found - order).abs() < 0.1 * order, "{} {order}: {found}", ends.name());
    }
    assert_eq!(measured(&sampled(|x| x), Ends::ODD, &[0.0, 1.0], decay::exponent), None);
}

#[test]
fn jumps_are_those_drawn_by_hand() {
    // 2 + 3x on 0..1: value 2 to 5, slope 3 a record.
    let line = sampled(|x| 2.0 + 3.0 * x);
    let per_step = 1.0 / N as f64;
    for (ends, value, slope) in
        [(Ends::Periodic, 3.0, 0.0), (Ends::EVEN, 0.0, 6.0), (Ends::ODD, 10.0, 0.0), (Ends::EVEN_ODD, 10.0, 6.0)]
    {
        let found = measured(&line, ends, &[], |s| (jump::value(s), jump::slope(s)));
        let (Some(v), Some(s)) = found else { panic!("always there") };
        assert!((v - value).abs() < 1e-9 && (s - slope * per_step).abs() < 1e-9, "{}: {v} {s}", ends.name());
    }
    let split = measured(&line, Ends::ODD, &[2.0, 3.0], |s| (jump::value(s), jump::slope(s)));
    assert!(split.0.is_some_and(|v| v < 1e-9) && split.1 == Some(0.0));
}

#[test]
fn scale_offset_and_direction_change_no_ratio() {
    let x = sampled(|x| (-3.0 * x).exp() + 0.1 * (40.0 * x).sin());
    let scaled: Vec<f64> = x.iter().map(|v| 5.0 - 7.0 * v).collect();
    let reversed: Vec<f64> = x.iter().rev().copied().collect();
    for metric in METRICS.iter().filter(|m| matches!(m.unit, Measure::Decibels | Measure::Bare)) {
        let found = |samples: &[f64]| measured(samples, Ends::EVEN, &[], metric.measure).expect("a number");
        let (a, b, c) = (found(&x), found(&scaled), found(&reversed));
        assert!((a - b).abs() < 1e-6 && (a - c).abs() < 1e-6, "{}: {a} {b} {c}", metric.key);
    }
}

#[test]
fn every_measure_survives_every_record() {
    for samples in [vec![3.0], vec![1.0, 2.0], vec![0.0; 40], vec![1e300, -1e300, 1e300]] {
        for ends in Ends::all() {
            let estimates = EndEstimates::of(&samples, ends, Scale::assumed(samples.len()));
            let baseline = Baseline::exact(BaselineKind::None, Polynomial::zero(samples.len() as f64));
            let subject = Subject::of(&samples, ends, &baseline, &estimates, &Planner::new()).expect("samples");
            for metric in &METRICS {
                let _ = (metric.measure)(&subject);
            }
        }
    }
}
