//! Real runs of `spectrum`: series, sidecar, pictures, two records, refusals.

use std::fs;
use std::path::{Path, PathBuf};
use std::process::{Command, Output};

use serde_json::Value;

fn fixture(name: &str) -> String {
    Path::new(env!("CARGO_MANIFEST_DIR")).join("fixtures").join(name).display().to_string()
}

fn endgrain(folder: &Path, arguments: &[&str]) -> Output {
    Command::new(env!("CARGO_BIN_EXE_endgrain")).args(arguments).current_dir(folder).output().expect("the program runs")
}

fn ok(folder: &Path, arguments: &[&str]) -> String {
    let output = endgrain(folder, arguments);
    let told = String::from_utf8_lossy(&output.stderr);
    assert!(output.status.success(), "{arguments:?}: {told}");
    String::from_utf8_lossy(&output.stdout).into_owned()
}

fn json(folder: &Path, arguments: &[&str]) -> Value {
    serde_json::from_str(&ok(folder, arguments)).expect("JSON")
}

fn numbers(value: &Value) -> Vec<f64> {
    value.as_array().expect("an array").iter().map(|v| v.as_f64().expect("a number")).collect()
}

#[test]
fn series_and_sidecar_hold_the_numbers_of_the_json() {
    let folder = tempfile::tempdir().expect("a folder");
    let hoist = fixture("hoist.csv");
    let told = ok(folder.path(), &["spectrum", &hoist, "-o", "s.csv", "--plot", "s.svg", "--band", "2Hz..40Hz"]);
    assert!(told.contains("wrote s.csv") && told.contains("0.5 Hz apart") && told.contains("g2/Hz"), "{told}");
    let whole = json(folder.path(), &["spectrum", &hoist, "--json", "--band", "2Hz..40Hz"]);
    let text = fs::read_to_string(folder.path().join("s.csv")).expect("the series");
    assert!(text.starts_with("index,frequency [Hz],ax density [g2/Hz],ax lower [g2/Hz],ax upper [g2/Hz],ay density"));
    let series = &whole["channels"][2]["traces"][0]["density"]["series"];
    let density = numbers(&series["density"]);
    assert_eq!(text.lines().count(), density.len() + 1);
    for (line, expected) in text.lines().skip(1).zip(&density) {
        assert_eq!(line.split(',').nth(8).and_then(|v| v.parse().ok()), Some(*expected));
    }
    let sidecar: Value =
        serde_json::from_str(&fs::read_to_string(folder.path().join("s.csv.json")).expect("a sidecar")).expect("JSON");
    assert!(sidecar["channels"][0]["traces"][0]["density"]["series"].is_null());
    assert_eq!(sidecar["outputs"][1]["path"], "s.csv");
    assert_eq!(sidecar["settings"]["band"][0], "2Hz..40Hz");
    // The band by hand from the series: lines at the edges count by half.
    let frequency = numbers(&series["frequency"]);
    let by_hand: f64 = frequency
        .iter()
        .zip(&density)
        .map(|(f, p)| {
            if *f == 2.0 || *f == 40.0 {
                p / 2.0
            } else if *f > 2.0 && *f < 40.0 {
                *p
            } else {
                0.0
            }
        })
        .sum::<f64>()
        * 0.5;
    let rms = whole["channels"][2]["traces"][0]["bands"][0]["rms"].as_f64().expect("an RMS");
    assert!((rms - by_hand.sqrt()).abs() < 1e-12 * rms, "{rms} {}", by_hand.sqrt());
    let picture = fs::read_to_string(folder.path().join("s.svg")).expect("a picture");
    assert!(picture.starts_with("<svg") && picture.contains("density [g2/Hz]"));
}

#[test]
fn operators_stand_beside_the_record_with_their_gain() {
    let folder = tempfile::tempdir().expect("a folder");
    let found = json(
        folder.path(),
        &["spectrum", &fixture("hoist.csv"), "--channel", "ax", "--lowpass", "12Hz", "--extension", "even", "--json"],
    );
    let channel = &found["channels"][0];
    assert_eq!((&channel["traces"][0]["label"], &channel["traces"][1]["label"]), (&"before".into(), &"after".into()));
    let series = |trace: usize| numbers(&channel["traces"][trace]["density"]["series"]["density"]);
    let (before, after, gain) = (series(0), series(1), numbers(&channel["gain"]));
    // The tone at 1.7 Hz passes, that at 37.8 Hz falls by the square of the gain.
    for (line, tolerance) in [(3, 1e-3), (75, 0.2), (76, 0.2)] {
        let expected = before[line] * gain[line] * gain[line];
        assert!((after[line] / expected - 1.0).abs() < tolerance, "{line}: {} {expected}", after[line]);
    }
}

