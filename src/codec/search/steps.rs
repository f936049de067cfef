//! Predicted blocks: which scale, which prediction.

use super::Task;
use super::root;
use crate::codec::block::{Coded, Mode};
use crate::codec::cast::{Cast, denominator, on_grid};
use crate::codec::coder::Meter;
use crate::codec::goal::Effort;
use crate::codec::predictor::Method;
use crate::codec::stepwise::{Plan, Scale};

const fn method(order: u8, memory: u8, taps: u16) -> Method {
    Method { order, memory, taps }
}

/// Predictions tried at each effort.
static QUICK: &[Method] = &[method(8, 10, 0)];
static USUAL: &[Method] = &[
    method(0, 10, 0),
    method(1, 10, 0),
    method(2, 11, 0),
    method(8, 9, 0),
    method(16, 10, 0),
    method(16, 12, 0),
    method(32, 11, 0),
];
#[rustfmt::skip]
static LONG: &[Method] = &[
    method(0, 10, 0), method(1, 9, 0), method(1, 13, 0), method(2, 8, 0), method(2, 10, 0), method(2, 13, 0), method(4, 9, 0), method(4, 12, 0),
    method(8, 8, 0), method(8, 10, 0), method(8, 13, 0), method(16, 8, 0), method(16, 10, 0), method(16, 12, 0), method(24, 11, 0),
    method(32, 9, 0), method(32, 11, 0), method(32, 13, 0), method(16, 11, 32), method(32, 11, 32), method(32, 12, 256), method(32, 14, 256),
];

/// Share of samples that may stand off a grid.
const EXCEPTIONS: f64 = 0.05;

/// Bit for bit.
pub fn lossless(task: Task<'_>) -> Coded {
    let scales = match grid(task.samples, task.cast) {
        Some(grid) => vec![grid.lossless()],
        None => {
            let scale = task.samples.iter().fold(0.0, |most: f64, v| most.max(v.abs()));
            // Samples as a prediction sees them are at most about 2^24.
            let exponent = 24 - if scale > 0.0 { scale.log2().ceil() as i64 } else { 0 };
            let exponent = exponent.clamp(-1000, 1000);
            vec![if task.cast == Cast::Single { Scale::Single { exponent } } else { Scale::Double { exponent } }]
        }
    };
    coded(&cheapest(task, &scales, task.effort))
}

/// No sample off by more than `bound`, or `wide` before the cast.
pub fn within(task: Task<'_>, bound: f64, wide: f64) -> Vec<Coded> {
    let mut scales = Vec::new();
    let on_grid = grid(task.samples, task.cast);
    if let Some(grid) = &on_grid {
        scales.push(grid.coarser(2 * grid.steps(bound) + 1));
    }
    // A bound below the grid's own step is met only on the grid.
    if task.cast.step().is_none_or(|step| step <= bound) {
        scales.extend(offsets(task.samples, 2.0 * wide, task.effort));
    }
    scales.truncate(if task.effort == Effort::Quick { 1 } else { usize::MAX });
    let mut all = vec![coded(&cheapest(task, &scales, task.effort))];
    if on_grid.is_none() && scales.is_empty() {
        all = vec![lossless(task)];
    }
    all
}

