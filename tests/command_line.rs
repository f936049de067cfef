//! Real runs of the program: outputs, sidecars, exit codes, refusals, pipes.

mod runs;

use std::fs;
use std::io::{Read, Write};
use std::process::{Command, Stdio};

use runs::{Run, endgrain, fixture};
use serde_json::Value;

/// A ramp in three axes at 100 Hz: whatever a low-pass does to it under odd + line, it stays a ramp.
fn ramp() -> String {
    let rows = (0..200).map(|n| format!("{:.2},{},{},note {n}\n", n as f64 / 100.0, n, 2 * n + 1));
    format!("time (s),ax (g),ay (m/s^2),remark\n{}", rows.collect::<String>())
}

#[test]
fn a_record_comes_back_in_its_own_format_with_a_sidecar() {
    let run = Run::new();
    run.file("in.csv", &ramp());
    let told = run.ok(&[
        "condition",
        "in.csv",
        "--lowpass",
        "10Hz",
        "--extension",
        "odd",
        "--baseline",
        "line",
        "-o",
        "out.csv",
    ]);
    assert!(told.contains("wrote out.csv and out.csv.json"), "{told}");
    let (source, result) = (run.text("in.csv"), run.text("out.csv"));
    assert_eq!(source.lines().next(), result.lines().next());
    assert_eq!(source.lines().count(), result.lines().count());
    for (n, (before, after)) in source.lines().zip(result.lines()).enumerate().skip(1) {
        let (before, after): (Vec<&str>, Vec<&str>) = (before.split(',').collect(), after.split(',').collect());
        assert_eq!((before[0], before[3]), (after[0], after[3]), "line {n}: stamps and text stay as they are");
        for axis in [1, 2] {
            let (x, y): (f64, f64) = (before[axis].parse().expect("a number"), after[axis].parse().expect("a number"));
            // The line passes; what is left is rounding of values up to 400.
            assert!((x - y).abs() < 1e-12 * 400.0, "line {n}: {x} became {y}");
        }
    }
    let sidecar: Value = serde_json::from_str(&run.text("out.csv.json")).expect("JSON");
    assert_eq!(sidecar["schema"], 1);
    assert_eq!(sidecar["tool"]["name"], "endgrain");
    assert_eq!(sidecar["settings"]["lowpass"][0], "10Hz");
    assert_eq!(sidecar["settings"]["extension"], "odd");
    assert_eq!(sidecar["input"]["samples"], 200);
    assert_eq!(sidecar["input"]["axis"]["rate"], 100.0);
    assert_eq!(sidecar["channels"].as_array().map(Vec::len), Some(2));
    assert_eq!(sidecar["channels"][1]["unit"], "m/s2");
    assert_eq!(sidecar["channels"][0]["extension"]["transform"], "DST-II");
    assert_eq!(sidecar["channels"][0]["baseline"]["kind"], "line");
    assert!(sidecar["channels"][0]["parseval"].as_f64().expect("a number") < 1e-12);
    assert_eq!(sidecar["outputs"][0]["sha256"].as_str().map(str::len), Some(64));
}

#[test]
fn what_cannot_be_judged_is_called_a_default() {
    let run = Run::new();
    let rows: String = (0..12).map(|n| format!("{},{}\n", n as f64 / 100.0, (n * n) % 7)).collect();
    run.file("short.csv", &format!("t [s],a [g]\n{rows}"));
    let told = run.ok(&["condition", "short.csv", "--lowpass", "10Hz", "-o", "out.csv"]);
    assert!(told.contains("even ends") && told.contains("a default, not a finding"), "{told}");
    let sidecar: Value = serde_json::from_str(&run.text("out.csv.json")).expect("JSON");
    assert_eq!(sidecar["channels"][0]["extension"]["how"], "default");
    assert_eq!(sidecar["channels"][0]["verdict"]["level"], "not_judged");
}

#[test]
fn by_default_the_verdict_chooses_and_says_what_it_costs() {
    let run = Run::new();
    let hoist = fixture("hoist.csv");
    let hoist = hoist.to_str().expect("UTF-8");
    let told = run.ok(&["condition", hoist, "--lowpass", "12Hz", "-o", "out.csv"]);
    assert!(told.contains("by the verdict") && told.contains("trusted span"), "{told}");
    let sidecar: Value = serde_json::from_str(&run.text("out.csv.json")).expect("JSON");
    let channel = &sidecar["channels"][0];
    assert_eq!(channel["extension"]["how"], "verdict");
    // Seven candidates, the forecast, and three references.
    assert_eq!(channel["candidates"].as_array().map(Vec::len), Some(11));
    assert!(channel["verdict"]["predicted_error"].as_f64().is_some_and(|error| error > 0.0));
}

