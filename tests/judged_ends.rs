//! What is judged at the ends is what is used there: in every seat, assertion and refusal.

mod runs;

use endgrain::basis::Planner;
use endgrain::compare::{ToleranceRequest, judge};
use endgrain::condition::{condition, condition_continued};
use endgrain::ends::Seat;
use endgrain::operator::{Chain, Request, Shape};
use endgrain::record::{Axis, Channel, RateSource};
use endgrain::unit::Unit;
use endgrain::verdict::CANDIDATES;
use runs::{Run, endgrain, fixture};
use serde_json::Value;

const LEN: usize = 800;

/// Uniform noise between -1 and 1 (multiplicative congruential, Knuth's constants, from memory).
fn noise(seed: u64) -> impl FnMut() -> f64 {
    let mut state = seed;
    move || {
        state = state.wrapping_mul(6364136223846793005).wrapping_add(1442695040888963407);
        (state >> 11) as f64 / (1u64 << 52) as f64 - 1.0
    }
}

/// A slope with two tones and a little noise: steep and off zero at both ends.
fn slope() -> Vec<f64> {
    let mut rest = noise(17);
    (0..LEN)
        .map(|n| {
            let t = n as f64 / 100.0;
            2.0 + 0.5 * t + (3.1 * t).sin() + 0.3 * (11.0 * t).cos() + 0.01 * rest()
        })
        .collect()
}

fn table(head: &str, columns: &[&[f64]]) -> String {
    let row = |n: usize| {
        let values: String = columns.iter().map(|column| format!(",{}", column[n])).collect();
        format!("{:.2}{values}\n", n as f64 / 100.0)
    };
    format!("{head}\n{}", (0..columns[0].len()).map(row).collect::<String>())
}

/// A folder with `in.csv`, one channel at 100 Hz.
fn one_channel(samples: &[f64]) -> Run {
    let run = Run::new();
    run.file("in.csv", &table("t [s],a [g]", &[samples]));
    run
}

fn json(run: &Run, name: &str) -> Value {
    serde_json::from_str(&run.text(name)).expect("JSON")
}

#[test]
fn on_the_whole_sample_seat_every_row_is_that_of_its_own_output() {
    let samples = slope();
    let unit = Unit::parse("g");
    let axis = Axis::from_rate_hz(100.0, LEN, RateSource::Given).expect("an axis");
    let request = Request::parse("lowpass", "8Hz").expect("a request");
    let (chain, _) = Chain::resolve(&[request], &Shape::default(), &axis, LEN).expect("a chain");
    let channel = Channel { name: "a", unit: &unit, axis: &axis, samples: &samples };
    let planner = Planner::new();
    for (seat, tolerance) in [(Seat::Whole, 1e-9), (Seat::Half, 0.02)] {
        let judged = judge(channel, &chain, seat, &ToleranceRequest::default(), &planner).expect("a judgement");
        let verdict = judged.verdict.as_ref().expect("a verdict");
        let [left, right] = judged.forecast.as_ref().expect("a forecast");
        let foretold = condition_continued(channel, &chain, left, right, seat, &planner).expect("an output").output;
        let own = verdict.edge("forecast").expect("a row").predicted_error;
        for candidate in &CANDIDATES {
            let ends = candidate.ends.seated(seat);
            let output = condition(channel, &chain, ends, candidate.baseline, &planner).expect("an output").output;
            let zone = (0..verdict.zone).chain(LEN - verdict.zone..LEN);
            let squares: f64 = zone.map(|n| (output[n] - foretold[n]).powi(2)).sum();
            // The predicted error is the distance from the forecast's output and the forecast's own error together.
            let expected = own.hypot((squares / (2 * verdict.zone) as f64).sqrt());
            let found = verdict.edge(candidate.name).expect("a row").predicted_error;
            assert!((found / expected - 1.0).abs() < tolerance, "{} {seat:?}: {found} {expected}", candidate.name);
        }
    }
}

