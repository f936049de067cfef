//! Files that no logger wrote: endless lines, bombs, escape codes, encodings that change, dates in two columns.

#[expect(dead_code, reason = "what other tests of runs need")]
mod runs;

use std::io::{Cursor, Read, Write};

use endgrain::error::Result;
use endgrain::read::{Input, ReadOptions, read};
use endgrain::record::RawRecord;
use runs::{Run, endgrain, fixture};

fn take(bytes: Vec<u8>) -> Result<RawRecord> {
    read(Input::Stream(Box::new(Cursor::new(bytes))), &ReadOptions::default())
}

fn codes(record: &RawRecord) -> Vec<&'static str> {
    record.findings.iter().map(|finding| finding.code).collect()
}

fn rows(count: usize, row: impl Fn(usize) -> String) -> String {
    (0..count).map(row).collect()
}

#[test]
fn a_line_of_100_megabytes_is_refused_by_its_place() {
    let line = std::io::repeat(b'7').take(100 << 20).chain(&b"\n"[..]);
    let text = Cursor::new(b"t,a\n0,1\n1,2\n2,3\n3,4\n4,5\n5,6\n6,7\n7,8\n8,9\n".to_vec()).chain(line);
    let error = read(Input::Stream(Box::new(text)), &ReadOptions::default()).expect_err("no row");
    assert!(error.to_string().contains("a line of more than 64 MiB starts here"), "{error}");
    let line = std::io::repeat(b'7').take(100 << 20);
    let error = read(Input::Stream(Box::new(line)), &ReadOptions::default()).expect_err("no table");
    assert!(error.to_string().contains("64 MiB"), "{error}");
}

#[test]
fn a_packed_bomb_is_refused() {
    let mut encoder = flate2::write::GzEncoder::new(Vec::new(), flate2::Compression::default());
    let block = "0.5,1.25\n".repeat(1 << 17);
    for _ in 0..96 {
        encoder.write_all(block.as_bytes()).expect("memory takes it");
    }
    let bomb = encoder.finish().expect("memory takes it");
    assert!(bomb.len() < 400_000);
    let error = take(bomb).expect_err("a bomb");
    assert!(error.to_string().contains("no record does that"), "{error}");
}

#[test]
fn escape_codes_of_a_file_never_reach_the_terminal() {
    let run = Run::new();
    let text = format!(
        "t [s],\u{1b}[31mred\u{1b}[0m [\u{1b}[2Jg],\u{202e}gnorw\n{}",
        rows(60, |n| format!("{}.5,{n},{}\n", n, n * n % 7))
    );
    run.file("in.csv", &text);
    for arguments in [
        &["audit", "in.csv"][..],
        &["compare", "in.csv", "--lowpass", "0.2Hz"],
        &["condition", "in.csv", "--lowpass", "0.2Hz", "-o", "out.csv"],
        &["condition", "in.csv", "--lowpass", "0.2Hz", "--dry-run"],
        &["condition", "in.csv", "--channel", "rad", "--lowpass", "0.2Hz", "-o", "x.csv"],
    ] {
        let output = endgrain(run.folder(), arguments);
        for text in [output.stdout, output.stderr] {
            let text = String::from_utf8_lossy(&text);
            assert!(!text.contains(['\u{1b}', '\u{202e}']), "{arguments:?}: {text}");
        }
    }
    // The file's own names come back as they were.
    assert!(run.text("out.csv").starts_with(text.lines().next().expect("a header")));
    assert!(endgrain(run.folder(), &["audit", &fixture("hoist.csv").to_string_lossy()]).status.success());
}

#[test]
fn text_that_changes_its_encoding_is_noted_with_its_line() {
    let mut bytes = format!("t [s],a [g],note\n{}", rows(40_000, |n| format!("{}.5,{},ok\n", n, n % 9))).into_bytes();
    bytes.extend_from_slice(b"40000.5,1,20 \xb0C\n40001.5,2,ok\n");
    let record = take(bytes).expect("a table");
    assert_eq!(codes(&record), ["encoding_changes"]);
    assert_eq!(record.findings[0].place.line, Some(40_002));
    assert_eq!(record.channels[0].values.len(), 40_002);
}

#[test]
fn dates_and_clock_times_in_two_columns_are_one_stamp() {
    // Over midnight, in either order, with a year of two digits.
    let clock = |n: usize| format!("{:02}:59:{:02}.{}", if n < 20 { 23 } else { 0 }, (58 + n / 10) % 60, n % 10);
    let clock = |n: usize| if n < 20 { clock(n) } else { format!("00:00:{:02}.{}", n / 10 - 2, n % 10) };
    let date = |n: usize| if n < 20 { "28.02.26" } else { "01.03.26" };
    for text in [
        format!("date,clock,a [g]\n{}", rows(60, |n| format!("{},{},{n}\n", date(n), clock(n)))),
        format!("clock,date,a [g]\n{}", rows(60, |n| format!("{},{},{n}\n", clock(n), date(n)))),
        format!("date,clock,a [g]\n{}", rows(60, |n| format!("\"{}\",\"{}\",{n}\n", date(n), clock(n)))),
    ] {
        let record = take(text.into_bytes()).expect("a table");
        let stamps = record.stamps.as_ref().expect("stamps");
        assert_eq!(stamps.civil.as_deref(), Some("2026-02-28T23:59:58.0"));
        assert_eq!(stamps.ticks, (0..60).collect::<Vec<i64>>());
        assert_eq!(codes(&record), ["short_year"]);
    }
    // A date that is missing or wrong is told where it stands.
    let text = format!(
        "date,clock,a [g]\n{}",
        rows(30, |n| format!("{},{},{n}\n", if n == 25 { "" } else { date(n) }, clock(n)))
    );
    let error = take(text.into_bytes()).expect_err("no date");
    assert!(error.to_string().starts_with("-:27:1:"), "{error}");
}
