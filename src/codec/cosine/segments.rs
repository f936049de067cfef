//! Where a block is parted before the cosine transform: halves of halves, where parting saves bits.

use super::spread;
use crate::basis::Planner;
use crate::ends::Ends;
use crate::error::Result;

/// Below this a segment is not parted.
const LEAST: usize = 32;
/// Bits that a segment of its own costs beside its coefficients.
const TOLL: f64 = 24.0;

/// Lengths of the segments, and the coefficients of each in turn.
#[derive(Debug, Clone)]
pub struct Parted {
    pub lengths: Vec<usize>,
    pub coefficients: Vec<f64>,
    pub bits: f64,
}

/// The cosine transform of samples, in place of them.
pub fn transform(samples: &mut [f64], planner: &Planner) -> Result<()> {
    let plan = planner.plan(Ends::EVEN, samples.len())?;
    let mut scratch = vec![0.0; plan.scratch_len()];
    plan.forward(samples, &mut scratch);
    Ok(())
}

/// Samples from their coefficients, in place of them.
pub fn inverse(coefficients: &mut [f64], planner: &Planner) -> Result<()> {
    let plan = planner.plan(Ends::EVEN, coefficients.len())?;
    let mut scratch = vec![0.0; plan.scratch_len()];
    plan.inverse(coefficients, &mut scratch);
    Ok(())
}

/// The whole as one segment.
pub fn whole(samples: &[f64], step: f64, planner: &Planner) -> Result<Parted> {
    let mut coefficients = samples.to_vec();
    transform(&mut coefficients, planner)?;
    let bits = spread::bits(&spread::around(&coefficients), step) + TOLL;
    Ok(Parted { lengths: vec![samples.len()], coefficients, bits })
}

/// The cheapest halving for a step. A part is looked into where one of the two levels below it saves.
pub fn halved(samples: &[f64], step: f64, planner: &Planner) -> Result<Parted> {
    part(samples, step, planner, true)
}

fn part(samples: &[f64], step: f64, planner: &Planner, patient: bool) -> Result<Parted> {
    let one = whole(samples, step, planner)?;
    if samples.len() < 2 * LEAST || one.bits <= 2.0 * TOLL {
        return Ok(one);
    }
    let middle = samples.len() / 2;
    let (left, right) = samples.split_at(middle);
    let (a, b) = (whole(left, step, planner)?, whole(right, step, planner)?);
    if !patient && a.bits + b.bits > one.bits * 1.03 {
        return Ok(one);
    }
    let patient = a.bits + b.bits < one.bits;
    let deeper = |half: &[f64], plain: Parted| {
        if half.len() < 2 * LEAST { Ok(plain) } else { part(half, step, planner, patient) }
    };
    let (mut a, b) = (deeper(left, a)?, deeper(right, b)?);
    if a.bits + b.bits >= one.bits {
        return Ok(one);
    }
    a.lengths.extend(b.lengths);
    a.coefficients.extend(b.coefficients);
    a.bits += b.bits;
    Ok(a)
}

/// The cheapest parting on a grid of `cells` equal stretches, with free boundaries: dynamic programming over all of them.
pub fn free(samples: &[f64], step: f64, cells: usize, planner: &Planner) -> Result<Parted> {
    let len = samples.len();
    let cells = cells.min(len / LEAST).max(1);
    let edge = |i: usize| i * len / cells;
    // The cheapest way to reach each edge, and the edge before it.
    let mut best = vec![(f64::INFINITY, 0); cells + 1];
    best[0].0 = 0.0;
    for i in 0..cells {
        for j in i + 1..=cells {
            let bits = whole(&samples[edge(i)..edge(j)], step, planner)?.bits;
            let total = best[i].0 + bits;
            if total < best[j].0 {
                best[j] = (total, i);
            }
        }
    }
    let mut edges = vec![cells];
    while let Some(&last) = edges.last().filter(|last| **last > 0) {
        edges.push(best[last].1);
    }
    edges.reverse();
    let mut parted = Parted { lengths: Vec::new(), coefficients: Vec::with_capacity(len), bits: best[cells].0 };
    for pair in edges.windows(2) {
        let one = whole(&samples[edge(pair[0])..edge(pair[1])], step, planner)?;
        parted.lengths.extend(one.lengths);
        parted.coefficients.extend(one.coefficients);
    }
    Ok(parted)
}
