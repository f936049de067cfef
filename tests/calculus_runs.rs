//! Integrals, derivatives and splits as real runs: what is refused, told, written beside, and what adds up.

mod runs;

use std::f64::consts::TAU;
use std::fmt::Write as _;

use runs::Run;
use serde_json::Value;

/// A lift in m/s2 at 100 Hz: at rest, moved by 0.25 m between 2 and 8 s, at rest; offset 0.02 m/s2, noise about 0.003.
fn lift() -> String {
    let mut text = "t [s],a [m/s2]\n".to_owned();
    let mut state = 1u64;
    for n in 0..1000 {
        state = state.wrapping_mul(6364136223846793005).wrapping_add(1442695040888963407);
        let noise = 0.01 * ((state >> 11) as f64 / (1u64 << 53) as f64 - 0.5);
        let t = (f64::from(n) + 0.5) / 100.0;
        let u = ((t - 2.0) / 6.0).clamp(0.0, 1.0);
        let _ = writeln!(text, "{:.2},{:.6}", f64::from(n) / 100.0, 0.25 * TAU / 36.0 * (TAU * u).sin() + 0.02 + noise);
    }
    text
}

/// Two tones in g at 100 Hz, moving at both ends.
fn shaking() -> String {
    let mut text = "t [s],a [g]\n".to_owned();
    for n in 0..1000 {
        let t = f64::from(n) / 100.0;
        let _ = writeln!(text, "{t:.2},{:.6}", (TAU * 2.3 * t).sin() + 0.3 * (TAU * 7.1 * t + 1.0).cos());
    }
    text
}

fn sidecar(run: &Run, name: &str) -> Value {
    serde_json::from_str(&run.text(&format!("{name}.json"))).expect("JSON")
}

fn codes(sidecar: &Value) -> Vec<String> {
    let notes = sidecar["channels"][0]["notes"].as_array().expect("notes");
    notes.iter().filter_map(|note| note["code"].as_str().map(str::to_owned)).collect()
}

#[test]
fn an_integral_is_told_its_end_conditions() {
    let run = Run::new();
    run.file("lift.csv", &lift()).file("shaking.csv", &shaking());
    let lifted = run.fails(2, &["condition", "lift.csv", "--integrate", "2", "-o", "o.csv"]);
    assert!(lifted.contains("at rest at its ends") && lifted.contains("--conditions start-rest, rest,"), "{lifted}");
    let shaken = run.fails(2, &["condition", "shaking.csv", "--integrate", "2", "-o", "o.csv"]);
    assert!(shaken.contains("moving at its ends") && shaken.contains("--conditions steady"), "{shaken}");
    for command in [
        &["compare", "shaking.csv", "--integrate", "1"][..],
        &["condition", "shaking.csv", "--integrate", "1", "--dry-run"],
    ] {
        assert!(run.fails(2, command).contains("no default"));
    }
    let rest = ["condition", "shaking.csv", "--integrate", "2", "--conditions", "rest", "-o", "o.csv"];
    assert!(run.fails(4, &rest).contains("--insist"));
    run.ok(&[&rest[..], &["--insist"]].concat());
    assert!(codes(&sidecar(&run, "o.csv")).contains(&"end_conditions_doubtful".to_owned()));
    let steady = ["condition", "lift.csv", "--integrate", "2", "--conditions", "steady", "-o", "l.csv"];
    assert!(run.fails(4, &steady).contains("would be lost"));
    // What does not go together.
    for (arguments, told) in [
        (&["--integrate", "1", "--conditions", "rest-to=1m"][..], "tells of the second integral"),
        (&["--integrate", "2", "--conditions", "rest-to=1V"], "in m"),
        (&["--integrate", "2", "--conditions", "rest", "--offset", "1m/s2"], "finds the offset itself"),
        (&["--integrate", "2", "--conditions", "still=20s..21s,0s..1s"], "fewer than two samples"),
        (&["--integrate", "2", "--conditions", "still=0mm..1mm"], "no place on an axis"),
        (&["--integrate", "2", "--conditions", "zero-mean", "--insist"], "--extension periodic"),
        (&["--lowpass", "5Hz", "--conditions", "rest"], "goes with an integral"),
        (&["--lowpass", "5Hz", "--beside", "sigma"], "goes with an integral"),
        (&["--integrate", "1", "--split", "5Hz", "--conditions", "rest"], "--split parts the record itself"),
    ] {
        let message = run.fails(2, &[&["condition", "lift.csv", "-o", "n.csv"], arguments].concat());
        assert!(message.contains(told), "{arguments:?}: {message}");
    }
    assert!(!run.files().contains(&"n.csv".to_owned()));
}