#[test]
fn edges_are_marked_blanked_or_trimmed() {
    let run = Run::new();
    let hoist = fixture("hoist.csv");
    let hoist = hoist.to_str().expect("UTF-8");
    let common = ["condition", hoist, "--channel", "az", "--lowpass", "3Hz", "--tolerance", "2%", "-q"];
    let with = |rest: &[&str]| run.ok(&[&common[..], rest].concat());
    with(&["--edges", "mark", "-o", "mark.csv"]);
    with(&["--edges", "blank", "-o", "blank.csv"]);
    with(&["--edges", "trim", "-o", "trim.csv"]);
    let sidecar: Value = serde_json::from_str(&run.text("mark.csv.json")).expect("JSON");
    let span = &sidecar["channels"][0]["trusted"];
    let (first, last) = (span["first"].as_u64().expect("a span"), span["last"].as_u64().expect("a span"));
    assert!(first > 0 && last < 2399, "{first} {last}");
    let marked = run.text("mark.csv");
    assert!(marked.lines().nth(1).is_some_and(|header| header.ends_with(",trusted")));
    let flags: Vec<&str> = marked.lines().skip(2).map(|line| line.rsplit(',').next().unwrap_or_default()).collect();
    assert_eq!(flags.iter().position(|flag| *flag == "1"), Some(first as usize));
    assert_eq!(flags.iter().filter(|flag| **flag == "1").count() as u64, last - first + 1);
    let blank = run.text("blank.csv");
    let empty = blank.lines().skip(2).filter(|line| line.ends_with(',')).count() as u64;
    assert_eq!(empty, 2400 - (last - first + 1));
    let trimmed = run.text("trim.csv");
    let start = format!("{:.3},", first as f64 / 200.0);
    assert!(trimmed.lines().nth(2).is_some_and(|line| line.starts_with(&start)), "{start}");
}

#[test]
fn a_requirement_that_is_not_met_exits_with_1_and_writes_all_the_same() {
    let run = Run::new();
    let hoist = fixture("hoist.csv");
    let hoist = hoist.to_str().expect("UTF-8");
    let told = run.fails(
        1,
        &["condition", hoist, "--lowpass", "3Hz", "--tolerance", "0.01%", "--require", "within", "-o", "out.csv"],
    );
    assert!(told.contains("not met"), "{told}");
    assert!(run.files().contains(&"out.csv".to_owned()));
    run.ok(&["condition", hoist, "--lowpass", "3Hz", "--tolerance", "0.5g", "--require", "within", "-o", "loose.csv"]);
}

#[test]
fn assertions_are_followed_and_checked() {
    let run = Run::new();
    // A half sine bulge: zero at both ends, not flat there.
    let rows: String = (0..400)
        .map(|n| {
            format!(
                "{},{}\n",
                n as f64 / 100.0,
                (std::f64::consts::PI * (n as f64 + 0.5) / 400.0).sin() + 1e-3 * ((n * 7919) % 13) as f64
            )
        })
        .collect();
    run.file("rod.csv", &format!("t [s],a [mm]\n{rows}"));
    let zero = run.ok(&["condition", "rod.csv", "--lowpass", "3Hz", "--assert", "zero-value", "-o", "zero.csv"]);
    assert!(zero.contains("odd ends") && zero.contains("as asserted"), "{zero}");
    let flat = run.ok(&["condition", "rod.csv", "--lowpass", "3Hz", "--assert", "zero-slope", "-o", "flat.csv"]);
    assert!(flat.contains("even ends"), "{flat}");
    let one = run.ok(&["condition", "rod.csv", "--lowpass", "3Hz", "--assert", "left:zero-value", "-o", "one.csv"]);
    assert!(one.contains("left:zero-value/forecast"), "{one}");
    let told = run.fails(
        2,
        &["condition", "rod.csv", "--lowpass", "3Hz", "--assert", "closed", "--extension", "odd", "-o", "x.csv"],
    );
    assert!(told.contains("--assert"), "{told}");
}

