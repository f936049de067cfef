//! Cosine blocks: which parting, which polynomial, which quantiser, which step.

use super::{Task, root};
use crate::codec::block::{Coded, Mode};
use crate::codec::cosine::segments::{self, Parted};
use crate::codec::cosine::{Prepared, Quantiser, Remainder, Series, slope, spread};
use crate::codec::goal::Effort;
use crate::error::Result;

/// Root mean squared error at most `goal`.
pub fn in_the_mean(task: Task<'_>, goal: f64) -> Result<Vec<Coded>> {
    let energy = goal * goal * task.samples.len() as f64;
    let whole = segments::whole(task.samples, goal, task.planner)?;
    let plain = Prepared::new(Vec::new(), whole.lengths.clone(), whole.coefficients.clone());
    let (rounds, close) = if task.effort == Effort::Long { (24, 1e-3) } else { (12, 3e-3) };
    let find = |prepared: &Prepared, quantiser: Quantiser, start: f64| {
        // The error is squared and summed: its square root grows with the step.
        root::largest(start, energy.sqrt(), close, rounds, |step| {
            let (series, error) = prepared.quantise(quantiser, step as f32);
            (series, error.sqrt())
        })
    };
    let Some((step, first, _)) = find(&plain, Quantiser::Plain, goal * 3.4) else { return Ok(Vec::new()) };
    if task.effort == Effort::Quick {
        return Ok(vec![coded(&first, None)]);
    }
    // The step decides what is worth parting or taking off: it comes from the plainest way.
    let mut all: Vec<(Series, f64)> = Vec::new();
    let mut ways = ways(task, &whole, step)?;
    ways.insert(0, plain);
    let keep = if task.effort == Effort::Long { 4 } else { 2 };
    ways.sort_by(|a, b| cost(a, step).total_cmp(&cost(b, step)));
    for prepared in ways.iter().take(keep) {
        if let Some((step, series, _)) = find(prepared, Quantiser::Plain, step) {
            let fine = series.bits();
            all.push((series, fine));
            // Below half a bit a sample the trellis gains next to nothing.
            if (task.effort == Effort::Long || fine > 0.5 * task.samples.len() as f64 || all.len() == 1)
                && let Some((_, series, _)) = find(prepared, Quantiser::Trellis, step * 0.6)
            {
                let fine = series.bits();
                all.push((series, fine));
            }
        }
    }
    let best = all.iter().min_by(|a, b| a.1.total_cmp(&b.1)).map(|(series, _)| coded(series, None));
    Ok(best.into_iter().collect())
}

/// No sample off by more than `bound`; `least` bytes are to be beaten.
pub fn within(task: Task<'_>, bound: f64, least: usize) -> Result<Vec<Coded>> {
    let whole = segments::whole(task.samples, bound, task.planner)?;
    let plain = Prepared::new(Vec::new(), whole.lengths.clone(), whole.coefficients.clone());
    let spread: &[f64] = if task.effort == Effort::Long {
        &[0.7, 1.0, 1.4, 2.0, 2.8, 4.0, 5.6, 8.0, 11.0, 16.0, 32.0, 64.0]
    } else {
        &[1.0, 2.0, 4.0, 8.0, 32.0]
    };
    let mut tried: Vec<(f64, f64)> = Vec::new();
    for times in spread {
        tried.push((rough(task, &plain, Quantiser::Plain, bound, bound * times)?, bound * times));
    }
    let Some((rough_bits, step)) = tried.into_iter().min_by(|a, b| a.0.total_cmp(&b.0)) else { return Ok(Vec::new()) };
    let mut best = (rough_bits, plain, Quantiser::Plain, step);
    if rough_bits < 1.6 * 8.0 * least as f64 || task.effort == Effort::Long {
        for prepared in ways(task, &whole, step)? {
            for times in [0.7, 1.0, 1.5] {
                let bits = rough(task, &prepared, Quantiser::Plain, bound, step * times)?;
                if bits < best.0 {
                    best = (bits, prepared.clone(), Quantiser::Plain, step * times);
                }
            }
        }
        if task.effort == Effort::Long {
            for times in [0.35, 0.5, 0.6, 0.8] {
                let bits = rough(task, &best.1, Quantiser::Trellis, bound, best.3 * times)?;
                if bits < best.0 {
                    best = (bits, best.1, Quantiser::Trellis, best.3 * times);
                }
            }
        }
    }
    if best.0 > 1.15 * 8.0 * least as f64 {
        return Ok(Vec::new());
    }
    let (series, _) = best.1.quantise(best.2, best.3 as f32);
    let remainder = Remainder::of(task.samples, &series.samples(task.planner)?, 2.0 * bound);
    Ok(vec![coded(&series, Some(&remainder))])
}

