//! A pass over a long record in blocks: where the response dies away, an output sample needs only its surroundings.
//!
//! Beyond the numeric reach lies at most 1e-13 of the response's absolute area. A block of the extended record, one such
//! reach wider to each side than the output that is wanted, therefore gives that output whatever is assumed past the block
//! (overlap-save; Oppenheim and Schafer, "Discrete-Time Signal Processing", title from memory). Every block goes through the
//! cosine transform of one smooth length: a record of prime length costs what its smooth neighbours do, and the memory is
//! that of a few blocks.

use rayon::prelude::*;

use super::pass::{Passed, multiply, turned};
use crate::baseline::Baseline;
use crate::basis::Planner;
use crate::ends::Ends;
use crate::error::Result;
use crate::integral::Arrival;
use crate::numeric::polynomial::Polynomial;
use crate::numeric::smooth::{is_smooth, smooth_from};
use crate::numeric::sum;
use crate::operator::Pass;

/// Shorter records are transformed whole: there is nothing to gain.
const LEAST: usize = 1 << 16;
/// The shortest and longest blocks among which the cheapest is taken, unless one block holds all.
const BLOCKS: std::ops::RangeInclusive<u32> = 13..=22;

/// How a record is cut.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub struct Layout {
    /// Samples of a transformed block.
    pub block: usize,
    /// Samples of output that a block gives.
    pub step: usize,
    /// Samples on each side that only serve their neighbours.
    pub margin: usize,
}

impl Layout {
    /// The cut of a record of `len` samples, where `pass` allows one and it costs less than the transform of the whole.
    pub fn of(pass: &Pass, len: usize) -> Option<Layout> {
        let plain = pass.is_real() && pass.resampling().is_none() && pass.robust().is_none();
        let wanted = len >= LEAST && pass.turns() >= 0 && plain && !pass.is_identity();
        let reach = pass.reaches().numeric.filter(|_| wanted)?;
        // The extension is folded from the record itself: within one reach of either end it is its mirror image.
        if 2.0 * reach > len as f64 {
            return None;
        }
        let margin = reach.ceil() as usize;
        let cost = |block: usize| block as f64 * (block as f64).log2();
        let whole = Layout { block: smooth_from(len + 2 * margin), step: len, margin };
        let cut = |bits: u32| {
            let block = 1_usize << bits;
            let most = block.checked_sub(2 * margin).filter(|step| *step >= block / 2)?;
            // Blocks of one size: the last one would otherwise be mostly extension.
            Some(Layout { block, step: len.div_ceil(len.div_ceil(most)), margin })
        };
        let total = |layout: &Layout| cost(layout.block) * len.div_ceil(layout.step) as f64;
        let exact = cost(len) * if is_smooth(len) { 1.0 } else { AWKWARD };
        BLOCKS
            .filter_map(cut)
            .chain([whole])
            .min_by(|a, b| total(a).total_cmp(&total(b)))
            .filter(|layout| total(layout) < exact)
    }
}

/// The time of a transform of a length with large prime factors over that of its smooth neighbour, at least.
const AWKWARD: f64 = 3.0;

/// As `pass::apply`, in blocks. The result does not depend on the number of threads.
///
/// # Errors
/// `Unsupported` for a record of no samples.
pub fn apply(
    samples: &[f64],
    ends: Ends,
    baseline: &Baseline,
    pass: &Pass,
    layout: Layout,
    planner: &Planner,
) -> Result<Passed> {
    let plan = planner.plan(Ends::EVEN, layout.block)?;
    let split = baseline.polynomial();
    let carried = turned(pass.carry(split), pass.turns());
    let record = Extended { samples, ends, split: (!split.is_zero()).then_some(split) };
    let mut gains = vec![1.0; layout.block];
    multiply(&mut gains, None, Ends::EVEN, pass);

    let mut output = vec![0.0; samples.len()];
    let work = |(index, slot): (usize, &mut [f64]), (block, scratch): &mut (Vec<f64>, Vec<f64>)| {
        let first = index * layout.step;
        record.lay(first as i64 - layout.margin as i64, block);
        let energy = sum::sum_of_squares(block);
        plan.forward(block, scratch);
        let kept = sum::sum_of_squares(block);
        block.iter_mut().zip(&gains).for_each(|(c, gain)| *c *= gain);
        if pass.turns().rem_euclid(2) == 1 {
            plan.inverse_turned(block, scratch);
        } else {
            plan.inverse(block, scratch);
        }
        slot.copy_from_slice(&block[layout.margin..][..slot.len()]);
        if !carried.is_zero() {
            let start = first as f64 + ends.first_position();
            slot.iter_mut().enumerate().for_each(|(n, value)| *value += carried.at(start + n as f64));
        }
        [energy, kept]
    };
    let energies: Vec<[f64; 2]> = output
        .par_chunks_mut(layout.step)
        .enumerate()
        .map_init(|| (vec![0.0; layout.block], vec![0.0; plan.scratch_len()]), |lent, item| work(item, lent))
        .collect();
    let [energy, kept] = [0, 1].map(|which| energies.iter().map(|pair| pair[which]).sum::<f64>());
    let parseval = if energy > 0.0 { (kept - energy).abs() / energy } else { 0.0 };
    Ok(Passed { output, parseval, first: ends.first_position(), spacing: 1.0, arrival: Arrival::default() })
}

