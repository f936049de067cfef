//! How fast a channel's content is: the frequency below which 95 % of its power lies.

use realfft::RealFftPlanner;

use crate::numeric::sum::mean;

/// Length of the segments that are averaged.
const SEGMENT: usize = 4096;

/// Frequency in cycles per sample below which 95 % of the power about the mean lies. Hann-windowed segments, half
/// overlapped; missing values (NaN) are bridged by straight lines first. 0 for constant or very short channels.
pub fn edge_frequency(values: &[f64]) -> f64 {
    let bridged = bridged(values);
    let len = bridged.len().min(SEGMENT);
    if len < 8 {
        return 0.0;
    }
    let plan = RealFftPlanner::<f64>::new().plan_fft_forward(len);
    let (mut input, mut output) = (plan.make_input_vec(), plan.make_output_vec());
    let mut power = vec![0.0; output.len()];
    let starts = (0..=bridged.len() - len).step_by((len / 2).max(1));
    for start in starts {
        let segment = &bridged[start..start + len];
        let centre = mean(segment);
        for (n, (slot, value)) in input.iter_mut().zip(segment).enumerate() {
            let turn = 2.0 * std::f64::consts::PI * (n as f64 + 0.5) / len as f64;
            *slot = (value - centre) * (0.5 - 0.5 * turn.cos());
        }
        // The buffers come from the plan: their lengths fit.
        if plan.process(&mut input, &mut output).is_ok() {
            power.iter_mut().zip(&output).for_each(|(sum, line)| *sum += line.norm_sqr());
        }
    }
    let total: f64 = power.iter().sum();
    let mut below = 0.0;
    let edge = power.iter().position(|p| {
        below += p;
        below >= 0.95 * total
    });
    if total > 0.0 && total.is_finite() { edge.unwrap_or(power.len()) as f64 / len as f64 } else { 0.0 }
}

fn bridged(values: &[f64]) -> Vec<f64> {
    let mut result = values.to_vec();
    let mut last: Option<usize> = None;
    for n in 0..values.len() {
        if !values[n].is_finite() {
            continue;
        }
        let from = last.map_or(0, |l| l + 1);
        let start = last.map_or(values[n], |l| values[l]);
        let steps = (n + 1 - from) as f64;
        for k in from..n {
            result[k] = start + (values[n] - start) * (k + 1 - from) as f64 / steps;
        }
        last = Some(n);
    }
    let tail = last.map_or(0, |l| l + 1);
    let level = last.map_or(0.0, |l| values[l]);
    result[tail..].fill(level);
    result
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_tone_and_white_noise() {
        let mut tone: Vec<f64> =
            (0..20_000).map(|n| 3.0 + (f64::from(n) * std::f64::consts::TAU * 0.05).sin()).collect();
        assert!((edge_frequency(&tone) - 0.05).abs() < 2.0 / 4096.0);
        tone[500..503].fill(f64::NAN);
        assert!((edge_frequency(&tone) - 0.05).abs() < 2.0 / 4096.0);
        assert_eq!(edge_frequency(&[1.0; 100]), 0.0);
        assert_eq!(edge_frequency(&[f64::NAN; 100]), 0.0);
    }
}