fn coded(series: &Series, remainder: Option<&Remainder>) -> Coded {
    let mode = if remainder.is_some() { Mode::CosineLattice } else { Mode::Cosine };
    Coded { mode, payload: series.encode(remainder), kept: Some(series.kept()), dropped: None }
}

/// Bits that a prepared block would take, by its smoothed magnitudes.
fn cost(prepared: &Prepared, step: f64) -> f64 {
    spread::bits(&prepared.spread, step) + 32.0 * prepared.factors.len() as f64 + 24.0 * prepared.lengths.len() as f64
}

/// Other ways to prepare a block than as one cosine series: with a polynomial, in halves, with free boundaries.
fn ways(task: Task<'_>, whole: &Parted, step: f64) -> Result<Vec<Prepared>> {
    let len = task.samples.len();
    let mut all = Vec::new();
    if len >= 32 {
        let power = |j: i32| -> Result<Vec<f64>> {
            let mut values: Vec<f64> = (0..len).map(|n| ((n as f64 + 0.5) / len as f64).powi(j)).collect();
            segments::transform(&mut values, task.planner)?;
            Ok(values)
        };
        let degrees: &[usize] = if task.effort == Effort::Long { &[1, 2, 3, 4] } else { &[2] };
        let powers =
            (1..=slope::MOST as i32).take(degrees[degrees.len() - 1]).map(power).collect::<Result<Vec<_>>>()?;
        for degree in degrees {
            if let Some(factors) = slope::fit(&whole.coefficients, &powers[..*degree], step) {
                let mut rest = task.samples.to_vec();
                slope::add(&mut rest, &factors, -1.0);
                segments::transform(&mut rest, task.planner)?;
                all.push(Prepared::new(factors, vec![len], rest));
            }
        }
    }
    let mut parted = vec![segments::halved(task.samples, step, task.planner)?];
    if task.effort == Effort::Long && len <= 100_000 {
        parted.push(segments::free(task.samples, step, 64, task.planner)?);
    }
    let parted = parted.into_iter().filter(|p| p.lengths.len() > 1);
    all.extend(parted.map(|p| Prepared::new(Vec::new(), p.lengths, p.coefficients)));
    Ok(all)
}

/// Bits of a series and its remainders, roughly: the stand-in for coefficients, the entropy of counts for remainders.
fn rough(task: Task<'_>, prepared: &Prepared, quantiser: Quantiser, bound: f64, step: f64) -> Result<f64> {
    let (series, _) = prepared.quantise(quantiser, step as f32);
    let restored = series.samples(task.planner)?;
    let remainder = Remainder::of(task.samples, &restored, 2.0 * bound);
    if task.effort == Effort::Long {
        return Ok(series.bits() + remainder.bits());
    }
    let mut counts = [0_u64; 129];
    for q in &remainder.steps {
        counts[(q.clamp(&-64, &64) + 64) as usize] += 1;
    }
    let total = remainder.steps.len() as f64;
    let entropy: f64 = counts.iter().filter(|n| **n > 0).map(|n| *n as f64 * (total / *n as f64).log2()).sum();
    let factor = if quantiser == Quantiser::Trellis { 0.5 } else { 1.0 };
    Ok(cost(prepared, step / factor) + entropy)
}
