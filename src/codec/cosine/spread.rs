//! How large the coefficients around each one are: what decides bits before anything is coded.

/// The mean magnitude around each coefficient: itself and its neighbours, the nearer the heavier (a decaying average from
/// either side).
pub fn around(coefficients: &[f64]) -> Vec<f64> {
    const SHARE: f64 = 0.12;
    let mut out = vec![0.0; coefficients.len()];
    let mut average = coefficients.iter().take(4).map(|c| c.abs()).sum::<f64>() / 4.0;
    for (k, c) in coefficients.iter().enumerate() {
        average += (c.abs() - average) * SHARE;
        out[k] = average;
    }
    average = coefficients.iter().rev().take(4).map(|c| c.abs()).sum::<f64>() / 4.0;
    for (k, c) in coefficients.iter().enumerate().rev() {
        // Before this one is taken in: it counts once.
        out[k] = 0.5 * (out[k] + average);
        average += (c.abs() - average) * SHARE;
    }
    out
}

/// Bits that coefficients of these mean magnitudes would take with a step: a smooth stand-in for the coder.
pub fn bits(spread: &[f64], step: f64) -> f64 {
    // A geometric law of mean m (in steps) has an entropy of about log2(e (2 m + ...)): half of log2(1 + (c m)^2) is within
    // 0.1 bit of it from m = 0.02 up, with c = 4.5.
    spread.iter().map(|m| 0.5 * (1.0 + (4.5 * m / step) * (4.5 * m / step)).log2()).sum()
}
