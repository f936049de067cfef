//! The verdict: near and whole differences, levels, invariances.

use std::f64::consts::TAU;

use super::*;
use crate::baseline::Baseline;
use crate::forecast::Shape;
use crate::numeric::{fourier, noise};

/// A squared Butterworth low-pass of order 4.
struct LowPass {
    wavelength: f64,
}

impl LowPass {
    fn gain(&self, f: f64) -> f64 {
        1.0 / (1.0 + (f * self.wavelength).powi(8))
    }

    /// By the definition: the explicit extension, one period, its Fourier transform. Polynomials up to degree 3 pass.
    fn output(&self, samples: &[f64], extension: Extension, estimates: &EndEstimates) -> Vec<f64> {
        let n = samples.len();
        match extension {
            Extension::Symmetric(candidate) => {
                let baseline = candidate.polynomial(estimates, sum::mean(samples), n as f64);
                let at = |j: usize| baseline.at(j as f64 + 0.5);
                let rest: Vec<f64> = samples.iter().enumerate().map(|(j, v)| v - at(j)).collect();
                let output = self.extended(&rest, candidate.ends);
                output.iter().enumerate().map(|(j, v)| v + at(j)).collect()
            }
            Extension::Continued { left, right } => {
                let line: Vec<f64> = left.iter().rev().chain(samples).chain(right).copied().collect();
                self.extended(&line, Ends::EVEN)[left.len()..left.len() + n].to_vec()
            }
        }
    }

    fn extended(&self, samples: &[f64], ends: Ends) -> Vec<f64> {
        let n = samples.len();
        let periods = match ends {
            Ends::Periodic => 1,
            Ends::Mirror { left, right, .. } if left == right => 2,
            Ends::Mirror { .. } => 4,
        };
        let value = |i: i64| ends.fold(n, i).map_or(0.0, |(at, sign)| sign * samples[at]);
        let mut line: Vec<f64> = (0..(periods * n) as i64).map(value).collect();
        fourier::filter(&mut line, |f| self.gain(f), 0);
        line.truncate(n);
        line
    }
}

/// The output under the forecast.
fn foretold(forecast: &Forecast, output: &dyn Fn(Extension) -> Vec<f64>) -> Vec<f64> {
    let [left, right] = [Side::Left, Side::Right].map(|side| forecast.continuation(side));
    output(Extension::Continued { left: &left, right: &right })
}

fn judged(samples: &[f64], wavelength: f64) -> Verdict {
    let pass = LowPass { wavelength };
    let gain = |f: f64| pass.gain(f);
    let response = Response::of(Shape { gain: &gain, turns: 0, shortest_wavelength: wavelength }, samples.len());
    let estimates = estimates(samples, &response, noise::sigma(samples));
    let evidence = Evidence::gather(samples, Evidence::block_length(wavelength));
    let structure = evidence.as_ref().map(structure).unwrap_or_default();
    let output = |extension: Extension| pass.output(samples, extension, &estimates);
    let forecast = evidence.as_ref().map(|evidence| Forecast::combine(evidence, &response));
    let foretold = forecast.as_ref().map(|forecast| foretold(forecast, &output)).unwrap_or_default();
    let past = evidence.as_ref().zip(forecast.as_ref());
    let case = Case {
        samples,
        past: past
            .map(|(evidence, forecast)| Past { evidence, forecast, foretold: &foretold })
            .ok_or(Unjudged::FewBlocks),
        structure,
        estimates,
        response: &response,
        output: &output,
        formed: Formed::InOnePass,
        tolerance: Tolerance::Share(0.1),
    };
    Verdict::of(&case, FlatEnds::Ignored)
}

fn uniform(seed: u64) -> impl FnMut() -> f64 {
    let mut state = seed;
    move || {
        state = state.wrapping_mul(6364136223846793005).wrapping_add(1442695040888963407);
        (state >> 11) as f64 / (1u64 << 53) as f64 - 0.5
    }
}

/// A slow wander with a trend: no extension is marked out.
fn wander(len: usize) -> Vec<f64> {
    let mut draw = uniform(11);
    let (mut value, mut drift) = (0.0, 0.0);
    let mut step = |n: usize| {
        drift = 0.99 * drift + draw();
        value = 0.97 * value + drift;
        value + 0.05 * n as f64
    };
    (0..len).map(&mut step).collect()
}

fn revolutions(len: usize, count: f64) -> Vec<f64> {
    let mut draw = uniform(5);
    let angle = |n: usize| TAU * count * n as f64 / len as f64;
    (0..len).map(|n| angle(n).sin() + 0.4 * (3.0 * angle(n) + 1.0).cos() + 0.02 * draw()).collect()
}

