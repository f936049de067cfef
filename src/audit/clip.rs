//! Clipping: samples that stand at full scale, and plateaus that look like it.

use serde::Serialize;

use super::quantisation::Quantisation;

/// Clipping on the two sides of a channel.
#[derive(Debug, Clone, Default, PartialEq, Serialize)]
pub struct Clipping {
    /// At the largest value.
    pub high: Option<Clip>,
    /// At the smallest value.
    pub low: Option<Clip>,
}

/// Clipping on one side.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct Clip {
    /// How sure it is.
    pub certainty: Certainty,
    /// The value at which samples stand, in the channel's unit.
    pub level: f64,
    /// How many samples stand there.
    pub count: usize,
    /// The longest run of them.
    pub longest_run: usize,
    /// The first of them.
    pub first: usize,
}

/// How sure clipping is.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Serialize)]
#[serde(rename_all = "snake_case")]
pub enum Certainty {
    /// Samples stand at the known full scale.
    Certain,
    /// The values pile up at their extreme as they do when something limits them.
    Likely,
}

impl Clipping {
    /// From a channel's samples (NaN where none), its finite values in ascending order, and its full scale if known.
    pub fn of(samples: &[f64], sorted: &[f64], steps: &Quantisation, full_scale: Option<f64>) -> Clipping {
        let side = |sign: f64| {
            let (extreme, next, at_extreme) = edge(sorted, sign, steps.lsb)?;
            let certain = full_scale.is_some_and(|full| {
                // The positive end of integer samples is one lsb short of full scale.
                let lsb = steps.floor().min(full / 128.0);
                at_extreme >= 2 && sign * extreme >= full - 1.01 * lsb
            });
            let plateau = Plateau::at(samples, extreme);
            let likely = plateau.runs_are_cut(at_extreme, next, steps, sorted)
                || plateau.values_pile_up(at_extreme, next, steps, samples, sorted);
            let certainty = match (certain, likely) {
                (true, _) => Certainty::Certain,
                (_, true) => Certainty::Likely,
                _ => return None,
            };
            let (longest_run, first) = (plateau.longest, plateau.first);
            Some(Clip { certainty, level: extreme, count: at_extreme, longest_run, first })
        };
        Clipping { high: side(1.0), low: side(-1.0) }
    }
}

/// The extreme value of a side, how many samples the next bin inwards holds (at least 1), and how many the extreme has.
fn edge(sorted: &[f64], sign: f64, lsb: Option<f64>) -> Option<(f64, usize, usize)> {
    let inwards: Box<dyn Iterator<Item = f64>> = match sign > 0.0 {
        true => Box::new(sorted.iter().rev().copied()),
        false => Box::new(sorted.iter().copied()),
    };
    let mut inwards = inwards.peekable();
    let extreme = *inwards.peek()?;
    let mut at_extreme = 0;
    while inwards.next_if(|&v| v == extreme).is_some() {
        at_extreme += 1;
    }
    let level = *inwards.peek()?; // a constant channel has no next bin
    let next = match lsb {
        Some(q) => inwards.take_while(|&v| (v - extreme).abs() <= 1.5 * q).count(),
        None => inwards.take_while(|&v| v == level).count(),
    };
    Some((extreme, next.max(1), at_extreme))
}

/// The samples that stand at an extreme.
struct Plateau {
    extreme: f64,
    longest: usize,
    first: usize,
    /// Step from the sample before into each run of three or more.
    entries: Vec<f64>,
    /// The sample before each sample at the extreme.
    before: Vec<f64>,
}

impl Plateau {
    fn at(samples: &[f64], extreme: f64) -> Plateau {
        let mut found = Plateau { extreme, longest: 0, first: 0, entries: Vec::new(), before: Vec::new() };
        let mut row = 0;
        while row < samples.len() {
            if samples[row] != extreme {
                row += 1;
                continue;
            }
            let run = samples[row..].iter().take_while(|&&v| v == extreme).count();
            if found.longest == 0 {
                found.first = row;
            }
            found.longest = found.longest.max(run);
            let before = row.checked_sub(1).map(|n| samples[n]).filter(|v| v.is_finite());
            if let Some(value) = before {
                found.before.push(value);
                if run >= 3 {
                    found.entries.push((extreme - value).abs());
                }
            }
            if run > 1 {
                found.before.push(extreme);
            }
            row += run;
        }
        found
    }

    /// A run of three or more, far more samples than next to it, and a steep way in: a slow turning point has none.
    fn runs_are_cut(&self, count: usize, next: usize, steps: &Quantisation, sorted: &[f64]) -> bool {
        let entry = crate::numeric::quantile::median(&mut self.entries.clone()).unwrap_or(0.0);
        let rests = sorted.get(sorted.len() / 2).is_some_and(|&middle| middle == self.extreme);
        self.longest >= 3 && count >= 5 * next && entry > 3.0 * steps.lsb.unwrap_or(0.0) && !rests
    }

    /// Many samples at the extreme, reached from many different values, and not where the channel rests.
    fn values_pile_up(&self, count: usize, next: usize, steps: &Quantisation, samples: &[f64], sorted: &[f64]) -> bool {
        if count < 10 || count < 8 * next || steps.levels < 20 {
            return false;
        }
        let window = (samples.len() / 50).max(16).min(samples.len());
        let middle = |part: &[f64]| crate::numeric::quantile::median(&mut part.to_vec());
        let ends = [middle(&samples[..window]), middle(&samples[samples.len() - window..])];
        let whole = sorted.get(sorted.len() / 2).copied();
        let rests = ends.into_iter().chain([whole]).flatten().any(|level| level == self.extreme);
        let mut before = self.before.clone();
        before.sort_by(f64::total_cmp);
        before.dedup();
        !rests && 2 * before.len() >= count
    }
}
