//! Ten thousand random corruptions of sound files: each gives the right numbers, a note or an error, never other numbers in
//! silence. A corruption that leaves a well-formed file of the same shape cannot be noticed by anyone: these are told by a
//! checker of its own (the `csv` crate, standard-library parsing, a strip about a line; for WAV the bytes outside the
//! samples) and counted apart.

mod random;

use std::io::Cursor;

use endgrain::error::Error;
use endgrain::read::{Input, ReadOptions, read};
use endgrain::record::{Record, StatedRate};
use endgrain::regularise::{RegulariseOptions, regularise};
use random::Random;

/// What became of corrupted files.
#[derive(Debug, Default)]
struct Counts {
    refused: usize,
    noted: usize,
    right: usize,
    undetectable: usize,
}

/// Bits flipped, bytes replaced, pieces and lines cut, doubled and deleted.
fn corrupt(bytes: &[u8], random: &mut Random) -> Vec<u8> {
    let mut bytes = bytes.to_vec();
    let at = (random.uniform() * bytes.len() as f64) as usize;
    // Mostly a byte or two, seldom a dozen lines.
    let length = random.logarithmic(1.0, 300.0) as usize;
    let mut below = |most: usize| (random.uniform() * most as f64) as usize;
    let line_of = |bytes: &[u8], at: usize| {
        let start = bytes[..at].iter().rposition(|&b| b == b'\n').map_or(0, |n| n + 1);
        let end = bytes[at..].iter().position(|&b| b == b'\n').map_or(bytes.len(), |n| at + n + 1);
        start..end
    };
    match below(9) {
        0 => bytes[at] ^= 1 << below(8),
        1 => bytes[at] = b"0123456789.,;- \t\"eE\r\n\0\xff"[below(23)],
        2 => bytes[at] = below(256) as u8,
        3 => bytes.truncate(at),
        4 => drop(bytes.drain(at..(at + length).min(bytes.len()))),
        5 => {
            let piece = bytes[at..(at + length).min(bytes.len())].to_vec();
            bytes.splice(at..at, piece);
        }
        6 => drop(bytes.drain(line_of(&bytes, at))),
        7 => {
            let line = line_of(&bytes, at);
            let piece = bytes[line.clone()].to_vec();
            bytes.splice(line.start..line.start, piece);
        }
        _ => {
            // Several bytes lost to a bad block.
            let end = (at + length).min(bytes.len());
            bytes[at..end].fill(0);
        }
    }
    bytes
}

/// The record as a run would take it, and whether anything was said.
fn take(bytes: &[u8], options: &ReadOptions) -> Result<(Record, bool), Error> {
    let raw = read(Input::Stream(Box::new(Cursor::new(bytes.to_vec()))), options)?;
    let said = !raw.findings.is_empty();
    let regular = regularise(raw, &RegulariseOptions::default())?;
    let said = said || !regular.record.findings().is_empty();
    Ok((regular.record, said))
}

fn same(a: &Record, b: &Record) -> bool {
    let rate = |record: &Record| (record.axis().rate_base(), record.axis().start());
    a.samples() == b.samples() && rate(a) == rate(b)
}

/// A table of two channels, and how its checker reads it.
struct Table {
    text: String,
    delimiter: u8,
    comma: bool,
    stamped: bool,
    options: ReadOptions,
}

fn tables() -> Vec<Table> {
    let mut random = Random(1);
    let noise: Vec<f64> = (0..70).map(|_| 0.1 * random.normal()).collect();
    let a = |n: usize| (n as f64 * 0.37).sin() * 3.0 + noise[n];
    let b = |n: usize| 9.81 + (n as f64 * 0.11).cos();
    let plain = ReadOptions::default();
    let rows = |row: &dyn Fn(usize) -> String| (0..70).map(row).collect::<String>();
    let rate = StatedRate::parse("200Hz").expect("a rate");
    vec![
        Table {
            text: format!(
                "time (s),ax (g),ay (g)\n{}",
                rows(&|n| format!("{:.3},{:.4},{:.4}\n", n as f64 / 200.0, a(n), b(n)))
            ),
            delimiter: b',',
            comma: false,
            stamped: true,
            options: plain.clone(),
        },
        Table {
            text: format!(
                "t [s];ax [g];ay [g]\r\n{}",
                rows(&|n| format!("{:.2};{:.3};{:.3}\r\n", n as f64 / 50.0, a(n), b(n)))
            )
            .replace('.', ","),
            delimiter: b';',
            comma: true,
            stamped: true,
            options: plain.clone(),
        },
        Table {
            text: format!(
                "\"time (s)\",\"ax (g)\",\"ay (g)\"\n{}",
                rows(&|n| format!("\"{:.3}\",\"{:.5}\",\"{:.2e}\"\n", n as f64 / 125.0, a(n), b(n)))
            ),
            delimiter: b',',
            comma: false,
            stamped: true,
            options: plain.clone(),
        },
        Table {
            text: format!("ax (g)\tay (g)\n{}", rows(&|n| format!("{:.4}\t{:.4}\n", a(n), b(n)))),
            delimiter: b'\t',
            comma: false,
            stamped: false,
            options: ReadOptions { rate: Some(rate), ..plain },
        },
    ]
}

