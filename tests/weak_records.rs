//! Records on which the verdict is known to be weak, and what is said about them; and one open record as a witness.

use std::fs;
use std::path::Path;
use std::process::Command;

use endgrain::baseline::BaselineKind;
use endgrain::basis::Planner;
use endgrain::compare::{Continuation, ToleranceRequest, choose, judge};
use endgrain::condition::{Stage, condition, condition_continued};
use endgrain::ends::{Ends, Seat};
use endgrain::operator::{Chain, Request, Shape};
use endgrain::record::{Axis, Channel, RateSource};
use endgrain::unit::Unit;
use serde_json::Value;

/// Uniform noise between -1 and 1 (multiplicative congruential, Knuth's constants, from memory).
fn noise(seed: u64) -> impl FnMut() -> f64 {
    let mut state = seed;
    move || {
        state = state.wrapping_mul(6364136223846793005).wrapping_add(1442695040888963407);
        (state >> 11) as f64 / (1u64 << 52) as f64 - 1.0
    }
}

const LEN: usize = 1024;

/// One channel compared under a 2 Hz low-pass at 100 Hz.
fn compared(record: impl Fn(usize) -> f64, options: &[&str]) -> Value {
    let folder = tempfile::tempdir().expect("a temporary folder");
    let rows: String = (0..LEN).map(|n| format!("{:.2},{}\n", n as f64 / 100.0, record(n))).collect();
    fs::write(folder.path().join("in.csv"), format!("t [s],a [g]\n{rows}")).expect("a file");
    let output = Command::new(env!("CARGO_BIN_EXE_endgrain"))
        .args(["compare", "in.csv", "--lowpass", "2Hz", "--json"])
        .args(options)
        .current_dir(folder.path())
        .output()
        .expect("the program runs");
    assert!(output.status.success(), "{}", String::from_utf8_lossy(&output.stderr));
    let report: Value = serde_json::from_slice(&output.stdout).expect("JSON");
    report["channels"][0].clone()
}

fn sentence(channel: &Value) -> &str {
    channel["verdict"]["sentence"].as_str().expect("a sentence")
}

fn noisy(seed: u64, amplitude: f64) -> Vec<f64> {
    let mut next = noise(seed);
    (0..LEN).map(|_| amplitude * next()).collect()
}

#[test]
fn a_burst_at_rest_is_never_called_closed_and_errs_on_the_safe_side() {
    // At rest at both ends the join is smooth, and so is any join there: the test has no power and must not claim.
    let rest = noisy(3, 1e-3);
    let burst = |n: usize| {
        let u = (n as f64 - 512.0) / 60.0;
        (-u * u).exp() * (0.5 * n as f64).sin() + rest[n]
    };
    let channel = compared(burst, &[]);
    assert_ne!(channel["verdict"]["level"], "supported_by_structure", "{}", sentence(&channel));
    assert_eq!(channel["takes"], "forecast");
    // The true output near the ends is low-passed noise of 1e-3: the predicted error must not be below a tenth of that
    // and is allowed to be several times too large.
    let predicted = channel["verdict"]["predicted_error"].as_f64().expect("a number");
    assert!(predicted > 1e-5 && predicted < 1e-2, "{predicted}");
}

#[test]
fn a_stepped_record_is_told_that_events_outside_are_excepted() {
    let mut next = noise(11);
    let mut level = 0.0;
    let steps: Vec<f64> = (0..LEN)
        .map(|_| {
            if next().abs() < 0.01 {
                level = (5.0 * next()).round();
            }
            level
        })
        .collect();
    let channel = compared(|n| steps[n], &[]);
    assert!(sentence(&channel).contains("events outside the record excepted"), "{}", sentence(&channel));
    assert_ne!(channel["verdict"]["level"], "supported_by_structure");
}

#[test]
fn physical_symmetry_is_not_claimed_but_can_be_asserted() {
    // A rod with insulated ends: a cosine series, even at both ends by physics. The record cannot prove that.
    let rest = noisy(5, 1e-3);
    let rod = |n: usize| {
        let x = std::f64::consts::PI * (n as f64 + 0.5) / LEN as f64;
        let series: f64 =
            (1..9).map(|k| f64::from(1 - 2 * (k % 2)) * (f64::from(k) * x).cos() / f64::from(k * k)).sum();
        series + rest[n]
    };
    let channel = compared(rod, &[]);
    assert_ne!(channel["verdict"]["level"], "supported_by_structure", "{}", sentence(&channel));
    let asserted = compared(rod, &["--assert", "zero-slope"]);
    assert_eq!(asserted["takes"], "even");
    assert_eq!(asserted["verdict"]["assertion"], "not_contradicted");
    assert!(sentence(&asserted).contains("asserted zero-slope: not contradicted"), "{}", sentence(&asserted));
    let wrong = compared(rod, &["--assert", "closed"]);
    assert_eq!(wrong["verdict"]["assertion"], "contradicted");
}

#[test]
fn a_closed_record_is_supported_by_structure() {
    // A roundness trace: whole revolutions.
    let rest = noisy(7, 1e-3);
    let round = |n: usize| {
        let turn = std::f64::consts::TAU * n as f64 / LEN as f64;
        (3.0 * turn).sin() + 0.4 * (8.0 * turn + 1.0).cos() + 0.2 * (25.0 * turn).sin() + rest[n]
    };
    let channel = compared(round, &[]);
    assert_eq!(channel["verdict"]["level"], "supported_by_structure", "{}", sentence(&channel));
    assert_eq!(channel["takes"], "periodic");
    assert!(
        sentence(&channel).starts_with("periodic supported by structure: the ends join as smoothly as the interior")
    );
}