#[test]
fn a_known_lift_comes_back_with_its_uncertainty() {
    let run = Run::new();
    run.file("lift.csv", &lift());
    let told = run.ok(&[
        "condition",
        "lift.csv",
        "--integrate",
        "2",
        "--conditions",
        "rest-to=250mm",
        "--beside",
        "sigma",
        "--beside",
        "corrected",
        "-o",
        "travel.csv",
    ]);
    assert!(told.contains("a: end conditions rest-to=250mm: offset 0.02"), "{told}");
    let result = sidecar(&run, "travel.csv");
    assert_eq!(result["settings"]["conditions"], "rest-to=250mm");
    assert_eq!(result["chain"]["conditions"], "rest-to=250mm");
    let integral = &result["channels"][0]["integral"];
    let number = |value: &Value| value.as_f64().expect("a number");
    assert_eq!(integral["offset"]["unit"], "m/s2");
    assert!((number(&integral["offset"]["value"]) - 0.02).abs() < 1e-3);
    assert!((number(&integral["final_second"]["value"]) - 0.25).abs() < 1e-9);
    assert!(number(&integral["final_first"]["value"]).abs() < 1e-9);
    // Uniform noise 0.01 wide: 0.00289. The largest deviation of rest-to is 0.0722 sigma sqrt(h L^3), in the middle.
    let noise = number(&integral["noise"]["value"]);
    assert!((noise / 0.00289 - 1.0).abs() < 0.15, "{noise}");
    let largest = number(&integral["sigma"]["largest"]);
    assert!((largest / (0.0722 * noise * (0.01f64 * 1000.0).sqrt()) - 1.0).abs() < 0.02, "{largest}");
    // The written corrected record integrates to the written displacement.
    let peak = number(&integral["peak"]);
    assert!(number(&integral["reintegration_difference"]) < 1e-9 * peak);
    let text = run.text("travel.csv");
    assert_eq!(text.lines().next(), Some("t [s],a [m],a sigma [m],a corrected [m/s2]"));
    let cells: Vec<Vec<f64>> = text
        .lines()
        .skip(1)
        .map(|line| line.split(',').map(|cell| cell.parse().expect("a number")).collect())
        .collect();
    // Trapezoid twice over the corrected column, from the first displacement and the slope that fits the end.
    let (mut v, mut d, mut path) = (0.0, 0.0, vec![0.0]);
    for pair in cells.windows(2) {
        let next = v + 0.005 * (pair[0][3] + pair[1][3]);
        d += 0.005 * (v + next);
        v = next;
        path.push(d);
    }
    let (first, last) = (cells[0][1], cells[999][1] - path[999]);
    let worst = (0..1000)
        .map(|n| {
            let line = first + (last - first) * n as f64 / 999.0;
            (path[n] + line - cells[n][1]).abs()
        })
        .fold(0.0, f64::max);
    // A trapezoid errs by h^2/12 of the slopes; noise of 0.003 at 100 Hz makes that some um.
    assert!(worst < 2e-4 * 0.25, "{worst}");
    // As far from the truth as the deviation allows.
    for (n, row) in cells.iter().enumerate() {
        let u = ((((n as f64) + 0.5) / 100.0 - 2.0) / 6.0).clamp(0.0, 1.0);
        let truth = 0.25 * (u - (TAU * u).sin() / TAU);
        assert!((row[1] - truth).abs() < 4.0 * largest, "{n}: {} {truth}", row[1]);
    }
}

#[test]
fn units_follow_an_integral() {
    let run = Run::new();
    for (unit, times, result) in [
        ("g", "1", "m/s"),
        ("g", "2", "m"),
        ("mm/s2", "2", "mm"),
        ("mm/s", "1", "mm"),
        ("um/s2", "2", "um"),
        ("V", "1", "V s"),
    ] {
        run.file("in.csv", &shaking().replace("a [g]", &format!("a [{unit}]")));
        run.ok(&["condition", "in.csv", "--integrate", times, "--conditions", "steady", "--force", "-o", "o.csv"]);
        assert_eq!(run.text("o.csv").lines().next(), Some(format!("t [s],a [{result}]").as_str()));
    }
    // 1 g at 2.3 Hz: 9.80665/(2 pi 2.3)^2 = 46.96 mm.
    run.file("in.csv", &shaking());
    run.ok(&["condition", "in.csv", "--integrate", "2", "--conditions", "steady", "--force", "-o", "o.csv"]);
    let rms = sidecar(&run, "o.csv")["channels"][0]["rms"]["out"].as_f64().expect("a number");
    assert!((rms / (0.04696 / 2f64.sqrt()) - 1.0).abs() < 0.05, "{rms}");
}