#[test]
fn two_records_have_a_ratio_and_two_extensions_two_traces() {
    let folder = tempfile::tempdir().expect("a folder");
    let write = |name: &str, factor: f64| -> PathBuf {
        let rows: String = (0..1000).map(|n| format!("{}\n", factor * (1.3 * (n * n % 977) as f64).sin())).collect();
        let path = folder.path().join(name);
        fs::write(&path, format!("a [mm]\n{rows}")).expect("a record");
        path
    };
    write("one.csv", 1.0);
    write("two.csv", 3.0);
    let arguments = ["spectrum", "one.csv", "two.csv", "--rate", "100Hz", "--segment", "100", "--json"];
    let ratio = &json(folder.path(), &arguments)["channels"][0]["ratio"];
    assert_eq!(ratio["of"][0], "two.csv");
    assert!(numbers(&ratio["ratio"])[1..].iter().all(|r| (r - 9.0).abs() < 1e-9));
    assert_eq!(ratio["differing"], 51);
    let arguments = [
        "spectrum",
        "one.csv",
        "--rate",
        "100Hz",
        "--method",
        "basis",
        "--extension",
        "even",
        "--against",
        "odd+line",
        "--json",
    ];
    let found = json(folder.path(), &arguments);
    let traces = found["channels"][0]["traces"].as_array().expect("traces");
    assert_eq!((&traces[0]["label"], &traces[1]["label"]), (&"even".into(), &"odd + line".into()));
    assert_eq!(traces[1]["coefficients"]["series"]["half_cycles"][0], 1.0);
}

#[test]
fn what_does_not_go_together_is_refused_before_anything_is_written() {
    let folder = tempfile::tempdir().expect("a folder");
    let hoist = fixture("hoist.csv");
    for (code, arguments) in [
        (2, vec!["--method", "basis", "--band", "1Hz..2Hz"]),
        (2, vec!["--against", "odd"]),
        (2, vec!["--confidence", "0%"]),
        (2, vec!["--road"]),
        (2, vec!["--band", "1mm..2mm"]),
        (2, vec!["--window", "foo"]),
        (4, vec!["--band", "1Hz..500Hz"]),
        (4, vec!["--segment", "1"]),
        (4, vec!["--segment", "1e300s"]),
        (4, vec!["--method", "sine:0"]),
    ] {
        let mut all = vec!["spectrum", hoist.as_str(), "-o", "out.csv"];
        all.extend(&arguments);
        let output = endgrain(folder.path(), &all);
        assert_eq!(output.status.code(), Some(code), "{arguments:?}: {}", String::from_utf8_lossy(&output.stderr));
        assert_eq!(fs::read_dir(folder.path()).expect("a folder").count(), 0, "{arguments:?}");
    }
}

#[test]
fn tiny_silent_and_huge_records_end_in_numbers_or_a_reason() {
    let folder = tempfile::tempdir().expect("a folder");
    for (text, code) in [
        ("a\n1\n", 4),
        ("a\n1\n2\n", 0),
        ("a\n5\n5\n5\n5\n5\n", 0),
        ("a\n0\n0\n0\n", 0),
        ("a\n1e308\n-1e308\n1e308\n-1e308\n", 4),
        ("a\n1e-300\n-1e-300\n2e-300\n", 0),
    ] {
        fs::write(folder.path().join("in.csv"), text).expect("a record");
        for method in ["welch", "sine:1", "basis"] {
            let arguments = ["spectrum", "in.csv", "--rate", "1Hz", "--method", method, "--json"];
            let output = endgrain(folder.path(), &arguments);
            let told = String::from_utf8_lossy(&output.stderr).into_owned();
            assert!([code, 0].contains(&output.status.code().expect("a code")), "{text:?} {method}: {told}");
            assert!(!told.contains("panicked"), "{told}");
        }
    }
}