/// Root mean squared error at most `goal`. Left alone where `least` bytes are already fewer than steps could take.
pub fn in_the_mean(task: Task<'_>, goal: f64, least: usize) -> Vec<Coded> {
    let uniform = goal * 12_f64.sqrt();
    let mut all = Vec::new();
    let scales = offsets(task.samples, uniform, task.effort);
    let plan = cheapest(task, &scales, task.effort);
    let bits = bits_a_sample(task, &plan);
    let enough = least as f64 * 8.0 / task.samples.len() as f64;
    // Where most steps are zero a wider step keeps the goal too, and costs less; hardly ever by more than half.
    if bits * 0.6 < enough + 0.1 {
        let (rounds, close) = if task.effort == Effort::Long { (12, 2e-3) } else { (5, 1e-2) };
        let widened = root::largest(uniform, goal, close, rounds, |step| {
            let plan = with_step(&plan, step);
            let restored = plan.run(&mut Meter::default(), Some(task.samples), task.samples.len());
            let cast: Vec<f64> = restored.iter().map(|v| task.cast.apply(*v)).collect();
            let error = root::mean_square(task.samples, &cast).sqrt();
            (plan, error)
        });
        if let Some((_, plan, _)) = widened {
            all.push(coded(&(plan, task.samples)));
        }
    }
    if let Some(grid) = grid(task.samples, task.cast) {
        // The error of a stride s of a grid d is about d sqrt((s^2 - 1) / 12).
        let most = (uniform / grid.step()).floor().clamp(1.0, 9e15) as u64;
        for stride in [most + 1, most, most.saturating_sub(1).max(1)] {
            let scale = grid.coarser(stride);
            let error = grid.error(task.samples, stride);
            if error <= goal {
                all.push(coded(&cheapest(task, &[scale], task.effort)));
                break;
            }
        }
    }
    all
}

fn coded(plan: &(Plan, &[f64])) -> Coded {
    Coded { mode: Mode::Predicted, payload: plan.0.encode(plan.1), kept: None, dropped: None }
}

/// Steps from zero, and from the mean rounded to it, so that a value of rest is met exactly; and free steps.
fn offsets(samples: &[f64], step: f64, effort: Effort) -> Vec<Scale> {
    if !(step > 0.0 && step.is_finite()) {
        return Vec::new();
    }
    let mean = samples.iter().sum::<f64>() / samples.len() as f64;
    let most = samples.iter().fold(0.0, |most: f64, v| most.max((v - mean).abs()).max(v.abs()));
    // Steps must be exact whole numbers in a double.
    if most / step > 1e15 {
        return Vec::new();
    }
    let mut all = vec![Scale::Free { offset: mean, step }, Scale::Whole { offset: 0.0, step }];
    if effort == Effort::Long {
        all.push(Scale::Whole { offset: middle(samples), step });
    }
    all
}

/// The median: the value of rest of a record that mostly rests.
fn middle(samples: &[f64]) -> f64 {
    let mut sorted = samples.to_vec();
    let at = sorted.len() / 2;
    *sorted.select_nth_unstable_by(at, f64::total_cmp).1
}

/// A grid that most samples stand on.
struct Grid {
    numerator: f64,
    denominator: f64,
    first: i64,
    stride: u64,
}

fn grid(samples: &[f64], cast: Cast) -> Option<Grid> {
    let (numerator, denominator) = match cast {
        Cast::Grid { numerator, denominator } => (numerator, denominator),
        Cast::Single => return None,
        Cast::Double => (1.0, denominator(samples, EXCEPTIONS)?),
    };
    let whole = |v: &f64| (v * denominator / numerator).round() as i64;
    let mut steps = samples.iter().filter(|v| cast != Cast::Double || on_grid(**v, denominator)).map(whole);
    let first = steps.next()?;
    let stride = steps.fold(0, |stride, k| common_divisor(stride, k.abs_diff(first)));
    Some(Grid { numerator, denominator, first, stride: stride.max(1) })
}

fn common_divisor(mut a: u64, mut b: u64) -> u64 {
    while b != 0 {
        (a, b) = (b, a % b);
    }
    a
}

impl Grid {
    fn step(&self) -> f64 {
        self.numerator / self.denominator * self.stride as f64
    }

    fn steps(&self, bound: f64) -> u64 {
        (bound / self.step() * (1.0 + 4.0 * f64::EPSILON)).floor().clamp(0.0, 4e15) as u64
    }

    fn lossless(&self) -> Scale {
        self.coarser(1)
    }

