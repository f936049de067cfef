//! How uncertain the output becomes towards an end when the continuation is only foretold: from the innovations.

use crate::baseline::Side;
use crate::forecast::Response;
use crate::numeric::autoregression::{Predictor, dot};

/// Output variance at distances 0..zone from the end, for innovations of the given variance. Every block outside adds one innovation, which goes on through
/// the autoregression and is seen through the operator: variance at i = E sum_k g(i + k)^2 with
/// g(i) = sum_m hb(i + m) psi(m), hb the impulse response summed over blocks and psi the response to one innovation.
pub(super) fn profile(
    predictor: &Predictor,
    variance: f64,
    response: &Response,
    side: Side,
    block: usize,
    steps: usize,
    zone: usize,
) -> Vec<f64> {
    let seen: Vec<f64> = (0..steps).map(|i| response.area(side, i * block + 1, (i + 1) * block + 1)).collect();
    let passed_on = predictor.impulse_response(steps);
    let mut tail = vec![0.0; steps + 1];
    for i in (0..steps).rev() {
        let g = dot(&seen[i..], &passed_on[..steps - i]);
        tail[i] = tail[i + 1] + g * g;
    }
    let at = |i: usize| variance * tail[i.min(steps)];
    (0..zone)
        .map(|j| {
            let (i, share) = (j / block, (j % block) as f64 / block as f64);
            at(i) + share * (at(i + 1) - at(i))
        })
        .collect()
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::forecast::Shape;
    use std::f64::consts::TAU;

    #[test]
    fn a_first_order_process_has_its_textbook_forecast_variance() {
        // k steps ahead: sigma^2 (1 - phi^2k)/(1 - phi^2) (Box and Jenkins 1976, section 5.1). Gain cos(w lag) takes half
        // of the sample `lag` steps away on each side, so at distance j the forecast k = lag - j steps ahead is seen.
        let (phi, sigma, lag) = (0.8_f64, 3.0, 10_usize);
        let gain = |f: f64| (TAU * f * lag as f64).cos();
        let response = Response::on_grid(Shape { gain: &gain, turns: 0, shortest_wavelength: 64.0 }, 256);
        let predictor = Predictor { weights: vec![phi] };
        let found = profile(&predictor, sigma * sigma, &response, Side::Left, 1, 32, 16);
        for (j, variance) in found.iter().enumerate() {
            let ahead = lag.saturating_sub(j) as i32;
            let expected = 0.25 * sigma * sigma * (1.0 - phi.powi(2 * ahead)) / (1.0 - phi * phi);
            assert!((variance - expected).abs() < 1e-12, "{j}: {variance} {expected}");
        }
    }

    #[test]
    fn blocks_count_as_what_they_hold() {
        // A mean over 16 samples seen from the end: half of it lies outside, in whole blocks of 2, 4 or 8; white blocks
        // of variance 1 add as the squares of their shares.
        let gain = |f: f64| if f == 0.0 { 1.0 } else { (TAU * f * 8.5).sin() / (17.0 * (TAU * f / 2.0).sin()) };
        let response = Response::on_grid(Shape { gain: &gain, turns: 0, shortest_wavelength: 64.0 }, 17 * 64);
        for block in [1, 2, 4, 8] {
            let white = Predictor { weights: Vec::new() };
            let found = profile(&white, 1.0, &response, Side::Right, block, 64 / block, 1);
            let expected = (8 / block) as f64 * (block as f64 / 17.0).powi(2);
            assert!((found[0] - expected).abs() < 1e-12, "{block}: {} {expected}", found[0]);
        }
    }
}
