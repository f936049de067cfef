//! Repair by real runs: what is mended is counted, marked and printed like the rest, and gaps split into numbered outputs.

mod runs;

use std::io::Write;

use runs::{Run, endgrain, fixture};
use serde_json::Value;

/// Two tones at 100 Hz in one channel, without the rows that `lost` names; stamps as `stamp` prints them.
fn log(rows: usize, lost: &[std::ops::Range<usize>], stamp: impl Fn(usize) -> String) -> String {
    let value = |n: usize| (n as f64 * 0.12).sin() + 0.4 * (n as f64 * 0.31).cos();
    let kept = (0..rows).filter(|n| !lost.iter().any(|range| range.contains(n)));
    let lines = kept.map(|n| format!("{},{:.6},kept {n}\n", stamp(n), value(n)));
    format!("time (s),ax (g),remark\n{}", lines.collect::<String>())
}

fn seconds(n: usize) -> String {
    format!("{:.2}", n as f64 / 100.0)
}

fn json(run: &Run, name: &str) -> Value {
    serde_json::from_str(&run.text(name)).expect("JSON")
}

fn codes(report: &Value) -> Vec<&str> {
    report["notes"].as_array().expect("notes").iter().filter_map(|note| note["code"].as_str()).collect()
}

#[test]
fn filled_rows_are_counted_marked_and_stamped() {
    let run = Run::new();
    run.file("in.csv", &log(400, &[200..204, 300..301], seconds));
    let told = run.ok(&[
        "condition",
        "in.csv",
        "--gaps",
        "fill",
        "--mark-repairs",
        "--lowpass",
        "10Hz",
        "--extension",
        "even",
        "-o",
        "out.csv",
    ]);
    assert!(told.contains("ax: 5 samples in 2 places are not measured"), "{told}");
    let text = run.text("out.csv");
    let rows: Vec<&str> = text.lines().collect();
    assert_eq!((rows.len(), rows[0]), (401, "time (s),ax (g),remark,repaired"));
    for (n, row) in rows[1..].iter().enumerate() {
        let cells: Vec<&str> = row.split(',').collect();
        let mended = (200..204).contains(&n) || n == 300;
        let remark = if mended { String::new() } else { format!("kept {n}") };
        assert_eq!((cells[0], cells[2], cells[3]), (&*seconds(n), &*remark, if mended { "1" } else { "0" }), "{n}");
    }
    let report = json(&run, "out.csv.json");
    let channel = &report["channels"][0];
    assert_eq!((channel["repaired"].as_u64(), channel["repairs"].as_array().map(Vec::len)), (Some(5), Some(2)));
    assert_eq!(channel["repairs"][0]["first"], 200);
    assert_eq!(codes(&report), ["filled"]);
    // What was written is read again without a word.
    run.ok(&["condition", "out.csv", "--channel", "ax", "--strict", "-o", "again.csv"]);
}

#[test]
fn a_gap_within_reach_of_an_end_is_a_warning() {
    let run = Run::new();
    run.file("in.csv", &log(400, std::slice::from_ref(&(7..9)), seconds));
    let told =
        run.ok(&["condition", "in.csv", "--gaps", "fill", "--lowpass", "5Hz", "--extension", "even", "-o", "out.csv"]);
    assert!(told.contains("2 mended samples lie within one reach of an end"), "{told}");
    assert!(codes(&json(&run, "out.csv.json")).contains(&"repair_near_end"));
    let told = run.fails(
        2,
        &[
            "condition",
            "in.csv",
            "--gaps",
            "fill",
            "--strict",
            "--lowpass",
            "5Hz",
            "--extension",
            "even",
            "-o",
            "x.csv",
        ],
    );
    assert!(told.contains("--strict refuses notes"), "{told}");
    assert!(!run.path("x.csv").exists());
}