    fn coarser(&self, times: u64) -> Scale {
        // The origin moves to the multiple of the stride that is nearest zero.
        let stride = self.stride.saturating_mul(times).min(i64::MAX as u64);
        let first =
            if times == 1 { self.first.rem_euclid(self.stride as i64) } else { self.first % self.stride as i64 };
        Scale::Grid { numerator: self.numerator, denominator: self.denominator, first, stride }
    }

    /// Root mean squared error that a coarser stride leaves.
    fn error(&self, samples: &[f64], times: u64) -> f64 {
        let Scale::Grid { first, stride, .. } = self.coarser(times) else { return f64::INFINITY };
        let off = |v: &f64| {
            let k = (v * self.denominator / self.numerator).round() as i64 - first;
            let rest = (i128::from(k) + i128::from(stride) / 2).rem_euclid(i128::from(stride)) - i128::from(stride) / 2;
            rest as f64
        };
        let sum: f64 = samples.iter().map(|v| off(v) * off(v)).sum();
        (sum / samples.len() as f64).sqrt() * self.numerator / self.denominator
    }
}

fn with_step(plan: &(Plan, &[f64]), step: f64) -> Plan {
    let scale = match plan.0.scale {
        Scale::Free { offset, .. } => Scale::Free { offset, step },
        Scale::Whole { offset, .. } => Scale::Whole { offset, step },
        other => other,
    };
    Plan { scale, ..plan.0.clone() }
}

fn plan_of(samples: &[f64], scale: Scale, method: Method) -> Plan {
    let exceptions = match scale {
        Scale::Grid { numerator: 1.0, denominator, .. } => {
            // A zero with a sign is none of the grid's numbers.
            let odd = |v: f64| !on_grid(v, denominator) || v == 0.0 && v.is_sign_negative();
            samples.iter().enumerate().filter(|(_, v)| odd(**v)).map(|(n, v)| (n, *v)).collect()
        }
        _ => Vec::new(),
    };
    Plan { scale, method, exceptions }
}

fn bits_a_sample(task: Task<'_>, plan: &(Plan, &[f64])) -> f64 {
    let stretch = stretch_of(task.samples, 8192);
    bits(stretch, plan.0.scale, plan.0.method) / stretch.len() as f64
}

fn bits(samples: &[f64], scale: Scale, method: Method) -> f64 {
    let plan = plan_of(samples, scale, method);
    let mut meter = Meter::default();
    plan.run(&mut meter, Some(samples), samples.len());
    meter.bits() + 80.0 * plan.exceptions.len() as f64
}

/// The middle of a record.
fn stretch_of(samples: &[f64], most: usize) -> &[f64] {
    let len = samples.len().min(most);
    let start = (samples.len() - len) / 2;
    &samples[start..start + len]
}

/// The cheapest prediction for the first scale, then the cheapest scale for it: tried on a stretch.
fn cheapest<'a>(task: Task<'a>, scales: &[Scale], effort: Effort) -> (Plan, &'a [f64]) {
    let (methods, most) = match effort {
        Effort::Quick => (QUICK, 0),
        Effort::Usual => (USUAL, 8192),
        Effort::Long => (LONG, 65_536),
    };
    let stretch = stretch_of(task.samples, most);
    let first = scales.first().copied().unwrap_or(Scale::Double { exponent: 0 });
    let by_bits = |a: &(f64, Scale, Method), b: &(f64, Scale, Method)| a.0.total_cmp(&b.0);
    let tried = |scale: Scale, method: Method| (bits(stretch, scale, method), scale, method);
    let mut best = (f64::INFINITY, first, methods[0]);
    if methods.len() > 1 {
        best = methods.iter().map(|m| tried(first, *m)).min_by(by_bits).unwrap_or(best);
        let others = scales.iter().skip(1).map(|scale| tried(*scale, best.2));
        best = others.chain([best]).min_by(by_bits).unwrap_or(best);
    }
    (plan_of(task.samples, best.1, best.2), task.samples)
}
