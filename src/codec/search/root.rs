//! The largest step whose error stays below a target.

/// Mean of the squared differences.
pub fn mean_square(samples: &[f64], others: &[f64]) -> f64 {
    let sum: f64 = samples.iter().zip(others).map(|(a, b)| (a - b) * (a - b)).sum();
    sum / samples.len().max(1) as f64
}

/// A step, what was made with it, and its error.
type Tried<T> = (f64, T, f64);

/// Looks for the largest step whose error (which grows about as the step does) is at most `target`: within `close` of it,
/// or as near as `rounds` tries come. `None` where no step tried kept the target.
pub fn largest<T>(
    start: f64,
    target: f64,
    close: f64,
    rounds: usize,
    mut make: impl FnMut(f64) -> (T, f64),
) -> Option<Tried<T>> {
    let mut best: Option<Tried<T>> = None;
    let mut beyond: Option<(f64, f64)> = None;
    let mut step = start;
    for _ in 0..rounds {
        if !(step.is_finite() && step > 0.0) {
            break;
        }
        let (made, error) = make(step);
        if error <= target {
            let done = error >= target * (1.0 - close);
            best = Some((step, made, error));
            if done {
                break;
            }
        } else {
            beyond = Some((step, error));
        }
        step = match (&best, beyond) {
            (Some((low, _, e_low)), Some((high, e_high))) => {
                if high / low < 1.0 + close / 8.0 {
                    break;
                }
                // By the chord in logarithms, kept off the ends.
                let share = ((target * (1.0 - close / 2.0)).ln() - e_low.ln()) / (e_high.ln() - e_low.ln());
                let share = if share.is_finite() { share.clamp(0.05, 0.95) } else { 0.5 };
                low * (high / low).powf(share)
            }
            (Some((low, _, e_low)), None) => low * ((target / e_low).min(64.0) * (1.0 - close / 2.0)).clamp(1.02, 4.0),
            (None, Some((high, e_high))) => high * (target / e_high * (1.0 - close / 2.0)).clamp(0.01, 0.99),
            (None, None) => break,
        };
    }
    best
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_known_law_is_inverted() {
        // error = step / sqrt(12) up to 3, constant beyond: the root lies at sqrt(12).
        let (step, (), error) = largest(0.1, 1.0, 1e-3, 20, |step| ((), (step / 12f64.sqrt()).min(3.0))).unwrap();
        assert!(step <= 12f64.sqrt() && step > 12f64.sqrt() * 0.999, "{step} {error}");
        assert!(largest(1.0, 1.0, 1e-3, 20, |_| ((), 2.0)).is_none());
    }
}