#[test]
fn wordings_are_the_ones_that_were_agreed() {
    let rest = noisy(9, 0.3);
    let channel = compared(|n| (0.02 * n as f64).sin() + rest[n], &[]);
    let text = sentence(&channel);
    let level = channel["verdict"]["level"].as_str().expect("a level");
    let opening = match level {
        "supported_by_structure" => "supported by structure",
        "supported" => "supported: next best is",
        "favoured" => "favoured: next best is",
        "no_clear_winner" => "no clear winner among",
        other => panic!("judged as {other}"),
    };
    assert!(text.contains(opening), "{text}");
    assert!(["within tolerance", "borderline", "outside tolerance"].iter().any(|word| text.contains(word)), "{text}");
    assert!(text.contains("trusted span") || text.contains("no trusted span"), "{text}");
}

/// Yearly sunspot numbers 1700 to 2008 (public domain; carried by statsmodels 0.14.6, see `fixtures/open/SOURCES.md`).
fn sunspots() -> Vec<f64> {
    let path = Path::new(env!("CARGO_MANIFEST_DIR")).join("fixtures/open/sunspots_yearly.csv");
    let text = fs::read_to_string(path).expect("the open record");
    text.lines()
        .skip(1)
        .map(|line| line.split(',').nth(1).expect("a field").trim().parse().expect("a number"))
        .collect()
}

#[test]
fn the_open_record_is_the_published_one() {
    // SILSO yearly numbers as in statsmodels: 309 values, mean 49.75210356, strongest cosine half-cycles 56 (11.036 years).
    let record = sunspots();
    assert_eq!(record.len(), 309);
    assert!((endgrain::numeric::sum::mean(&record) - 49.75210356).abs() < 1e-8);
    let plan = Planner::new().plan(Ends::EVEN, record.len()).expect("a plan");
    let mut c = record.clone();
    plan.forward(&mut c, &mut vec![f64::NAN; plan.scratch_len()]);
    let strongest = (1..c.len()).max_by(|a, b| c[*a].abs().total_cmp(&c[*b].abs())).expect("coefficients");
    assert_eq!(strongest, 56);
    assert!((2.0 * 309.0 / strongest as f64 - 11.036).abs() < 1e-3);
}

#[test]
fn on_an_open_record_the_forecast_beats_even_and_keeps_its_bound() {
    let whole = sunspots();
    let unit = Unit::unknown();
    let planner = Planner::new();
    let (mut kept, mut cases, mut log_ratio) = (0, 0, 0.0);
    for len in [64, 128] {
        for start in (64..=whole.len() - 64 - len).step_by(9) {
            for wavelength in [8.0, 16.0] {
                let chain = |n: usize| {
                    let axis = Axis::from_rate_hz(1.0, n, RateSource::Given).expect("an axis");
                    let request = Request::parse("lowpass", &format!("{wavelength}s")).expect("a request");
                    let (chain, _) = Chain::resolve(&[request], &Shape::default(), &axis, n).expect("a chain");
                    (axis, chain)
                };
                let (axis, long) = chain(whole.len());
                let channel = Channel { name: "spots", unit: &unit, axis: &axis, samples: &whole };
                let truth =
                    condition(channel, &long, Ends::EVEN, BaselineKind::None, &planner).expect("a truth").output;
                let truth = &truth[start..start + len];
                let (axis, short) = chain(len);
                let samples = &whole[start..start + len];
                let channel = Channel { name: "spots", unit: &unit, axis: &axis, samples };
                let judgement =
                    judge(channel, &short, Seat::Half, &ToleranceRequest::default(), &planner).expect("a judgement");
                let verdict = judgement.verdict.as_ref().expect("a verdict");
                let stage = Stage::default();
                let chosen = choose(samples, &short, &stage, &Default::default(), Some(&judgement)).expect("a choice");
                let Continuation::Given([left, right]) = &chosen.continuation else { continue };
                let forecast =
                    condition_continued(channel, &short, left, right, Seat::Half, &planner).expect("a result").output;
                let even =
                    condition(channel, &short, Ends::EVEN, BaselineKind::None, &planner).expect("a result").output;
                let zone = verdict.zone;
                let error = |y: &[f64]| {
                    let ends = (0..zone).chain(len - zone..len);
                    (ends.map(|n| (y[n] - truth[n]).powi(2)).sum::<f64>() / (2 * zone) as f64).sqrt()
                };
                cases += 1;
                kept += usize::from(error(&forecast) <= verdict.edge("forecast").expect("a row").bound);
                log_ratio += (error(&forecast) / error(&even)).ln();
            }
        }
    }
    assert!(cases >= 30, "{cases}");
    // Stated coverage 95 of 100; these windows overlap, so that the count scatters more than a binomial one would.
    assert!(kept as f64 >= 0.9 * cases as f64, "{kept} of {cases}");
    assert!(log_ratio / (cases as f64) < 0.0, "{}", log_ratio / cases as f64);
}
