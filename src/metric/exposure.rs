//! Exposure figures of a weighted acceleration: running RMS and its maximum, vibration dose value, motion sickness dose.
//!
//! ISO 2631-1:1997, 6.1 (weighted RMS), 6.3.1 (running RMS, maximum transient vibration value), 6.3.2 (fourth power dose),
//! 9.3 (motion sickness dose). Estimates from one record: not an instrument in the sense of ISO 8041-1.

use serde::Serialize;

use crate::numeric::sum;
use crate::record::Axis;
use crate::unit::Unit;

/// Exposure figures of one weighted channel, in m/s2 and powers of it where the channel is an acceleration, otherwise in its
/// own unit.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct Exposure {
    /// Name of the weighting.
    pub weighting: &'static str,
    /// Unit of the accelerations below: `m/s2`, or the channel's own where that is no acceleration.
    pub unit: Unit,
    /// Length of the record, in s.
    pub duration_s: f64,
    /// Weighted RMS over the whole record.
    pub rms: f64,
    /// Integration time of the running RMS, in s.
    pub running_s: f64,
    /// Maximum transient vibration value: the largest running RMS; null for a record shorter than its integration time.
    pub mtvv: Option<f64>,
    /// Stamp at which the running RMS is largest, in the unit of the axis.
    pub mtvv_at: Option<f64>,
    /// Vibration dose value, in unit s^(1/4).
    pub vdv: f64,
    /// Motion sickness dose value, in unit s^(1/2): for Wf alone.
    pub msdv: Option<f64>,
    /// Peak over RMS.
    pub crest: Option<f64>,
    /// MTVV over RMS: above 1.5 the basic method may underrate (ISO 2631-1:1997, 6.3.3).
    pub mtvv_ratio: Option<f64>,
    /// VDV over RMS times the fourth root of the duration: above 1.75 the basic method may underrate.
    pub vdv_ratio: Option<f64>,
}

impl Exposure {
    /// From the weighted samples of a channel in `unit` on a time axis, with a running RMS over `running_s` seconds.
    pub fn of(samples: &[f64], unit: &Unit, axis: &Axis, weighting: &'static str, running_s: f64) -> Exposure {
        let acceleration = unit.meaning().filter(|m| (m.length, m.time) == (1, -2));
        let factor = acceleration.map_or(1.0, |m| m.scale);
        let step_s = axis.step_base();
        let duration_s = samples.len() as f64 * step_s;
        let rms = factor * sum::rms(samples);
        let running = running_rms(samples, window(running_s, step_s));
        let largest =
            running.iter().enumerate().filter_map(|(n, v)| v.map(|v| (n, v))).max_by(|a, b| a.1.total_cmp(&b.1));
        let mtvv = largest.map(|(_, v)| factor * v);
        let fourth: Vec<f64> = samples.iter().map(|v| (factor * v).powi(4)).collect();
        let vdv = (sum::sum(&fourth) * step_s).powf(0.25);
        let peak = factor * samples.iter().map(|v| v.abs()).fold(0.0, f64::max);
        let over = |value: f64, base: f64| (base > 0.0).then(|| value / base);
        Exposure {
            weighting,
            unit: if acceleration.is_some() { Unit::parse("m/s2") } else { unit.clone() },
            duration_s,
            rms,
            running_s,
            mtvv,
            mtvv_at: largest.map(|(n, _)| axis.stamp(n)),
            vdv,
            msdv: (weighting == "Wf").then(|| rms * duration_s.sqrt()),
            crest: over(peak, rms),
            mtvv_ratio: mtvv.and_then(|mtvv| over(mtvv, rms)),
            vdv_ratio: over(vdv, rms * duration_s.powf(0.25)),
        }
    }
}

/// Samples of an integration time, at least 1.
pub fn window(running_s: f64, step_s: f64) -> usize {
    (running_s / step_s).round().max(1.0) as usize
}