#[test]
fn extensions_without_a_row_of_their_own_are_judged_by_their_output() {
    let run = one_channel(&slope());
    let cases: &[(&str, &[&str], &str)] = &[
        ("odd", &["--extension", "odd"], "odd-zero"),
        ("value", &["--assert", "zero-value"], "odd-zero"),
        ("mixed", &["--assert", "left:zero-slope", "--assert", "right:zero-value"], "even-odd + none"),
        ("trend", &["--extension", "odd", "--baseline", "trend"], "odd + trend:1"),
        ("side", &["--assert", "left:zero-slope"], "left:zero-slope/forecast"),
        ("whole", &["--extension", "even", "--seat", "whole-sample"], "even"),
        ("line", &["--extension", "odd", "--baseline", "line"], "odd-ends"),
    ];
    for (name, options, row) in cases {
        let common =
            ["condition", "in.csv", "--lowpass", "3Hz", "--tolerance", "400%", "--require", "borderline", "-q"];
        let out = format!("{name}.csv");
        run.ok(&[&common[..], options, &["--edges", "mark", "-o", &out]].concat());
        let channel = &json(&run, &format!("{out}.json"))["channels"][0];
        let verdict = &channel["verdict"];
        assert!(verdict["adequacy"].is_string() && verdict["bound"].as_f64() > Some(0.0), "{name}: {verdict}");
        let sentence = verdict["sentence"].as_str().expect("a sentence");
        assert!(sentence.contains(&format!("{row}: edge error")), "{name}: {sentence}");
        assert_eq!(channel["not_judged"], Value::Null);
        assert!(run.text(&out).lines().skip(1).all(|line| line.ends_with(",1") || line.ends_with(",0")), "{name}");
    }
    // A reflection through zero of a record that stands at 2 is far worse than one about its trend.
    let error = |name: &str| json(&run, name)["channels"][0]["verdict"]["predicted_error"].as_f64().expect("a number");
    assert!(error("odd.csv.json") > 10.0 * error("trend.csv.json"));
    assert!(error("side.csv.json") < error("value.csv.json"));
}

#[test]
fn nothing_that_was_asked_for_gives_way_in_silence() {
    let run = one_channel(&slope());
    let cases: &[(&[&str], &[&str])] = &[
        (
            &["--lowpass", "3Hz", "--extension", "forecast", "--assert", "closed"],
            &["--assert closed", "--extension forecast"],
        ),
        (
            &["--lowpass", "3Hz", "--extension", "symmetric", "--assert", "zero-slope"],
            &["--assert", "--extension symmetric"],
        ),
        (&["--lowpass", "3Hz", "--extension", "odd", "--assert", "closed"], &["--assert", "--extension odd"]),
        (
            &["--integrate", "1", "--conditions", "steady", "--insist", "--extension", "forecast"],
            &["--extension forecast", "high-pass", "--highpass"],
        ),
        (
            &["--integrate", "1", "--conditions", "steady", "--insist", "--lowpass", "3Hz", "--extension", "symmetric"],
            &["--extension symmetric", "high-pass"],
        ),
        (
            &["--differentiate", "1", "--smooth", "none", "--extension", "forecast"],
            &["--extension forecast", "no corner"],
        ),
        (
            &["--integrate", "1", "--conditions", "steady", "--insist", "--assert", "left:zero-slope"],
            &["--assert left:zero-slope", "high-pass"],
        ),
        (&["--lowpass", "3Hz", "--assert", "left:zero-slope", "--baseline", "mean"], &["--baseline mean", "--assert"]),
        (&["--lowpass", "3Hz", "--baseline", "line"], &["--baseline line", "--extension auto"]),
    ];
    for command in ["condition", "compare"] {
        for (options, told) in cases {
            let output: &[&str] = if command == "condition" { &["-o", "out.csv"] } else { &[] };
            let message = run.fails(2, &[&[command, "in.csv"], *options, output].concat());
            for word in *told {
                assert!(message.contains(word), "{command} {options:?}: {message}");
            }
        }
    }
    assert_eq!(run.files(), ["in.csv"]);
}

