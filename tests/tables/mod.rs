//! One small record as text: every fixture prints it, so that the expected numbers are known before anything is read.

use std::io::Cursor;

use endgrain::error::Result;
use endgrain::read::{Input, ReadOptions, read};
use endgrain::record::RawRecord;

pub const ROWS: usize = 48;

/// Stamp, and two channels, of row `n`: hundredths of a second, and values of two decimals.
pub fn row(n: usize) -> (f64, f64, f64) {
    let a = (n as i64 * 37 % 101 - 50) as f64;
    let b = (n as i64 * 53 % 97) as f64;
    (n as f64 / 100.0, a / 100.0, b / 4.0)
}

/// The data lines: fields joined by `delimiter`, with `decimal` marks.
pub fn data(delimiter: &str, decimal: &str) -> Vec<String> {
    (0..ROWS)
        .map(|n| {
            let (t, a, b) = row(n);
            [format!("{t:.2}"), format!("{a:.2}"), format!("{b:.2}")].join(delimiter).replace('.', decimal)
        })
        .collect()
}

pub fn text(head: &str, lines: &[String]) -> Vec<u8> {
    format!("{head}{}\n", lines.join("\n")).into_bytes()
}

/// Plain data under `head`.
pub fn plain(head: &str) -> Vec<u8> {
    text(head, &data(",", "."))
}

/// The plain file with line `line` (from 1; 1 is the header) replaced.
pub fn with_line(line: usize, by: &str) -> Vec<u8> {
    let mut lines = data(",", ".");
    lines[line - 2] = by.to_owned();
    text("t,ax,ay\n", &lines)
}

pub fn take(bytes: &[u8], options: &ReadOptions) -> Result<RawRecord> {
    read(Input::Stream(Box::new(Cursor::new(bytes.to_vec()))), options)
}

pub fn codes(record: &RawRecord) -> Vec<&'static str> {
    record.findings.iter().map(|finding| finding.code).collect()
}

/// Checks the numbers of the small record, of which `rows` rows are left.
pub fn check_numbers(case: &str, record: &RawRecord, rows: usize) {
    let channels = &record.channels;
    assert_eq!(channels.len(), 2, "{case}: {:?}", channels.iter().map(|c| &c.name).collect::<Vec<_>>());
    for n in 0..rows {
        let (_, a, b) = row(n);
        assert_eq!((channels[0].values[n], channels[1].values[n]), (a, b), "{case}: row {n}");
    }
    assert_eq!((channels[0].values.len(), channels[1].values.len()), (rows, rows), "{case}");
    assert_eq!((channels[0].missing.len(), channels[1].missing.len()), (0, 0), "{case}");
    let stamps = record.stamps.as_ref().unwrap_or_else(|| panic!("{case}: no stamps; {:?}", record.findings));
    let (unit, tick) = (stamps.unit.meaning().expect("a known unit").scale, stamps.tick);
    assert_eq!(stamps.ticks.len(), rows, "{case}");
    for n in 0..rows {
        let seconds = stamps.ticks[n] as f64 * tick * unit;
        // Ticks are exact; the product rounds twice.
        assert!(
            (seconds - n as f64 / 100.0).abs() <= 4.0 * f64::EPSILON * seconds.abs(),
            "{case}: stamp {n} is {seconds}"
        );
    }
}

/// The data with stamps printed by `stamp` instead.
pub fn stamped(head: &str, delimiter: &str, stamp: impl Fn(usize) -> String) -> Vec<u8> {
    let tail = data(",", ".");
    let lines: Vec<String> = (0..ROWS)
        .map(|n| {
            format!(
                "{}{delimiter}{}",
                stamp(n),
                tail[n].split_once(',').expect("three fields").1.replace(',', delimiter)
            )
        })
        .collect();
    text(head, &lines)
}