/// RMS over the `window` samples up to and including each one; `None` where the record has not lasted that long. Sums run
/// within blocks of one window, so that a quiet stretch after a loud one keeps its digits. O(n).
pub fn running_rms(samples: &[f64], window: usize) -> Vec<Option<f64>> {
    let window = window.max(1);
    // Sums from each sample to the end of its block, and from the start of its block to each sample.
    let mut to_end: Vec<f64> = samples.iter().map(|v| v * v).collect();
    for n in (0..samples.len().saturating_sub(1)).rev() {
        if (n + 1) % window != 0 {
            to_end[n] += to_end[n + 1];
        }
    }
    let mut from_start = 0.0;
    (0..samples.len())
        .map(|n| {
            from_start = if n % window == 0 { 0.0 } else { from_start } + samples[n] * samples[n];
            let first = (n + 1).checked_sub(window)?;
            let before = if first % window == 0 { 0.0 } else { to_end[first] };
            Some(((before + from_start) / window as f64).sqrt())
        })
        .collect()
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::record::RateSource;

    #[test]
    fn running_rms_is_that_of_every_window_by_itself() {
        let x: Vec<f64> = (0..97).map(|n| (1.7 * n as f64).sin() * if n < 30 { 1e6 } else { 1.0 }).collect();
        for window in [1, 2, 7, 30, 97, 98] {
            for (n, found) in running_rms(&x, window).into_iter().enumerate() {
                let direct = (n + 1 >= window).then(|| sum::rms(&x[n + 1 - window..=n]));
                match (found, direct) {
                    (Some(a), Some(b)) => assert!((a - b).abs() <= 1e-13 * b, "{window} {n}: {a} {b}"),
                    (a, b) => assert_eq!(a, b, "{window} {n}"),
                }
            }
        }
    }

    #[test]
    fn a_steady_wave_and_a_burst_have_their_closed_figures() {
        // a sin w t over whole cycles: RMS a/sqrt 2, fourth power mean 3 a^4/8, so VDV = a (3 T/8)^(1/4).
        let axis = Axis::from_rate_hz(1000.0, 10_000, RateSource::Given).unwrap();
        let wave: Vec<f64> = (0..10_000).map(|n| 2.0 * (std::f64::consts::TAU * 0.008 * n as f64).sin()).collect();
        let found = Exposure::of(&wave, &Unit::parse("m/s2"), &axis, "Wk", 1.0);
        assert!((found.rms - 2.0_f64.sqrt()).abs() < 1e-12 && (found.mtvv.unwrap() - found.rms).abs() < 1e-12);
        assert!((found.vdv - 2.0 * (3.0_f64 * 10.0 / 8.0).powf(0.25)).abs() < 1e-12);
        // The sample nearest the crest lies a quarter of a step beside it.
        let highest = (std::f64::consts::TAU * 0.002).cos();
        assert!((found.crest.unwrap() - 2.0_f64.sqrt() * highest).abs() < 1e-12 && found.msdv.is_none());
        // The same for 1 s out of 10: the running RMS is largest where the burst ends.
        let burst: Vec<f64> =
            wave.iter().enumerate().map(|(n, v)| if (3000..4000).contains(&n) { *v } else { 0.0 }).collect();
        let found = Exposure::of(&burst, &Unit::parse("g"), &axis, "Wf", 1.0);
        let g = crate::unit::STANDARD_GRAVITY;
        // The burst begins with a zero: with and without it the window holds the same.
        assert!((found.mtvv.unwrap() - g * 2.0_f64.sqrt()).abs() < 1e-10);
        assert!(found.mtvv_at.is_some_and(|at| (3.999..=4.0).contains(&at)), "{found:?}");
        assert!((found.rms - g * 0.2_f64.sqrt()).abs() < 1e-10);
        assert!((found.msdv.unwrap() - g * 2.0_f64.sqrt()).abs() < 1e-10);
        assert!((found.mtvv_ratio.unwrap() - 10.0_f64.sqrt()).abs() < 1e-10);
        // A record shorter than the integration time has no maximum; silence has no ratios.
        let short = Exposure::of(&[0.0; 10], &Unit::unknown(), &axis, "Wk", 1.0);
        assert_eq!((short.mtvv, short.crest, short.vdv_ratio), (None, None, None));
    }
}
