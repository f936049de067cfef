//! The verdict against one transform, multiplication and inverse transform of the same record: the ratio is what counts.
//!
//! `cargo bench --bench verdict`: a record of a million samples with a corner of a 64th and a 1024th of it.

use std::f64::consts::TAU;
use std::hint::black_box;

use criterion::{BenchmarkId, Criterion, criterion_group, criterion_main};
use endgrain::basis::Plan;
use endgrain::ends::Ends;
use endgrain::forecast::{Evidence, Forecast, Response, Shape};
use endgrain::numeric::{noise, quantum};
use endgrain::verdict::{self, Case, Extension, FlatEnds, Formed, Past, Tolerance, Unjudged, Verdict};

const LEN: usize = 1_000_000;

/// Tones, a drift and noise, rounded as a 16-bit logger would.
fn record(len: usize) -> Vec<f64> {
    let mut state = 3u64;
    let mut uniform = || {
        state = state.wrapping_mul(6364136223846793005).wrapping_add(1442695040888963407);
        (state >> 11) as f64 / (1u64 << 53) as f64 - 0.5
    };
    let value = |n: usize, noise: f64| {
        let t = n as f64 / len as f64;
        (TAU * 37.3 * t).sin() + 0.4 * (TAU * 411.7 * t).cos() + 2.0 * t + 0.3 * noise
    };
    (0..len).map(|n| (value(n, uniform()) * 8192.0).round() / 8192.0).collect()
}

fn conditioned(plan: &Plan, samples: &[f64], gain: impl Fn(f64) -> f64) -> Vec<f64> {
    let mut line = samples.to_vec();
    let mut scratch = vec![0.0; plan.scratch_len()];
    plan.forward(&mut line, &mut scratch);
    for (k, c) in line.iter_mut().enumerate() {
        *c *= gain(plan.frequency(k));
    }
    plan.inverse(&mut line, &mut scratch);
    line
}

fn verdicts(c: &mut Criterion) {
    let samples = record(LEN);
    let plan = Plan::new(Ends::EVEN, LEN).expect("samples");
    let mut group = c.benchmark_group("verdict");
    group.sample_size(10);
    for divisor in [64.0, 1024.0] {
        let corner = LEN as f64 / divisor;
        let gain = move |f: f64| 1.0 / (1.0 + (f * corner).powi(8));
        let label = format!("N/{divisor}");
        group.bench_function(BenchmarkId::new("one conditioning", &label), |b| {
            b.iter(|| conditioned(&plan, &samples, gain))
        });
        let shape = Shape { gain: &gain, turns: 0, shortest_wavelength: corner };
        let even = conditioned(&plan, &samples, gain);
        let output = |_: Extension| even.clone();
        group.bench_function(BenchmarkId::new("all but conditioning", &label), |b| {
            b.iter(|| judged(&samples, shape, &output))
        });
        group.bench_function(BenchmarkId::new("response", &label), |b| b.iter(|| Response::of(shape, LEN)));
        group.bench_function(BenchmarkId::new("noise and quantum", &label), |b| {
            b.iter(|| (noise::sigma(black_box(&samples)), quantum::step(black_box(&samples))))
        });
        let block = Evidence::block_length(corner);
        group.bench_function(BenchmarkId::new("evidence", &label), |b| b.iter(|| Evidence::gather(&samples, block)));
        let (evidence, response) = (Evidence::gather(&samples, block).expect("blocks"), Response::of(shape, LEN));
        group.bench_function(BenchmarkId::new("structure", &label), |b| b.iter(|| verdict::structure(&evidence)));
        group.bench_function(BenchmarkId::new("combination", &label), |b| {
            b.iter(|| Forecast::combine(&evidence, &response))
        });
    }
    group.finish();
}

/// Everything but the whole-record transforms.
fn judged(samples: &[f64], shape: Shape, output: &dyn Fn(Extension) -> Vec<f64>) -> Verdict {
    let response = Response::of(shape, samples.len());
    let evidence = Evidence::gather(samples, Evidence::block_length(shape.shortest_wavelength));
    let structure = evidence.as_ref().map(verdict::structure).unwrap_or_default();
    let estimates = verdict::estimates(samples, &response, noise::sigma(samples));
    let tolerance = Tolerance::Share(0.1);
    let forecast = evidence.as_ref().map(|evidence| Forecast::combine(evidence, &response));
    let foretold = output(Extension::Continued { left: &[], right: &[] });
    let past = evidence.as_ref().zip(forecast.as_ref());
    let past =
        past.map(|(evidence, forecast)| Past { evidence, forecast, foretold: &foretold }).ok_or(Unjudged::FewBlocks);
    let formed = Formed::InOnePass;
    let case = Case { samples, past, structure, estimates, response: &response, output, formed, tolerance };
    Verdict::of(&case, FlatEnds::Ignored)
}

criterion_group!(benches, verdicts);
criterion_main!(benches);
