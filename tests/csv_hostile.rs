//! Damaged and hostile text never stops the program: it is read, or refused with a place.

use std::io::Cursor;

use endgrain::read::{Input, ReadOptions, read};
use proptest::prelude::*;

/// Tables of every kind that the reader tells apart.
fn tables() -> Vec<String> {
    let rows = |row: &dyn Fn(i64) -> String| (0..30).map(row).collect::<String>();
    vec![
        format!("t,ax,ay\n{}", rows(&|n| format!("0.{n:02},{}.5,-{n}e-3\n", n * n))),
        format!("# rate = 100\nt [ms];a;b\r\n{}", rows(&|n| format!("{n};{n},25;1.{n:03},5\r\n"))),
        format!("\"t\",\"a\"\n{}", rows(&|n| format!("\"2026-03-01 10:00:{n:02}.5\",\"{n}\"\n"))),
        format!("t a b\r{}", rows(&|n| format!("  {n}.5  {n}  NA\r"))),
        format!("date\ttime\ta\n{}", rows(&|n| format!("01/03/2026\t23:59:{n:02}\t{n},5\n"))),
        rows(&|n| format!("{},{}\n", 1_772_359_200_000_i64 + n, n % 7)),
        format!("x [mm]|y\n{}footer\n", rows(&|n| format!("{n}|{n}\n"))),
    ]
}

/// Bytes that mean something somewhere.
const BYTES: &[u8] = b"0123456789.,;:-+eE\"\t |#=/\r\n\0\xff\xb2\xc3Tan";

#[derive(Debug, Clone)]
enum Damage {
    Put(usize, u8),
    Insert(usize, u8),
    Cut(usize, usize),
    Repeat(usize, usize, usize),
    End(usize),
}

fn damage() -> impl Strategy<Value = Damage> {
    let byte = prop_oneof![proptest::sample::select(BYTES), any::<u8>()];
    let at = any::<usize>();
    prop_oneof![
        (at, byte.clone()).prop_map(|(at, byte)| Damage::Put(at, byte)),
        (at, byte).prop_map(|(at, byte)| Damage::Insert(at, byte)),
        (at, 1..60_usize).prop_map(|(at, length)| Damage::Cut(at, length)),
        (at, 1..40_usize, 1..40_usize).prop_map(|(at, length, times)| Damage::Repeat(at, length, times)),
        at.prop_map(Damage::End),
    ]
}

fn damaged(text: &str, damages: &[Damage]) -> Vec<u8> {
    let mut bytes = text.as_bytes().to_vec();
    for damage in damages {
        let len = bytes.len().max(1);
        match *damage {
            Damage::Put(at, byte) if at % len < bytes.len() => bytes[at % len] = byte,
            Damage::Put(..) => {}
            Damage::Insert(at, byte) => bytes.insert(at % len, byte),
            Damage::Cut(at, length) => drop(bytes.drain(at % len..(at % len + length).min(bytes.len()))),
            Damage::Repeat(at, length, times) => {
                let piece = bytes[at % len..(at % len + length).min(bytes.len())].repeat(times);
                bytes.splice(at % len..at % len, piece);
            }
            Damage::End(at) => bytes.truncate(at % len),
        }
        if bytes.is_empty() {
            bytes.push(b'\n');
        }
    }
    bytes
}

fn check(bytes: Vec<u8>, options: &ReadOptions) {
    let shown = String::from_utf8_lossy(&bytes).into_owned();
    let Ok(record) = read(Input::Stream(Box::new(Cursor::new(bytes))), options) else { return };
    let rows = record.channels[0].values.len();
    assert!(rows > 0);
    for (index, channel) in record.channels.iter().enumerate() {
        assert_eq!(channel.values.len(), rows, "{shown}");
        let gaps: Vec<usize> = (0..rows).filter(|&row| !channel.values[row].is_finite()).collect();
        assert_eq!(gaps, channel.missing, "{shown}");
        let place = record.place(index, rows - 1);
        assert!(place.line.is_some() && place.column.is_some());
    }
    if let Some(stamps) = &record.stamps {
        assert_eq!((stamps.ticks.len(), stamps.ticks[0]), (rows, 0), "{shown}");
        assert!(stamps.tick > 0.0 && stamps.resolution > 0.0 && stamps.first.is_finite(), "{stamps:?} {shown}");
    }
}

