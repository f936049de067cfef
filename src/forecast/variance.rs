//! How uncertain the output becomes towards an end when the continuation is only foretold: from the innovations.

use crate::forecast::Response;
use crate::forecast::member::Fits;
use crate::numeric::autoregression::dot;

/// Output variance at distances 0..zone from the end. Every block outside adds one innovation, which goes on through
/// the autoregression and is seen through the operator: variance at i = E sum_k g(i + k)^2 with
/// g(i) = sum_m hb(i + m) psi(m), hb the impulse response summed over blocks and psi the response to one innovation.
/// The innovation variance E is at least that of rounding to the quantisation step.
pub(super) fn profile(
    fits: &Fits,
    response: &Response,
    block: usize,
    steps: usize,
    zone: usize,
    quantum: f64,
) -> Vec<f64> {
    let (predictor, variance) = fits.innovations();
    let variance = variance.max(quantum * quantum / (12.0 * block as f64));
    let seen: Vec<f64> = (0..steps).map(|i| response.area(i * block + 1, (i + 1) * block + 1)).collect();
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