#[test]
fn without_an_operator_it_is_a_plain_conversion() {
    let run = Run::new();
    run.file("in.csv", &ramp());
    run.ok(&["condition", "in.csv", "-o", "same.csv"]);
    let values = |text: &str| -> Vec<f64> {
        text.lines()
            .skip(1)
            .flat_map(|l| l.split(',').skip(1).take(2).map(|v| v.parse::<f64>().expect("a number")).collect::<Vec<_>>())
            .collect()
    };
    assert_eq!(values(&run.text("in.csv")), values(&run.text("same.csv")));
    run.ok(&["condition", "in.csv", "--encoding", "float64", "-o", "same.wav"]);
    run.ok(&["condition", "same.wav", "-o", "back.csv"]);
    let back = values(&run.text("back.csv"));
    assert_eq!(back, values(&run.text("in.csv")));
}

#[test]
fn outputs_are_never_overwritten_unasked() {
    let run = Run::new();
    run.file("in.csv", &ramp()).file("out.csv", "mine");
    let told = run.fails(74, &["condition", "in.csv", "--lowpass", "10Hz", "-o", "out.csv"]);
    assert!(told.contains("out.csv") && told.contains("--force"), "{told}");
    assert_eq!(run.text("out.csv"), "mine");
    assert_eq!(run.files(), ["in.csv", "out.csv"]);
    // A sidecar in the way counts too.
    run.file("other.csv.json", "mine");
    run.fails(74, &["condition", "in.csv", "-o", "other.csv"]);
    assert_eq!(run.files(), ["in.csv", "other.csv.json", "out.csv"]);
    run.ok(&["condition", "in.csv", "--lowpass", "10Hz", "-o", "out.csv", "--force"]);
    assert_ne!(run.text("out.csv"), "mine");
}

#[test]
fn a_failed_run_leaves_nothing_behind() {
    let run = Run::new();
    run.file("bad.csv", "t,a\n0,1\n1,2\n2,x\n3,4\n4,5\n5,6\n6,7\n7,8\n8,9\n9,1\n");
    let told = run.fails(3, &["condition", "bad.csv", "-o", "out.csv"]);
    assert!(told.contains("bad.csv:4:2"), "{told}");
    assert_eq!(run.files(), ["bad.csv"]);
}

#[test]
fn each_kind_of_fault_has_its_exit_code() {
    let run = Run::new();
    run.file("in.csv", &ramp());
    let cases: &[(i32, &[&str], &str)] = &[
        (2, &["condition", "in.csv"], "--output"),
        (2, &["condition", "in.csv", "--lowpas", "10Hz", "-o", "o.csv"], "--lowpass"),
        (2, &["condition", "in.csv", "--lowpass", "10", "-o", "o.csv"], "--lowpass"),
        (2, &["condition", "in.csv", "--lowpass", "10mm", "-o", "o.csv"], "--lowpass"),
        (2, &["condition", "in.csv", "--extension", "evn", "-o", "o.csv"], "even"),
        (2, &["condition", "in.csv", "--integrate", "1", "--differentiate", "1", "-o", "o.csv"], "integrate"),
        (2, &["condition", "in.csv", "--channel", "axx", "-o", "o.csv"], "ax"),
        (2, &["condition", "in.csv", "-o", "-", "--json"], "standard output"),
        (3, &["condition", "absent.csv", "-o", "o.csv"], "absent.csv"),
        (4, &["condition", "in.csv", "--lowpass", "60Hz", "-o", "o.csv"], "50 Hz"),
        (74, &["condition", "in.csv", "-o", "nowhere/o.csv"], "nowhere"),
    ];
    for (code, arguments, told) in cases {
        let message = run.fails(*code, arguments);
        assert!(message.contains(told), "{arguments:?}: {message}");
    }
    assert_eq!(run.files(), ["in.csv"]);
}

#[test]
fn standard_streams_work_both_ways() {
    let run = Run::new();
    let mut child = Command::new(env!("CARGO_BIN_EXE_endgrain"))
        .args(["condition", "-", "--lowpass", "10Hz", "-o", "-"])
        .current_dir(run.folder())
        .stdin(Stdio::piped())
        .stdout(Stdio::piped())
        .stderr(Stdio::piped())
        .spawn()
        .expect("the program runs");
    child.stdin.take().expect("a pipe").write_all(ramp().as_bytes()).expect("it reads");
    let output = child.wait_with_output().expect("it ends");
    assert!(output.status.success());
    let text = String::from_utf8(output.stdout).expect("UTF-8");
    assert_eq!(text.lines().count(), 201);
    assert!(run.files().is_empty(), "no sidecar without a file name");
}