#[test]
fn an_explicit_baseline_is_honoured_beside_an_assertion() {
    let run = one_channel(&slope());
    let mixed = ["--assert", "left:zero-slope", "--assert", "right:zero-value"];
    let cases: &[(&str, &[&str], &str, &str)] = &[
        ("plain.csv", &[], "none", "asserted"),
        ("level.csv", &["--baseline", "level"], "level", "asked"),
        ("line.csv", &["--baseline", "line"], "line", "asked"),
    ];
    for (out, options, kind, how) in cases {
        run.ok(&[&["condition", "in.csv", "--lowpass", "3Hz", "-o", out][..], &mixed, options].concat());
        let baseline = &json(&run, &format!("{out}.json"))["channels"][0]["baseline"];
        assert_eq!((baseline["kind"].as_str(), baseline["how"].as_str()), (Some(*kind), Some(*how)));
    }
    assert_ne!(run.text("plain.csv"), run.text("level.csv"));
    // The asserted slope is zero: none is split off before a derivative.
    run.ok(&[
        "condition",
        "in.csv",
        "--differentiate",
        "1",
        "--lowpass",
        "3Hz",
        "--assert",
        "zero-slope",
        "-o",
        "d.csv",
    ]);
    assert_eq!(json(&run, "d.csv.json")["channels"][0]["baseline"]["kind"], "none");
}

#[test]
fn a_requirement_names_the_channels_that_fail_and_why() {
    let run = Run::new();
    let (live, dead) = (slope(), vec![0.0; LEN]);
    run.file("two.csv", &table("t [s],a [g],b [g]", &[&live, &dead]));
    let met = ["--tolerance", "400%", "--require", "borderline"];
    // A dead channel has nothing to judge; nor has a plain conversion.
    run.ok(&[&["condition", "two.csv", "--lowpass", "3Hz", "-o", "met.csv"][..], &met].concat());
    let report = json(&run, "met.csv.json");
    assert_eq!((&report["requirement_met"], &report["channels"][1]["not_judged"]), (&true.into(), &"constant".into()));
    run.ok(&["condition", "two.csv", "--require", "within", "-o", "same.csv"]);
    let told = run.fails(
        1,
        &["condition", "two.csv", "--lowpass", "3Hz", "--tolerance", "0.001%", "--require", "within", "-o", "not.csv"],
    );
    assert!(told.contains("\"a\": the edges are") && told.contains("tolerance") && !told.contains("\"b\":"), "{told}");
    let unmet = &json(&run, "not.csv.json")["unmet"];
    assert_eq!(unmet.as_array().map(Vec::len), Some(1));
    // What `compare` says of a requirement is what `condition` says.
    let strict = ["--lowpass", "3Hz", "--tolerance", "0.001%", "--require", "within"];
    run.fails(1, &[&["compare", "two.csv", "--json", "c.json"][..], &strict].concat());
    assert_eq!(&json(&run, "c.json")["unmet"], unmet);
    run.ok(&[&["compare", "two.csv", "--lowpass", "3Hz"][..], &met].concat());
    run.ok(&["compare", "two.csv", "--require", "within"]);
    // What was not judged though it might matter is not met.
    run.file("short.csv", &table("t [s],a [g]", &[&live[..12]]));
    let told = run.fails(1, &["condition", "short.csv", "--lowpass", "10Hz", "--require", "borderline", "-o", "s.csv"]);
    assert!(told.contains("not judged: the record is shorter than 16 samples"), "{told}");
    // A constant that an odd extension turns over is not kept.
    run.file("high.csv", &table("t [s],a [g]", &[&[5.0; LEN]]));
    let odd = ["condition", "high.csv", "--lowpass", "3Hz", "--require", "within", "--extension", "odd"];
    let told = run.fails(1, &[&odd[..], &["-o", "odd.csv"]].concat());
    assert!(told.contains("turns its sign"), "{told}");
    run.ok(&[&odd[..], &["--baseline", "mean", "-o", "mean.csv"]].concat());
}

