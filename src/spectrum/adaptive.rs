//! Sine tapers by the record's own shape: many where the density is smooth, few at a sharp peak.

use super::density::Density;
use super::detrend::Detrend;
use super::taper::{MOST_TAPERS, Phasors, prepared};
use crate::basis::Planner;
use crate::error::{Error, Result};
use crate::numeric::sum;

/// Share of the number that balances bias and variance: half of it keeps the limits honest (bias counts against them).
const SHARE: f64 = 0.5;
/// Fewer tapers than this are never used: limits would be wide and their distribution doubtful.
const FEWEST_TAPERS: f64 = 3.0;
/// Shorter records give no pilot worth bending to.
const SHORTEST: usize = 64;

/// The density of `samples` at `rate` per second or metre by sine tapers, their number chosen line by line.
///
/// A pilot with sqrt(N)/2 tapers gives S''/S = (ln S)'' + ((ln S)')^2 from a quadratic through the lines about each; the
/// number is half of (12 N^2 |S/S''|)^(2/5), which balances bias and variance (Riedel and Sidorenko 1995), changing by at
/// most one from line to line.
///
/// # Errors
/// `Unsupported` for records of fewer than 64 samples.
pub fn adaptive(samples: &[f64], rate: f64, detrend: Detrend, planner: &Planner) -> Result<Density> {
    let len = samples.len();
    if len < SHORTEST {
        return Err(Error::unsupported(format!("{len} samples are too few to choose the number of tapers by"))
            .remedy("give the number, as in sine:3"));
    }
    let record = prepared(samples, detrend)?;
    let phasors = Phasors::of(&record, planner)?;
    let lines = phasors.lines();
    let pilot_count = ((len as f64).sqrt() / 2.0).round().clamp(FEWEST_TAPERS, f64::from(MOST_TAPERS)) as u32;
    let pilot = phasors.density(rate, &vec![pilot_count; lines]);
    let half = (pilot_count as usize).clamp(4, (lines / 2).saturating_sub(2).max(4));
    let most = f64::from(MOST_TAPERS).min((lines / 4) as f64).max(FEWEST_TAPERS);
    let mut counts: Vec<u32> = relative_curvature(&pilot.values, half)
        .into_iter()
        .map(|curvature| {
            // Lines stand 1/(N+1) apart: N^2 S'' by frequency is S'' by line.
            let balanced = (12.0 / curvature.max(f64::MIN_POSITIVE)).powf(0.4);
            (SHARE * balanced).clamp(FEWEST_TAPERS, most).round() as u32
        })
        .collect();
    for q in 1..lines {
        counts[q] = counts[q].min(counts[q - 1] + 1);
    }
    for q in (0..lines - 1).rev() {
        counts[q] = counts[q].min(counts[q + 1] + 1);
    }
    let mut density = phasors.density(rate, &counts);
    density.mean_square = sum::rms(&record).powi(2);
    Ok(density)
}

/// |S''/S| at every line from a quadratic fitted to ln S over `half` lines either side, reflected at both ends.
fn relative_curvature(values: &[f64], half: usize) -> Vec<f64> {
    let lines = values.len();
    // An exact zero (a silent channel) has no logarithm: the smallest positive number stands for it.
    let logarithms: Vec<f64> = values.iter().map(|v| v.max(f64::MIN_POSITIVE).ln()).collect();
    let at = |index: i64| {
        let last = lines as i64 - 1;
        let inside = index.rem_euclid((2 * last).max(1));
        logarithms[if inside > last { 2 * last - inside } else { inside } as usize]
    };
    let reach = half as i64;
    let count = (2 * half + 1) as f64;
    let squares: f64 = (-reach..=reach).map(|u| (u * u) as f64).sum();
    let fourths: f64 = (-reach..=reach).map(|u| (u * u * u * u) as f64).sum();
    let divisor = count * fourths - squares * squares;
    (0..lines as i64)
        .map(|line| {
            let (mut slope, mut bend) = (0.0, 0.0);
            for u in -reach..=reach {
                let value = at(line + u);
                slope += u as f64 * value;
                bend += ((u * u) as f64 * count - squares) * value;
            }
            let (slope, bend) = (slope / squares, 2.0 * bend / divisor);
            (bend + slope * slope).abs()
        })
        .collect()
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn the_curvature_of_an_exponential_is_found() {
        // ln S = 0.01 q - 0.0005 (q - 50)^2: S''/S = -0.001 + (0.01 - 0.001 (q - 50))^2.
        let values: Vec<f64> = (0..101).map(|q| (0.01 * q as f64 - 0.0005 * (q as f64 - 50.0).powi(2)).exp()).collect();
        let found = relative_curvature(&values, 6);
        for q in 10..90 {
            let expected: f64 = -0.001 + (0.01 - 0.001 * (q as f64 - 50.0)).powi(2);
            assert!((found[q] - expected.abs()).abs() < 1e-9, "{q}: {} {expected}", found[q]);
        }
    }

    #[test]
    fn silence_and_short_records_do_no_harm() {
        let silent = adaptive(&[0.0; 100], 10.0, Detrend::Mean, &Planner::new()).unwrap();
        assert!(silent.values.iter().all(|v| *v == 0.0));
        assert!(adaptive(&[0.0; 63], 10.0, Detrend::Mean, &Planner::new()).is_err());
    }
}