#[test]
fn a_closed_pipe_ends_quietly() {
    let run = Run::new();
    let rows: String = (0..60_000).map(|n| format!("{},{}\n", n as f64 / 100.0, n % 7)).collect();
    run.file("long.csv", &format!("t [s],a [g]\n{rows}"));
    let mut child = Command::new(env!("CARGO_BIN_EXE_endgrain"))
        .args(["condition", "long.csv", "--lowpass", "10Hz", "-o", "-", "--quiet"])
        .current_dir(run.folder())
        .stdout(Stdio::piped())
        .stderr(Stdio::piped())
        .spawn()
        .expect("the program runs");
    let mut first = [0; 64];
    child.stdout.take().expect("a pipe").read_exact(&mut first).expect("it writes");
    // The pipe is dropped here, long before a megabyte has been written.
    let output = child.wait_with_output().expect("it ends");
    assert_eq!(output.status.code(), Some(0), "{}", String::from_utf8_lossy(&output.stderr));
    assert!(output.stderr.is_empty(), "{}", String::from_utf8_lossy(&output.stderr));
}

#[test]
#[cfg(unix)]
fn an_interrupt_leaves_no_partial_file() {
    let run = Run::new();
    let fifo = run.path("pipe.csv");
    let made = Command::new("mkfifo").arg(&fifo).status().expect("mkfifo runs");
    assert!(made.success());
    let mut child = Command::new(env!("CARGO_BIN_EXE_endgrain"))
        .args(["condition", "pipe.csv", "--rate", "100", "--lowpass", "10Hz", "-o", "out.csv"])
        .current_dir(run.folder())
        .stderr(Stdio::piped())
        .spawn()
        .expect("the program runs");
    // It has opened its outputs and waits for more rows once this write has gone through.
    let mut pipe = fs::OpenOptions::new().write(true).open(&fifo).expect("a reader is there");
    pipe.write_all(b"a [g]\n1\n2\n").expect("it reads");
    let before = std::time::Instant::now();
    while run.files().len() < 2 && before.elapsed().as_secs() < 20 {
        std::thread::sleep(std::time::Duration::from_millis(10));
    }
    assert!(run.files().len() > 1, "the outputs are not open: {:?}", run.files());
    let killed = Command::new("kill").args(["-INT", &child.id().to_string()]).status().expect("kill runs");
    assert!(killed.success());
    let status = child.wait().expect("it ends");
    drop(pipe);
    assert_eq!(status.code(), Some(75));
    assert_eq!(run.files(), ["pipe.csv"]);
}

#[test]
fn the_cut_keeps_the_stamps() {
    let run = Run::new();
    run.file("in.csv", &ramp());
    run.ok(&["condition", "in.csv", "--from", "0.5s", "--to", "1s", "-o", "cut.csv"]);
    let text = run.text("cut.csv");
    let rows: Vec<&str> = text.lines().collect();
    assert_eq!(rows.len(), 52);
    assert!(rows[1].starts_with("0.50,50") && rows[51].starts_with("1.00,100"), "{} {}", rows[1], rows[51]);
}

#[test]
fn a_changed_unit_changes_the_header() {
    let run = Run::new();
    run.file("in.csv", &ramp());
    run.ok(&["condition", "in.csv", "--channel", "ax", "--integrate", "1", "--conditions", "steady", "-o", "v.csv"]);
    assert_eq!(run.text("v.csv").lines().next(), Some("time (s),ax (m/s),ay (m/s^2),remark"));
}

#[test]
fn a_dry_run_writes_nothing_and_tells_the_gain() {
    let run = Run::new();
    run.file("in.csv", &ramp());
    let output = endgrain(run.folder(), &["condition", "in.csv", "--lowpass", "10Hz", "--dry-run"]);
    let text = String::from_utf8_lossy(&output.stdout).into_owned();
    assert!(output.status.success() && text.contains("nothing was written"), "{text}");
    // Squared Butterworth of order 4: 1/(1 + 2^-8), 1/2, 1/(1 + 2^8).
    for gain in ["0.996109", "0.5", "0.00389105"] {
        assert!(text.contains(gain), "{gain} is missing in {text}");
    }
    assert_eq!(run.files(), ["in.csv"]);
}