/// Numbers and stamps of a text by other means; `None` where it is not of the shape of `table`.
fn checked(bytes: &[u8], table: &Table) -> Option<Vec<Vec<f64>>> {
    let text = std::str::from_utf8(bytes).ok()?;
    let mut reader = csv::ReaderBuilder::new()
        .delimiter(table.delimiter)
        .has_headers(false)
        .flexible(true)
        .from_reader(text.as_bytes());
    let rows: Vec<csv::StringRecord> = reader.records().collect::<Result<_, _>>().ok()?;
    let width = 2 + usize::from(table.stamped);
    let number = |cell: &str| {
        let plain = if table.comma { cell.trim().replace(',', ".") } else { cell.trim().to_owned() };
        // Fortran writes the exponents of doubles with a D.
        let plain = plain.replace(['d', 'D'], "e");
        let digits = plain.bytes().all(|b| !b.is_ascii_alphabetic() || b"eE".contains(&b));
        plain.parse::<f64>().ok().filter(|v| v.is_finite() && digits)
    };
    let is_data = |row: &csv::StringRecord| row.iter().all(|cell| number(cell).is_some());
    // A header may be hurt or gone, and so may the line be that parts it from the data.
    let first = rows.iter().position(is_data).filter(|&first| first <= 1)?;
    let mut columns = vec![Vec::new(); width];
    let mut decimals = 0;
    for row in &rows[first..] {
        if row.len() != width {
            return None;
        }
        for (column, cell) in columns.iter_mut().zip(row) {
            column.push(number(cell)?);
        }
        let mark = if table.comma { ',' } else { '.' };
        decimals = decimals.max(row.get(0)?.trim().split_once(mark).map_or(0, |(_, after)| after.len()));
    }
    let stamps = &columns[0];
    (!table.stamped || even(stamps, 10_f64.powi(-(decimals as i32)))).then_some(columns)
}

/// True when the stamps fit into a strip of their print resolution about a rising line: a search over its slope.
fn even(stamps: &[f64], resolution: f64) -> bool {
    if stamps.len() < 2 {
        return false;
    }
    let width = |step: f64| {
        let rest = stamps.iter().enumerate().map(|(n, t)| t - n as f64 * step);
        let (low, high) = rest.fold((f64::MAX, f64::MIN), |(low, high), r| (low.min(r), high.max(r)));
        high - low
    };
    let mean = (stamps[stamps.len() - 1] - stamps[0]) / (stamps.len() - 1) as f64;
    let (mut low, mut high) = (mean - 2.0 * resolution, mean + 2.0 * resolution);
    for _ in 0..200 {
        let (left, right) = (low + (high - low) / 3.0, high - (high - low) / 3.0);
        if width(left) <= width(right) { high = right } else { low = left }
    }
    mean > 0.0 && width((low + high) / 2.0) <= resolution * (1.0 + 1e-6)
}

