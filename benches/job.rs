//! The whole job from text to text in memory, long and short: `cargo bench --bench job`. On files and beside other libraries:
//! `scripts/bench_peers --parts whole`; many short logs: `cargo run --release --example small_logs`.

use std::hint::black_box;
use std::io::Cursor;

use criterion::{BenchmarkId, Criterion, criterion_group, criterion_main};
use endgrain::job::{self, Target};
use endgrain::read::Input;
use endgrain::settings::Settings;
use endgrain::write::Overwrite;

/// One axis at 4 kHz.
fn text(rows: usize) -> Vec<u8> {
    let value = |n: usize| (n as f64 * 0.02).sin() + 0.2 * (n as f64 * 0.7).sin();
    let row = |n: usize| format!("{:.5},{:.7}\n", n as f64 / 4000.0, value(n));
    std::iter::once("t [s],a [g]\n".to_owned()).chain((0..rows).map(row)).collect::<String>().into()
}

fn jobs(c: &mut Criterion) {
    let kinds: [(&str, &[(&str, &str)]); 3] = [
        ("low-pass, even", &[("lowpass", "50Hz"), ("extension", "even")]),
        ("low-pass, defaults", &[("lowpass", "50Hz")]),
        ("integral, even", &[("integrate", "1"), ("extension", "even")]),
    ];
    for rows in [1_000, 300_007] {
        let bytes = text(rows);
        let mut group = c.benchmark_group(format!("{rows} rows"));
        group.sample_size(10);
        for (name, keys) in &kinds {
            let mut settings = Settings::default();
            keys.iter().for_each(|(key, value)| settings.set(key, value).expect("a good value"));
            group.bench_function(BenchmarkId::from_parameter(name), |b| {
                b.iter(|| {
                    let input = Input::Stream(Box::new(Cursor::new(bytes.clone())));
                    let target = Target::stream(Box::new(std::io::sink()), None, Overwrite::Force);
                    job::condition(input, target, black_box(&settings)).expect("a sound record")
                });
            });
        }
        group.finish();
    }
}

criterion_group!(benches, jobs);
criterion_main!(benches);