#[test]
fn blocks_next_to_the_ends_tell_the_same_as_the_whole_output() {
    let samples = wander(6000);
    for wavelength in [40.0, 160.0, 400.0] {
        let pass = LowPass { wavelength };
        let gain = |f: f64| pass.gain(f);
        let response = Response::of(Shape { gain: &gain, turns: 0, shortest_wavelength: wavelength }, samples.len());
        let estimates = estimates(&samples, &response, noise::sigma(&samples));
        let evidence = Evidence::gather(&samples, Evidence::block_length(wavelength)).expect("blocks");
        let output = |extension: Extension| pass.output(&samples, extension, &estimates);
        let forecast = Forecast::combine(&evidence, &response);
        let foretold = foretold(&forecast, &output);
        let case = Case {
            samples: &samples,
            past: Ok(Past { evidence: &evidence, forecast: &forecast, foretold: &foretold }),
            structure: Structure::default(),
            estimates,
            response: &response,
            output: &output,
            formed: Formed::InOnePass,
            tolerance: Tolerance::Share(0.1),
        };
        let zone = response.zone(samples.len());
        let near = Near::new(&evidence, &response, zone).expect("a short reach");
        let whole = whole_differences(&case, &foretold, zone);
        for ((name, near), (same, whole)) in near_differences(&case, &forecast, &near).iter().zip(&whole) {
            assert_eq!(name, same);
            let (a, b) = (near.rms(zone), whole.rms(zone));
            // One block is a 64th of a wavelength: the response changes by a few per cent over it, to first order
            // without effect on a sum.
            let limit = if evidence.block() == 1 { 1e-3 } else { 0.01 };
            assert!((a - b).abs() <= limit * b.max(1e-3), "{name} at {wavelength}: {a} {b}");
            for j in [0, 7, zone / 2] {
                let off = (near.at(Side::Left, j) - whole.at(Side::Left, j)).abs();
                assert!(off <= 3.0 * limit * b.max(1e-3), "{name} at {wavelength}, {j}: {off} of {b}");
            }
        }
    }
}

#[test]
fn whole_revolutions_are_a_closed_record_and_broken_ones_are_not() {
    let whole = judged(&revolutions(1024, 8.0), 32.0);
    assert_eq!((whole.pick.name, whole.pick.level), ("periodic", Level::SupportedByStructure));
    assert_eq!(whole.auto, Auto::Periodic);
    assert!(whole.pick_sentence().starts_with("periodic supported by structure: the ends join"));
    let broken = judged(&revolutions(1024, 8.37), 32.0);
    assert_eq!(broken.auto, Auto::Forecast);
    assert_ne!(broken.pick.name, "periodic");
}

#[test]
fn a_straight_line_is_odd_about_its_ends() {
    let mut draw = uniform(3);
    let line: Vec<f64> = (0..512).map(|n| 0.2 * n as f64 + 0.01 * draw()).collect();
    let verdict = judged(&line, 32.0);
    let error = |name: &str| verdict.edge(name).map_or(f64::NAN, |e| e.predicted_error);
    assert!(error("odd-ends") < 0.2 * error("even"), "{} {}", error("odd-ends"), error("even"));
    assert!(error("even") < error("periodic") && error("hold") < error("zero"));
}

#[test]
fn scale_and_offset_change_nothing_and_reversal_swaps_the_ends() {
    let samples = wander(700);
    let moved: Vec<f64> = samples.iter().map(|v| 50.0 - 4.0 * v).collect();
    let reversed: Vec<f64> = samples.iter().rev().copied().collect();
    let (plain, moved, reversed) = (judged(&samples, 50.0), judged(&moved, 50.0), judged(&reversed, 50.0));
    assert_eq!(plain.pick.name, moved.pick.name);
    assert_eq!(plain.pick.level, moved.pick.level);
    // Zero padding and reflection through zero do depend on the offset.
    for (a, b) in plain.edges[..8].iter().zip(&moved.edges) {
        assert!((4.0 * a.predicted_error / b.predicted_error - 1.0).abs() < 1e-5, "{}", a.name);
        assert_eq!((a.adequacy, a.trusted), (b.adequacy, b.trusted));
    }
    fn swapped(name: &str) -> &str {
        match name {
            "even-odd" => "odd-even",
            "odd-even" => "even-odd",
            other => other,
        }
    }
    for edge in &plain.edges {
        let other = reversed.edge(swapped(&edge.name)).expect("the same rows");
        assert!((edge.predicted_error / other.predicted_error - 1.0).abs() < 1e-6, "{}", edge.name);
        let mirrored = other.trusted.map(|t| Trusted { first: 699 - t.last, last: 699 - t.first });
        assert_eq!(edge.trusted, mirrored, "{}", edge.name);
    }
}

#[test]
fn what_cannot_be_judged_is_not() {
    let cases: [(Vec<f64>, f64); 4] =
        [(wander(15), 5.0), (wander(100), 3.9), (vec![7.0; 100], 20.0), (vec![1.0], 10.0)];
    for (samples, wavelength) in cases {
        let verdict = judged(&samples, wavelength);
        assert_eq!((verdict.pick.level, verdict.pick.name, verdict.auto), (Level::NotJudged, "even", Auto::Even));
        assert!(verdict.edges.is_empty());
    }
    assert_eq!(judged(&wander(16), 5.0).edges.len(), 11);
}

