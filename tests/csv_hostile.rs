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
}
