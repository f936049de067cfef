//! Transforms there and back by kind and length: `cargo bench --bench transforms`. Beside other libraries:
//! `scripts/bench_peers --parts transforms`.

use std::hint::black_box;

use criterion::{BenchmarkId, Criterion, Throughput, criterion_group, criterion_main};
use endgrain::basis::Plan;
use endgrain::ends::Ends;

/// Short, two long smooth ones, a composite with a middling factor and a prime.
const LENGTHS: [usize; 5] = [1_000, 65_536, 1_000_000, 1_234_567, 999_983];

fn transforms(c: &mut Criterion) {
    for ends in [Ends::Periodic, Ends::EVEN, Ends::ODD, Ends::EVEN_ODD] {
        let mut group = c.benchmark_group(ends.transform());
        group.sample_size(10);
        for len in LENGTHS {
            let plan = Plan::new(ends, len).expect("samples");
            let mut scratch = vec![0.0; plan.scratch_len()];
            let mut line: Vec<f64> = (0..len).map(|n| (n as f64 * 0.37).sin()).collect();
            group.throughput(Throughput::Elements(len as u64));
            group.bench_function(BenchmarkId::new("there and back", len), |b| {
                b.iter(|| {
                    plan.forward(black_box(&mut line), &mut scratch);
                    plan.inverse(&mut line, &mut scratch);
                });
            });
        }
        group.finish();
    }
}

fn plans(c: &mut Criterion) {
    let mut group = c.benchmark_group("planning");
    group.sample_size(10);
    for len in LENGTHS {
        group.bench_function(BenchmarkId::new("DCT-II", len), |b| b.iter(|| Plan::new(Ends::EVEN, black_box(len))));
    }
    group.finish();
}

criterion_group!(benches, transforms, plans);
criterion_main!(benches);