/// Fields that turn up where a number should stand.
const FIELDS: &[&str] = &[
    "x",
    "",
    "NA",
    "1.5",
    "-9999",
    "1;5",
    "\"1\"",
    "\"",
    "0.07",
    "1e400",
    "10:00:00",
    "2026-01-01",
    "  ",
    "# 1",
    "1.200",
    "\0",
    "7%",
    "\u{e9}",
    "5.",
    "-",
    "1 2",
    "0x1F",
    "1:2",
    "\"a,b\"",
];

/// A table of 30 rows, of which row `row` is replaced.
fn replaced(row: usize, by: &str, header: bool) -> (Vec<u8>, Vec<[f64; 2]>) {
    let values: Vec<[f64; 2]> = (0..30).map(|n| [f64::from(n * n % 17) + 0.5, 2.5 - f64::from(n)]).collect();
    let line = |n: usize| format!("0.{n:02},{},{}", values[n][0], values[n][1]);
    let lines: Vec<String> = (0..30).map(|n| if n == row { by.to_owned() } else { line(n) }).collect();
    let head = if header { "t,ax,ay\n" } else { "" };
    (format!("{head}{}\n", lines.join("\n")).into_bytes(), values)
}

proptest! {
    #![proptest_config(ProptestConfig { cases: 400, ..ProptestConfig::default() })]

    #[test]
    fn damaged_tables_are_read_or_refused(table in 0..7_usize, damages in proptest::collection::vec(damage(), 1..6), loose in any::<bool>()) {
        let options = ReadOptions {
            allow_truncated: loose,
            missing: if loose { vec!["NUL".into(), "7".into()] } else { Vec::new() },
            thousands: loose.then_some(b'.'),
            ..ReadOptions::default()
        };
        check(damaged(&tables()[table], &damages), &options);
    }

    #[test]
    fn random_bytes_are_read_or_refused(bytes in proptest::collection::vec(proptest::sample::select(BYTES), 1..600)) {
        check(bytes, &ReadOptions::default());
    }

    /// Whatever one row holds, the others are read as they stand, and no row is lost without a word.
    #[test]
    fn one_odd_row_harms_no_other(
        row in 0..30_usize,
        cells in proptest::collection::vec(proptest::sample::select(FIELDS), 1..5),
        header in any::<bool>(),
    ) {
        prop_assume!(header || row > 0); // words above a table without a header are its header or preamble
        let line = cells.join(",");
        let (bytes, values) = replaced(row, &line, header);
        let shown = String::from_utf8_lossy(&bytes).into_owned();
        let Ok(record) = read(Input::Stream(Box::new(Cursor::new(bytes))), &ReadOptions::default()) else { return Ok(()) };
        let codes: Vec<&str> = record.findings.iter().map(|finding| finding.code).collect();
        let rows = record.channels[0].values.len();
        let blank = line.trim().is_empty();
        let told = row == 29 && (codes.contains(&"last_row_cut") || codes.contains(&"footer"));
        if codes.contains(&"rows_above_header") {
            return Ok(()); // a row of words within a table without a header was taken for one, and that is said
        }
        // A row of words right under the header belongs to it.
        let remark = row == 0 && (codes.contains(&"line_left_out") || !line.contains(|c: char| c.is_ascii_digit()));
        prop_assert!(rows == 30 || rows == 29 && (blank || told || remark), "{rows} rows, {codes:?}\n{shown}");
        // Without a header the stamps are only guessed, and not where a row contradicts.
        let first = record.channels.len() - 2;
        prop_assert!(first == 0 || first == 1 && !header && record.stamps.is_none(), "{:?}
{}", codes, shown);
        let left: Vec<usize> = (0..30).filter(|&n| rows == 30 || n != row).collect();
        for (at, &n) in left.iter().enumerate().filter(|(_, n)| **n != row) {
            prop_assert_eq!([record.channels[first].values[at], record.channels[first + 1].values[at]], values[n], "{:?}\n{}", codes, shown);
        }
    }
}