#[test]
fn strict_turns_a_note_into_an_error() {
    let run = Run::new();
    run.file("in.csv", ramp().trim_end());
    let told = run.ok(&["condition", "in.csv", "-o", "out.csv"]);
    assert!(told.contains("note:"), "{told}");
    let told = run.fails(3, &["condition", "in.csv", "--strict", "-o", "strict.csv"]);
    assert!(told.contains("--strict"), "{told}");
}

#[test]
fn the_same_settings_give_the_same_bytes() {
    let run = Run::new();
    run.file("in.csv", &fs::read_to_string(fixture("hoist.csv")).expect("the demo record"));
    let arguments = ["--bandpass", "1Hz..12Hz", "--extension", "odd-even"];
    for (name, threads) in [("one.csv", "1"), ("two.csv", "2")] {
        let status = Command::new(env!("CARGO_BIN_EXE_endgrain"))
            .args(["condition", "in.csv", "-q", "-o", name])
            .args(arguments)
            .env("RAYON_NUM_THREADS", threads)
            .current_dir(run.folder())
            .status()
            .expect("the program runs");
        assert!(status.success());
    }
    assert_eq!(run.text("one.csv"), run.text("two.csv"));
}

#[test]
fn audit_tells_rate_units_and_what_a_run_would_refuse() {
    let run = Run::new();
    run.file("in.csv", &ramp())
        .file("gap.csv", "t [s],a [g]\n0.0,1\n0.1,2\n0.2,3\n0.3,1\n0.4,2\n0.9,3\n1.0,1\n1.1,2\n1.2,4\n1.3,2\n");
    let output = endgrain(run.folder(), &["audit", "in.csv", "gap.csv", "--json"]);
    assert!(output.status.success());
    let found: Value = serde_json::from_slice(&output.stdout).expect("JSON");
    assert_eq!(found[0]["axis"]["rate"], 100.0);
    assert_eq!(found[0]["channels"][0]["unit"], "g");
    assert_eq!(found[0]["refusal"], Value::Null);
    assert!(found[1]["refusal"].as_str().is_some_and(|text| text.contains("gap")), "{}", found[1]["refusal"]);
}

#[test]
fn help_of_every_command_starts_with_examples() {
    let run = Run::new();
    for command in ["", "condition", "audit"] {
        let arguments: Vec<&str> = [command, "--help"].into_iter().filter(|a| !a.is_empty()).collect();
        let output = endgrain(run.folder(), &arguments);
        let text = String::from_utf8_lossy(&output.stdout).into_owned();
        assert!(text.starts_with("Examples:\n"), "{command}: {text}");
    }
}

#[test]
fn a_bound_on_memory_is_kept_before_working() {
    let run = Run::new();
    for name in ["hoist.csv", "hoist.wav"] {
        let input = fixture(name).display().to_string();
        let with = |memory: &'static str| {
            vec!["condition", &*input, "--lowpass", "12Hz", "-o", "out.csv", "--memory", memory]
                .into_iter()
                .map(str::to_owned)
                .collect::<Vec<String>>()
        };
        let refused = |code: i32, memory: &'static str| {
            let arguments = with(memory);
            run.fails(code, &arguments.iter().map(String::as_str).collect::<Vec<_>>())
        };
        // 2400 rows of stamps and three axes; one channel of 2400 samples in the WAV file.
        assert!(refused(4, "15kB").contains("kB of memory, --memory allows 15 kB"), "{name}");
        let told = refused(4, "20MB");
        assert!(told.contains("the run takes 33 MiB of memory, --memory allows 20 MiB"), "{name}: {told}");
        assert!(told.contains("raise --memory"), "{name}: {told}");
        assert!(refused(2, "much").contains("not a size"), "{name}");
        assert!(run.files().is_empty(), "{name}: {:?}", run.files());
        let arguments = with("64MiB");
        run.ok(&arguments.iter().map(String::as_str).collect::<Vec<_>>());
        for left in run.files() {
            fs::remove_file(run.path(&left)).expect("an output");
        }
    }
}