#[test]
fn stamps_of_filled_rows_look_like_the_files_own() {
    let clock = |n: usize| format!("{:02}:{:02}.{:03}", 59 + n / 6000, n / 100 % 60, n % 100 * 10);
    let forms: [(&str, &dyn Fn(usize) -> String); 5] = [
        ("ISO 8601", &|n| format!("2026-03-01T10:{}Z", clock(n))),
        ("day first", &|n| format!("01.03.2026 10:{}", clock(n))),
        ("clock", &|n| format!("10:{}", clock(n))),
        ("ns since 1970", &|n| format!("{}", 1_772_359_200_123_456_789_u64 + 10_000_000 * n as u64)),
        ("ms", &|n| format!("{}", 10 * n)),
    ];
    for (name, stamp) in forms {
        let run = Run::new();
        run.file("in.csv", &log(90, &[30..32, 60..61], stamp).replace("time (s)", "time"));
        run.ok(&["condition", "in.csv", "--gaps", "fill", "-o", "out.csv"]);
        let text = run.text("out.csv");
        let stamps: Vec<&str> = text.lines().skip(1).filter_map(|row| row.split(',').next()).collect();
        let wanted: Vec<String> = (0..90).map(stamp).collect();
        assert_eq!(stamps, wanted, "{name}");
    }
    // Date and clock time in two columns.
    let run = Run::new();
    let text = log(90, std::slice::from_ref(&(30..32)), |n| {
        let n = n + 5970; // over midnight
        format!(
            "{},{:02}:{:02}:{:02}.{:02}",
            if n < 6000 { "28.02.2026" } else { "01.03.2026" },
            if n < 6000 { 23 } else { 0 },
            (59 + n / 6000) % 60,
            n / 100 % 60,
            n % 100
        )
    });
    run.file("in.csv", &text.replace("time (s)", "date,clock"));
    run.ok(&["condition", "in.csv", "--gaps", "fill", "-o", "out.csv"]);
    let out = run.text("out.csv");
    let rows: Vec<&str> = out.lines().collect();
    assert!(rows[31].starts_with("01.03.2026,00:00:00.00,"), "{}", rows[31]);
    assert!(rows[32].starts_with("01.03.2026,00:00:00.01,"), "{}", rows[32]);
    assert_eq!(json(&run, "out.csv.json")["input"]["axis"]["epoch"], "2026-02-28T23:59:59.70");
}

#[test]
fn gaps_split_into_numbered_outputs() {
    let run = Run::new();
    let whole = log(900, &[], seconds);
    run.file("in.csv", &log(900, &[200..260, 500..640], seconds));
    let arguments = [
        "condition",
        "in.csv",
        "--gaps",
        "split",
        "--lowpass",
        "10Hz",
        "--extension",
        "even",
        "-o",
        "out.csv",
        "--json",
        "all.json",
    ];
    let told = run.ok(&arguments);
    assert!(told.contains("in.csv, part 2 of 3: 240 samples, 100 Hz"), "{told}");
    let names = [
        "all.json",
        "in.csv",
        "out-1.csv",
        "out-1.csv.json",
        "out-2.csv",
        "out-2.csv.json",
        "out-3.csv",
        "out-3.csv.json",
    ];
    assert_eq!(run.files(), names);
    let all = json(&run, "all.json");
    for (index, (from, to)) in [(0, 200), (260, 500), (640, 900)].into_iter().enumerate() {
        let name = format!("out-{}.csv", index + 1);
        let text = run.text(&name);
        let stamps: Vec<&str> = text.lines().skip(1).filter_map(|row| row.split(',').next()).collect();
        assert_eq!(stamps, (from..to).map(seconds).collect::<Vec<_>>());
        assert!(text.ends_with(&format!("kept {}\n", to - 1)));
        let report = json(&run, &format!("{name}.json"));
        assert_eq!(
            (&report["input"]["part"]["number"], &report["input"]["part"]["count"]),
            (&(index + 1).into(), &3.into())
        );
        assert_eq!(codes(&report), ["segment"]);
        assert_eq!(all[index], report);
        // Each part is conditioned as if it were a file of its own.
        let lines: Vec<&str> = whole.lines().collect();
        let alone = [&lines[..1], &lines[1 + from..1 + to]].concat().join("\n") + "\n";
        run.file("alone.csv", &alone);
        run.ok(&[
            "condition",
            "alone.csv",
            "--lowpass",
            "10Hz",
            "--extension",
            "even",
            "-o",
            "conditioned.csv",
            "--force",
        ]);
        assert_eq!(run.text("conditioned.csv"), text);
    }
    assert!(run.fails(2, &["condition", "in.csv", "--gaps", "split", "-o", "-"]).contains("one stream cannot hold"));
    assert!(run.fails(74, &arguments).contains("--force"));
    // Without a gap there is one output, under its own name.
    run.file("whole.csv", &whole);
    run.ok(&["condition", "whole.csv", "--gaps", "split", "--strict", "-o", "one.csv"]);
    assert!(run.path("one.csv").exists());
    let dry =
        run.ok(&["condition", "in.csv", "--gaps", "split", "--lowpass", "10Hz", "--extension", "even", "--dry-run"]);
    assert!(dry.is_empty());
}