#[test]
fn a_record_that_is_not_judged_says_what_is_used() {
    let run = one_channel(&slope()[..12]);
    let told =
        run.ok(&["condition", "in.csv", "--lowpass", "10Hz", "--extension", "odd", "--tolerance", "5%", "-o", "o.csv"]);
    assert!(told.contains("; odd is used") && !told.contains("even is used"), "{told}");
    let told = run.ok(&["condition", "in.csv", "--lowpass", "10Hz", "--extension", "forecast", "-o", "f.csv"]);
    assert!(told.contains("note: channel \"a\": --extension forecast has nothing to rest on"), "{told}");
    run.fails(2, &["condition", "in.csv", "--lowpass", "10Hz", "--extension", "forecast", "--strict", "-o", "x.csv"]);
    let table = endgrain(run.folder(), &["compare", "in.csv", "--lowpass", "10Hz"]);
    let table = String::from_utf8_lossy(&table.stdout).into_owned();
    assert!(table.contains("not judged: the record is shorter than 16 samples") && !table.contains("none"), "{table}");
}

#[test]
fn a_plot_shows_every_channel_judged_or_not() {
    let run = Run::new();
    let (live, dead) = (slope(), vec![1.0; LEN]);
    run.file("two.csv", &table("t [s],a [g],b [g]", &[&live, &dead]));
    run.ok(&["compare", "two.csv", "--lowpass", "3Hz", "--plot", "two.svg"]);
    let picture = run.text("two.svg");
    assert!(picture.contains("a: condition would take forecast"), "the judged channel is missing");
    assert!(picture.contains("b: not judged: the record is constant"), "the dead channel is missing");
    // Nothing to judge is no reason to print nothing.
    let output = endgrain(
        run.folder(),
        &["compare", "two.csv", "--integrate", "1", "--conditions", "steady", "--insist", "--plot", "none.svg"],
    );
    let told = String::from_utf8_lossy(&output.stdout).into_owned();
    assert_eq!(output.status.code(), Some(0), "{}", String::from_utf8_lossy(&output.stderr));
    assert!(told.contains("nothing to judge: an integral without a high-pass"), "{told}");
    assert!(run.text("none.svg").contains("an integral without a high-pass"));
}

#[test]
fn assertions_stand_end_by_end() {
    // Flat at the left and steep at the right: a quarter of a sine, started at its crest.
    let mut rest = noise(23);
    let quarter: Vec<f64> = (0..LEN)
        .map(|n| (std::f64::consts::FRAC_PI_2 * (n as f64 + 0.5) / LEN as f64).cos() + 1e-4 * rest() + 1.0)
        .collect();
    let run = one_channel(&quarter);
    run.ok(&[
        "condition",
        "in.csv",
        "--lowpass",
        "3Hz",
        "--assert",
        "left:zero-slope",
        "--assert",
        "right:zero-value",
        "-o",
        "o.csv",
    ]);
    let channel = &json(&run, "o.csv.json")["channels"][0];
    let standing = |k: usize| channel["assertions"][k]["standing"].as_str().unwrap_or_default().to_owned();
    assert_eq!((standing(0).as_str(), standing(1).as_str()), ("not_contradicted", "contradicted"));
    assert_eq!(channel["verdict"]["assertion"], "contradicted");
    let sentence = channel["verdict"]["sentence"].as_str().expect("a sentence");
    assert!(
        sentence.contains("asserted left:zero-slope: not contradicted, right:zero-value: contradicted by this record"),
        "{sentence}"
    );
    assert_eq!(channel["notes"][0]["text"], "the record speaks against --assert right:zero-value");
    // Followed without a corner too, and checked all the same.
    let told = run.ok(&[
        "condition",
        "in.csv",
        "--integrate",
        "1",
        "--conditions",
        "steady",
        "--insist",
        "--assert",
        "zero-value",
        "-o",
        "i.csv",
    ]);
    assert!(told.contains("asserted zero-value: contradicted"), "{told}");
}

