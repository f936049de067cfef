//! Reading and writing of text and WAV from and into memory: `cargo bench --bench files`.

use std::hint::black_box;
use std::io::Cursor;

use criterion::{BenchmarkId, Criterion, Throughput, criterion_group, criterion_main};
use endgrain::read::{self, Input, ReadOptions};
use endgrain::record::{RawRecord, Record};
use endgrain::regularise::{self, RegulariseOptions};
use endgrain::write::{self, Content, Digits, Pending, WAVE_ENCODINGS, WaveEncoding};

const ROWS: usize = 200_000;

/// Three axes at 4 kHz, seven decimals.
fn text() -> Vec<u8> {
    let value = |n: usize, axis: usize| (n as f64 * (0.02 + 0.01 * axis as f64)).sin() * 0.7;
    let row = |n: usize| format!("{:.5},{:.7},{:.7},{:.7}\n", n as f64 / 4000.0, value(n, 0), value(n, 1), value(n, 2));
    std::iter::once("t [s],ax [g],ay [g],az [g]\n".to_owned()).chain((0..ROWS).map(row)).collect::<String>().into()
}

fn taken(bytes: &[u8]) -> RawRecord {
    let input = Input::Stream(Box::new(Cursor::new(bytes.to_vec())));
    read::read(input, &ReadOptions::default()).expect("a sound file")
}

fn written(record: &Record, format: usize, digits: Digits, encoding: WaveEncoding) -> Vec<u8> {
    let mut bytes = Vec::new();
    let content = Content { digits, encoding, ..Content::new(record) };
    let sink = Pending::stream("-", &mut bytes);
    write::save(&write::WRITERS[format], &content, sink).expect("memory takes all");
    bytes
}

fn files(c: &mut Criterion) {
    let csv = text();
    let (record, _) = regularise::regularise(taken(&csv), &RegulariseOptions::default()).expect("an even record");
    let mut group = c.benchmark_group("read");
    group.sample_size(10);
    group.throughput(Throughput::Bytes(csv.len() as u64));
    group.bench_function("CSV", |b| b.iter(|| taken(black_box(&csv))));
    for (name, encoding) in WAVE_ENCODINGS {
        let wav = written(&record, 1, Digits::Shortest, *encoding);
        group.throughput(Throughput::Bytes(wav.len() as u64));
        group.bench_function(BenchmarkId::new("WAV", name), |b| b.iter(|| taken(black_box(&wav))));
    }
    group.finish();

    let mut group = c.benchmark_group("write");
    group.sample_size(10);
    for (name, digits) in [("shortest", Digits::Shortest), ("fixed 7", Digits::Fixed(7))] {
        let size = written(&record, 0, digits, WaveEncoding::Float32).len();
        group.throughput(Throughput::Bytes(size as u64));
        group.bench_function(BenchmarkId::new("CSV", name), |b| {
            b.iter(|| written(black_box(&record), 0, digits, WaveEncoding::Float32))
        });
    }
    for (name, encoding) in WAVE_ENCODINGS {
        group.bench_function(BenchmarkId::new("WAV", name), |b| {
            b.iter(|| written(black_box(&record), 1, Digits::Shortest, *encoding))
        });
    }
    group.finish();
}

criterion_group!(benches, files);
criterion_main!(benches);
