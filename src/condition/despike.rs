//! Spikes taken out of a channel: found by the audit's rule, filled in from their neighbours.

use crate::audit::quantisation::Quantisation;
use crate::audit::spike;
use crate::error::Result;
use crate::place::Place;
use crate::regularise;

/// A channel without its spikes.
#[derive(Debug, Clone, PartialEq)]
pub struct Despiked {
    /// The samples, spikes replaced.
    pub samples: Vec<f64>,
    /// Which samples were replaced, ascending.
    pub spikes: Vec<usize>,
    /// What replaced them: `cubic spline`, `autoregressive model` or both.
    pub how: String,
    /// Largest change of a sample.
    pub largest: f64,
}

/// Replaces the spikes of a channel by what fills a gap of one sample; `None` where there are none.
///
/// # Errors
/// `Unsupported` where a spike cannot be filled in.
pub fn despike(samples: &[f64]) -> Result<Option<Despiked>> {
    let mut sorted = samples.to_vec();
    sorted.sort_unstable_by(f64::total_cmp);
    let spikes = spike::find(samples, Quantisation::of(&sorted).floor());
    if spikes.is_empty() {
        return Ok(None);
    }
    let mut open = samples.to_vec();
    for &n in &spikes {
        open[n] = f64::NAN;
    }
    let (filled, how) = regularise::fill_gaps(open).map_err(|(sample, error)| {
        error.at(Place { sample: Some(sample as u64), ..Place::default() }).remedy("leave --despike out")
    })?;
    let change = |&n: &usize| (filled[n] - samples[n]).abs();
    let largest = spikes.iter().map(change).fold(0.0, f64::max);
    Ok(Some(Despiked { samples: filled, spikes, how, largest }))
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_spike_becomes_what_the_wave_was() {
        let wave: Vec<f64> = (0..400).map(|n| (0.11 * n as f64).sin() + 0.3 * (0.29 * n as f64).cos()).collect();
        let mut spiked = wave.clone();
        spiked[100] += 3.0;
        spiked[250] -= 2.0;
        let found = despike(&spiked).unwrap().expect("spikes");
        assert_eq!(found.spikes, [100, 250]);
        assert!((found.largest - 3.0).abs() < 1e-3);
        for (n, (a, b)) in found.samples.iter().zip(&wave).enumerate() {
            let tolerance = if n == 100 || n == 250 { 1e-3 } else { 0.0 };
            assert!((a - b).abs() <= tolerance, "{n}: {a} {b}");
        }
        assert_eq!(despike(&wave).unwrap(), None);
        assert_eq!(despike(&[1.0]).unwrap(), None);
    }
}