#[test]
fn corrupted_tables_never_give_other_numbers_in_silence() {
    let (mut random, mut counts) = (Random(20_261), Counts::default());
    for table in tables() {
        let (truth, said) = take(table.text.as_bytes(), &table.options).expect("a sound file");
        assert!(!said, "{}", table.text);
        for _ in 0..1500 {
            let bytes = corrupt(table.text.as_bytes(), &mut random);
            match take(&bytes, &table.options) {
                Err(_) => counts.refused += 1,
                Ok((_, true)) => counts.noted += 1,
                Ok((record, false)) if same(&record, &truth) => counts.right += 1,
                Ok((record, false)) => {
                    let shown = String::from_utf8_lossy(&bytes);
                    let Some(columns) = checked(&bytes, &table) else { panic!("read in silence: {record:?}\n{shown}") };
                    let channels = &columns[usize::from(table.stamped)..];
                    for (channel, column) in record.channels().zip(channels) {
                        assert_eq!(channel.samples, column, "{shown}");
                    }
                    assert_eq!(record.channel_count(), 2, "{shown}");
                    counts.undetectable += 1;
                }
            }
        }
    }
    println!("6,000 corrupted tables: {counts:?}");
    assert!(counts.refused > 2000 && counts.noted > 100 && counts.right > 100, "{counts:?}");
}

fn chunk(id: &[u8; 4], content: &[u8]) -> Vec<u8> {
    let pad = vec![0; content.len() % 2];
    [id, &(content.len() as u32).to_le_bytes()[..], content, &pad].concat()
}

/// WAV files with the place of their samples.
fn waves() -> Vec<(Vec<u8>, std::ops::Range<usize>)> {
    let wave = |tag: u16, channels: u16, bits: u16, extensible: bool, data: &[u8]| {
        let align = channels * bits / 8;
        let mut fmt = [if extensible { 0xfffe } else { tag }, channels].map(u16::to_le_bytes).concat();
        fmt.extend(8000_u32.to_le_bytes());
        fmt.extend((8000 * u32::from(align)).to_le_bytes());
        fmt.extend([align, bits].map(u16::to_le_bytes).concat());
        if extensible {
            fmt.extend([22_u16, bits].map(u16::to_le_bytes).concat());
            fmt.extend(0_u32.to_le_bytes());
            fmt.extend(tag.to_le_bytes());
            fmt.extend([0, 0, 0, 0, 0x10, 0, 0x80, 0, 0, 0xaa, 0, 0x38, 0x9b, 0x71]);
        }
        let head = [b"WAVE".to_vec(), chunk(b"fmt ", &fmt), chunk(b"LIST", b"INFOabc")].concat();
        let body = [head.clone(), chunk(b"data", data)].concat();
        let start = 8 + head.len() + 8;
        ([&b"RIFF"[..], &(body.len() as u32).to_le_bytes(), &body].concat(), start..start + data.len())
    };
    let value = |n: usize| (n as f64 * 0.37).sin();
    let words: Vec<u8> = (0..120).flat_map(|n| ((value(n) * 3e4) as i16).to_le_bytes()).collect();
    let threes: Vec<u8> = (0..90).flat_map(|n| ((value(n) * 8e6) as i32).to_le_bytes().into_iter().take(3)).collect();
    let floats: Vec<u8> = (0..80).flat_map(|n| (value(n) as f32).to_le_bytes()).collect();
    vec![
        wave(1, 1, 16, false, &words),
        wave(1, 2, 16, false, &words),
        wave(1, 3, 24, true, &threes),
        wave(3, 2, 32, true, &floats),
    ]
}

#[test]
fn corrupted_waves_never_give_other_numbers_in_silence() {
    let (mut random, mut counts) = (Random(20_262), Counts::default());
    let options = ReadOptions::default();
    for (sound, samples) in waves() {
        let (truth, said) = take(&sound, &options).expect("a sound file");
        assert!(!said);
        for _ in 0..1000 {
            let bytes = corrupt(&sound, &mut random);
            match take(&bytes, &options) {
                Err(_) => counts.refused += 1,
                Ok((_, true)) => counts.noted += 1,
                Ok((record, false)) if same(&record, &truth) => counts.right += 1,
                Ok((record, false)) => {
                    let alike = bytes.len() == sound.len()
                        && (0..sound.len()).all(|n| samples.contains(&n) || bytes[n] == sound[n]);
                    let hurt: Vec<usize> =
                        (0..sound.len().min(bytes.len())).filter(|&n| bytes[n] != sound[n]).collect();
                    assert!(alike, "bytes {hurt:?} of {}, now {}: {record:?}", sound.len(), bytes.len());
                    assert_eq!(record.samples().dim(), truth.samples().dim());
                    counts.undetectable += 1;
                }
            }
        }
    }
    println!("4,000 corrupted WAV files: {counts:?}");
    assert!(counts.refused > 500 && counts.noted > 100 && counts.right > 50, "{counts:?}");
}