/// A record less its baseline, as it goes on past both ends.
struct Extended<'a> {
    samples: &'a [f64],
    ends: Ends,
    split: Option<&'a Polynomial>,
}

impl Extended<'_> {
    /// Fills `block` from sample `first` on, which may lie outside the record.
    fn lay(&self, first: i64, block: &mut [f64]) {
        let len = self.samples.len() as i64;
        let inside = |n: i64| n.clamp(0, len);
        let (from, to) = (inside(first), inside(first + block.len() as i64));
        // A block may lie wholly past either end.
        let size = block.len() as i64;
        let start = (from - first).clamp(0, size);
        let within = start as usize..(to - first).clamp(start, size) as usize;
        for (place, value) in block[..within.start].iter_mut().enumerate() {
            *value = self.outside(first + place as i64);
        }
        for (place, value) in block[within.end..].iter_mut().enumerate() {
            *value = self.outside(first + (within.end + place) as i64);
        }
        let values = &mut block[within];
        values.copy_from_slice(&self.samples[from as usize..][..values.len()]);
        if let Some(split) = self.split {
            let start = from as f64 + self.ends.first_position();
            values.iter_mut().enumerate().for_each(|(n, value)| *value -= split.at(start + n as f64));
        }
    }

    fn outside(&self, n: i64) -> f64 {
        let Some((source, sign)) = self.ends.fold(self.samples.len(), n) else { return 0.0 };
        let split = self.split.map_or(0.0, |split| split.at(source as f64 + self.ends.first_position()));
        sign * (self.samples[source] - split)
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::operator::{Chain, Request, Shape};
    use crate::record::{Axis, RateSource};

    fn pass(requests: &[(&str, &str)], len: usize) -> Pass {
        let axis = Axis::from_rate_hz(1000.0, len, RateSource::Given).expect("an axis");
        let requests: Vec<Request> =
            requests.iter().map(|(key, value)| Request::parse(key, value).expect("a request")).collect();
        let shape = Shape::parse("butterworth:4").expect("a shape");
        Chain::resolve(&requests, &shape, &axis, len).expect("a chain").0.passes()[0].clone()
    }

    #[test]
    fn awkward_lengths_are_cut_and_short_ones_are_not() {
        let low = [("lowpass", "10Hz")];
        assert_eq!(Layout::of(&pass(&low, 10_007), 10_007), None);
        let layout = Layout::of(&pass(&low, 1_000_003), 1_000_003).expect("a short reach");
        assert!(layout.block <= 1 << 16 && layout.step + 2 * layout.margin <= layout.block, "{layout:?}");
        // A reach of a third of the record: one block a little longer than the record, or none where that is smooth.
        let wide = [("lowpass", "0.08Hz")];
        let layout = Layout::of(&pass(&wide, 1_000_003), 1_000_003);
        assert!(layout.is_some_and(|l| l.step == 1_000_003 && l.block < 2_100_000), "{layout:?}");
        assert_eq!(Layout::of(&pass(&wide, 1_000_000), 1_000_000), None);
        assert_eq!(Layout::of(&pass(&[("integrate", "1")], 1_000_003), 1_000_003), None);
        assert_eq!(Layout::of(&pass(&[], 1_000_003), 1_000_003), None);
    }

    #[test]
    fn the_record_goes_on_as_its_ends_say() {
        let samples: Vec<f64> = (1..=5).map(f64::from).collect();
        for ends in Ends::all() {
            let record = Extended { samples: &samples, ends, split: None };
            for (first, len) in [(-7, 20), (-3, 2), (-3, 5), (2, 2), (4, 6), (6, 3)] {
                let mut block = vec![f64::NAN; len];
                record.lay(first, &mut block);
                let want: Vec<f64> = (first..first + len as i64)
                    .map(|n| ends.fold(5, n).map_or(0.0, |(source, sign)| sign * samples[source]))
                    .collect();
                assert_eq!(block, want, "{ends:?} from {first}");
            }
        }
    }
}