#[test]
fn a_highpass_after_a_move_is_warned_about() {
    let run = Run::new();
    run.file("lift.csv", &lift());
    run.ok(&[
        "condition",
        "lift.csv",
        "--integrate",
        "2",
        "--conditions",
        "rest-to=0.25m",
        "--highpass",
        "0.5Hz",
        "-o",
        "o.csv",
    ]);
    let result = sidecar(&run, "o.csv");
    assert!(codes(&result).contains(&"highpass_takes_net_change".to_owned()), "{:?}", codes(&result));
    assert!(result["channels"][0]["integral"]["corner"]["frequency"].as_f64().is_some());
}

/// A decimal as an integer of `places` decimals.
fn decimal(cell: &str, places: usize) -> i128 {
    let (whole, part) = cell.split_once([',', '.']).unwrap_or((cell, ""));
    format!("{whole}{part:0<places$}").parse().expect("a decimal")
}

#[test]
fn both_parts_of_a_split_add_up_digit_by_digit() {
    let run = Run::new();
    std::fs::copy(runs::fixture("plank.csv"), run.path("plank.csv")).expect("a copy");
    for more in [
        &["--extension", "odd", "--baseline", "line"][..],
        &["--extension", "even", "--decimals", "3"],
        &["--decimals", "2", "--lowpass", "2mm"],
        &[],
    ] {
        let told =
            run.ok(&[&["condition", "plank.csv", "--split", "8mm", "--force", "-o", "parts.csv"], more].concat());
        assert!(told.contains("waviness RMS") && told.contains("end treatment: "), "{told}");
        let text = run.text("parts.csv");
        assert_eq!(text.lines().next(), Some("x [mm];z [um];z waviness [um];z roughness [um]"));
        for line in text.lines().skip(1) {
            let cells: Vec<i128> = line.split(';').map(|cell| decimal(cell, 20)).collect();
            // With a low-pass before it the whole is no decimal of few digits unless rounded to some.
            assert_eq!(cells[2] + cells[3], cells[1], "{more:?}: {line}");
        }
    }
    let result = sidecar(&run, "parts.csv");
    assert_eq!(result["channels"][0]["split"]["corner"], "8mm");
    // Even is the standard's line symmetrical reflection, odd about the end values its point symmetrical one.
    run.ok(&["condition", "plank.csv", "--split", "8mm", "--extension", "even", "--force", "-o", "parts.csv"]);
    let treatment = &sidecar(&run, "parts.csv")["channels"][0]["extension"]["end_treatment"];
    assert_eq!(treatment, "line symmetrical reflection");
    assert!(
        run.fails(2, &["condition", "plank.csv", "--split", "8mm", "--format", "wav", "-o", "p.wav"]).contains("WAV")
    );
}

#[test]
fn a_derivative_tells_its_noise_and_its_ends() {
    let run = Run::new();
    std::fs::copy(runs::fixture("plank.csv"), run.path("plank.csv")).expect("a copy");
    let told = run.ok(&["condition", "plank.csv", "--differentiate", "1", "-o", "slope.csv"]);
    assert!(told.contains("noise makes up about") && told.contains("um -> um/m"), "{told}");
    // A smooth record keeps even ends about the parabola with its end slopes, and its derivative is exact.
    let mut text = "x [mm],z [um]\n".to_owned();
    for n in 0..500 {
        let x = f64::from(n) * 0.1;
        let _ = writeln!(text, "{x:.1},{}", (0.3 * x).sin() + 0.01 * x * x);
    }
    run.file("smooth.csv", &text);
    for (times, unit) in [("1", "um/m"), ("2", "1/m")] {
        run.ok(&["condition", "smooth.csv", "--differentiate", times, "--force", "-o", "d.csv"]);
        let result = run.text("d.csv");
        assert_eq!(result.lines().next(), Some(format!("x [mm],z [{unit}]").as_str()));
        assert_eq!(sidecar(&run, "d.csv")["channels"][0]["baseline"]["kind"], "tangents");
        for (n, line) in result.lines().skip(1).enumerate() {
            let x = n as f64 * 0.1;
            let value: f64 = line.split(',').nth(1).expect("a cell").parse().expect("a number");
            // um per mm is 1000 um/m; um per mm^2 is 1/m.
            let exact =
                if times == "1" { 1e3 * (0.3 * (0.3 * x).cos() + 0.02 * x) } else { 0.02 - 0.09 * (0.3 * x).sin() };
            // What is left has a kink in its curvature at the ends: half a step of the third derivative, 0.027 a mm^2 more.
            let tolerance = if times == "1" { 0.5 } else { 0.1 * 0.027 };
            assert!((value - exact).abs() < tolerance, "{times} {n}: {value} {exact}");
        }
    }
}