#[test]
fn a_tolerance_is_judged_whatever_the_extension() {
    let run = one_channel(&slope());
    let common = ["condition", "in.csv", "--lowpass", "3Hz", "--extension", "even"];
    run.ok(&[&common[..], &["-o", "plain.csv"]].concat());
    assert_eq!(json(&run, "plain.csv.json")["channels"][0]["verdict"], Value::Null);
    let told = run.ok(&[&common[..], &["--tolerance", "5%", "-o", "judged.csv"]].concat());
    assert!(told.contains("even: edge error about"), "{told}");
    run.fails(2, &[&common[..], &["--tolerance", "5V", "-o", "unit.csv"]].concat());
}

#[test]
fn marks_are_recognised_when_they_are_read_back() {
    let run = Run::new();
    let other: Vec<f64> = slope().iter().rev().copied().collect();
    run.file("in.csv", &table("t [s],a [g],b [g]", &[&slope(), &other]));
    run.file("one.csv", &table("t [s],a [g]", &[&slope()]));
    let mark = ["--lowpass", "3Hz", "--tolerance", "2%", "--edges", "mark"];
    let header = |name: &str| run.text(name).lines().next().unwrap_or_default().to_owned();
    for (input, marks, again) in [
        ("one.csv", "t [s],a [g],trusted", "t [s],a [g],trusted,trusted 2"),
        (
            "in.csv",
            "t [s],a [g],b [g],a trusted,b trusted",
            "t [s],a [g],b [g],a trusted,b trusted,a trusted 2,b trusted 2",
        ),
    ] {
        let (first, second, third) = (format!("1-{input}"), format!("2-{input}"), format!("3-{input}"));
        run.ok(&[&["condition", input, "-o", &first][..], &mark].concat());
        assert_eq!(header(&first), marks);
        let told = run.ok(&[&["condition", &first, "-o", &second][..], &mark].concat());
        assert!(told.contains("tells which samples are trusted"), "{told}");
        assert_eq!(header(&second), again);
        run.ok(&[&["condition", &second, "-o", &third][..], &mark].concat());
        let names = header(&third);
        let mut unique: Vec<&str> = names.split(',').collect();
        unique.sort_unstable();
        unique.dedup();
        assert_eq!(unique.len(), names.split(',').count(), "{names}");
        let channels = json(&run, &format!("{second}.json"))["channels"].as_array().map(Vec::len);
        assert_eq!(channels, Some(if input == "one.csv" { 1 } else { 2 }));
    }
    // Asked for by name it is a channel like any other.
    run.ok(&["condition", "1-one.csv", "--channel", "trusted", "-o", "asked.csv"]);
    assert_eq!(json(&run, "asked.csv.json")["channels"][0]["name"], "trusted");
}

#[test]
fn an_exact_ramp_costs_next_to_nothing() {
    let ramp: Vec<f64> = (0..LEN).map(|n| 0.1 * n as f64).collect();
    let run = one_channel(&ramp);
    let output = endgrain(run.folder(), &["compare", "in.csv", "--lowpass", "3Hz", "--json"]);
    let report: Value = serde_json::from_slice(&output.stdout).expect("JSON");
    let row = |name: &str| {
        let rows = report["channels"][0]["candidates"].as_array().expect("rows");
        let row = rows.iter().find(|row| row["name"] == name).expect("a row");
        row["relative_error"].as_f64().expect("a number")
    };
    // At the floor of a ten-thousandth of the output's standard deviation, or hardly above it.
    assert!(row("odd-ends") < 2e-4 && row("forecast") < 2e-4, "{} {}", row("odd-ends"), row("forecast"));
    assert!(row("even") > 10.0 * row("odd-ends"));
}

#[test]
fn the_demo_record_is_judged_on_both_seats() {
    let run = Run::new();
    let hoist = fixture("hoist.csv");
    let hoist = hoist.to_str().expect("UTF-8");
    for seat in ["half-sample", "whole-sample"] {
        let output = endgrain(
            run.folder(),
            &["compare", hoist, "--lowpass", "12Hz", "--seat", seat, "--plot", "p.svg", "--force"],
        );
        assert!(output.status.success(), "{}", String::from_utf8_lossy(&output.stderr));
        assert!(run.text("p.svg").contains("odd-ends"));
    }
}