#[test]
fn packed_files_are_read_and_never_written() {
    let run = Run::new();
    let text = log(3000, &[], seconds);
    run.file("in.csv", &text);
    let mut encoder = flate2::write::GzEncoder::new(Vec::new(), flate2::Compression::default());
    encoder.write_all(text.as_bytes()).expect("memory takes it");
    let packed = encoder.finish().expect("memory takes it");
    std::fs::write(run.path("in.csv.gz"), &packed).expect("a file");
    std::fs::write(run.path("cut.csv.gz"), &packed[..packed.len() / 2]).expect("a file");
    run.ok(&["condition", "in.csv", "--lowpass", "5Hz", "--extension", "even", "-o", "plain.csv"]);
    run.ok(&["condition", "in.csv.gz", "--lowpass", "5Hz", "--extension", "even", "-o", "packed.csv"]);
    assert_eq!(run.text("plain.csv"), run.text("packed.csv"));
    let told = run.fails(3, &["audit", "cut.csv.gz"]);
    assert!(told.contains("cut.csv.gz: byte") && told.contains("end too early"), "{told}");
    let told = run.ok(&[
        "condition",
        "cut.csv.gz",
        "--allow-truncated",
        "--lowpass",
        "5Hz",
        "--extension",
        "even",
        "-o",
        "cut.csv",
    ]);
    assert!(told.contains("the packed data end too early"), "{told}");
    assert!(run.fails(2, &["condition", "in.csv", "-o", "out.csv.gz"]).contains("not packed"));
}

#[test]
fn an_audit_has_a_block_for_each_rate_and_can_be_required_clean() {
    let run = Run::new();
    let rows = (0..400).map(|n| {
        let slow = if n % 10 == 0 { format!("{:.3}", 20.0 + (n as f64 * 0.01).sin()) } else { String::new() };
        format!("{},{:.6},{slow}\n", seconds(n), (n as f64 * 0.12).sin())
    });
    run.file("two.csv", &format!("time (s),ax (g),temp (°C)\n{}", rows.collect::<String>()));
    run.file("one.csv", &log(400, &[], seconds));
    run.ok(&["audit", "two.csv", "--json", "two.json"]);
    let report = &json(&run, "two.json")[0];
    assert_eq!(report["records"][0]["channels"], serde_json::json!(["ax"]));
    assert_eq!(report["records"][1]["channels"], serde_json::json!(["temp"]));
    assert_eq!(
        (&report["records"][0]["axis"]["rate"], &report["records"][1]["axis"]["rate"]),
        (&100.0.into(), &10.0.into())
    );
    assert_eq!(report["unit_sources"], serde_json::json!(["header", "header"]));
    assert!(report["estimate"]["seconds"].as_f64().is_some_and(|s| s > 0.0));
    run.ok(&["audit", "one.csv", "--require", "clean"]);
    let demo = fixture("hoist.csv");
    let output = endgrain(run.folder(), &["audit", &demo.to_string_lossy()]);
    assert!(String::from_utf8_lossy(&output.stdout).contains("a run will take about"));
    run.fails(1, &["audit", "one.csv", "two.csv", "--require", "clean"]);
    assert!(run.fails(2, &["condition", "one.csv", "--require", "clean", "-o", "x.csv"]).contains("asked of an audit"));
    // One file that cannot be read does not hide the others.
    let told = run.fails(3, &["audit", "none.csv", "one.csv", "--json", "some.json"]);
    assert!(told.contains("none.csv: there is no such file"), "{told}");
    let some = json(&run, "some.json");
    assert_eq!(some[0]["axis"]["rate"], 100.0);
}

#[test]
fn strict_refuses_every_note() {
    let run = Run::new();
    run.file("in.csv", &log(400, &[], seconds));
    // Of the writer: a unit that WAV cannot keep. Of the operators: a reach over a quarter of the record.
    assert!(run.fails(2, &["condition", "in.csv", "--strict", "-o", "x.wav"]).contains("keeps no unit"));
    run.fails(2, &["condition", "in.csv", "--strict", "--lowpass", "0.7Hz", "-o", "x.csv"]);
    run.fails(2, &["condition", "in.csv", "--strict", "--lowpass", "0.7Hz", "--dry-run"]);
    run.fails(2, &["compare", "in.csv", "--strict", "--lowpass", "0.7Hz"]);
    // Of a channel: an assertion that the record speaks against.
    let slope = (0..400).map(|n| format!("{},{}\n", seconds(n), n * n)).collect::<String>();
    run.file("slope.csv", &format!("time (s),ax (g)\n{slope}"));
    let asserted = ["condition", "slope.csv", "--assert", "zero-slope", "--lowpass", "10Hz", "-o", "x.csv"];
    run.fails(2, &[&asserted[..], &["--strict"]].concat());
    assert_eq!(run.files(), ["in.csv", "slope.csv"]);
    // Of the file: its own exit code.
    run.file("cut.csv", log(400, &[], seconds).trim_end());
    assert!(run.fails(3, &["condition", "cut.csv", "--strict", "-o", "x.csv"]).contains("may be cut"));
}