fn edge(name: &'static str, predicted_error: f64, adequacy: Adequacy) -> Edge {
    Edge {
        name: name.into(),
        predicted_error,
        relative_error: predicted_error,
        bound: predicted_error,
        adequacy,
        trusted: None,
    }
}

#[test]
fn levels_follow_the_margin() {
    let rows = |errors: [f64; 7], adequacy| -> Vec<Edge> {
        CANDIDATES.iter().zip(errors).map(|(c, e)| edge(c.name, e, adequacy)).collect()
    };
    let cases = [
        ([2.0, 9.0, 9.0, 1.0, 9.0, 9.0, 9.0], Level::Supported, "odd-ends", 1),
        ([1.4, 9.0, 9.0, 1.0, 9.0, 9.0, 9.0], Level::Favoured, "odd-ends", 1),
        ([1.2, 9.0, 9.0, 1.0, 1.25, 9.0, 9.0], Level::NoClearWinner, "odd-ends", 3),
    ];
    for (errors, level, name, ties) in cases {
        let pick = Pick::among(&rows(errors, Adequacy::Borderline), None);
        assert_eq!((pick.level, pick.name, pick.ties.len()), (level, name, ties));
        assert!(!pick.choice_immaterial);
    }
    let within = Pick::among(&rows([1.2, 9.0, 9.0, 1.0, 9.0, 9.0, 9.0], Adequacy::Within), None);
    assert!(within.choice_immaterial && within.ties == ["even", "odd-ends"]);
    // A closed record wins though another one is a little nearer, not when it is far nearer.
    let closed = join::Join { ratio: 1.0, share: 0.002, median: 100.0 };
    let picked =
        |periodic| Pick::among(&rows([9.0, periodic, 9.0, 1.0, 9.0, 9.0, 9.0], Adequacy::Within), Some(&closed));
    assert_eq!(picked(1.4).level, Level::SupportedByStructure);
    assert_eq!(picked(1.6).level, Level::Supported);
    let powerless = join::Join { median: 3.0, ..closed };
    let pick = Pick::among(&rows([9.0, 1.0, 9.0, 9.0, 9.0, 9.0, 9.0], Adequacy::Within), Some(&powerless));
    assert_eq!(pick.level, Level::Supported);
}

#[test]
fn a_stricter_tolerance_trims_more() {
    let samples = wander(1000);
    let pass = LowPass { wavelength: 50.0 };
    let gain = |f: f64| pass.gain(f);
    let response = Response::of(Shape { gain: &gain, turns: 0, shortest_wavelength: 50.0 }, samples.len());
    let estimates = estimates(&samples, &response, noise::sigma(&samples));
    let evidence = Evidence::gather(&samples, 1).expect("blocks");
    let forecast = Forecast::combine(&evidence, &response);
    let output = |extension: Extension| pass.output(&samples, extension, &estimates);
    let foretold = foretold(&forecast, &output);
    let verdict = |tolerance| {
        let case = Case {
            samples: &samples,
            past: Ok(Past { evidence: &evidence, forecast: &forecast, foretold: &foretold }),
            structure: Structure::default(),
            estimates,
            response: &response,
            output: &output,
            formed: Formed::InOnePass,
            tolerance,
        };
        Verdict::of(&case, FlatEnds::Ignored)
    };
    let shares = [1e-4, 0.01, 0.1, 10.0].map(|share| verdict(Tolerance::Share(share)));
    for name in ["even", "forecast"] {
        let kept = |v: &Verdict| v.edge(name).and_then(|e| e.trusted).map_or(0, |t| t.last - t.first + 1);
        assert!(shares.windows(2).all(|pair| kept(&pair[0]) <= kept(&pair[1])));
        assert_eq!(kept(&shares[3]), 1000);
        // At most the reach is trimmed, however strict.
        assert!(kept(&shares[0]) >= 1000 - 2 * response.reach());
        assert_eq!(shares[3].edge(name).map(|e| e.adequacy), Some(Adequacy::Within));
        assert_eq!(shares[0].edge(name).map(|e| e.adequacy), Some(Adequacy::Outside));
    }
    let absolute = verdict(Tolerance::Absolute(0.1 * shares[2].output_deviation));
    assert_eq!(absolute.edges, shares[2].edges);
}

#[test]
fn the_candidates_fit_the_baselines_of_the_library() {
    let samples = wander(400);
    let scale = Scale { shortest_wavelength: 40.0, zone: 40 };
    let found = EndEstimates::of(&samples, Ends::EVEN, scale);
    for candidate in &CANDIDATES {
        let own = candidate.polynomial(&found, sum::mean(&samples), 400.0);
        let fitted = Baseline::fit(candidate.baseline, &samples, candidate.ends, scale).expect("a fit");
        for x in [0.0, 123.0, 400.0] {
            assert!((own.at(x) - fitted.polynomial().at(x)).abs() < 1e-9, "{}", candidate.name);
        }
    }
}
