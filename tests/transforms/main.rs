//! The transforms against published values, against their definition and against the properties they must have.

mod closed_forms;
mod decay;
mod definition;
mod extension;
mod properties;
mod series;
mod worked;

use endgrain::basis::{Plan, amplitude};
use endgrain::ends::{Ends, Seat};

const EVEN_WHOLE: Ends = Ends::EVEN.seated(Seat::Whole);
const ODD_WHOLE: Ends = Ends::ODD.seated(Seat::Whole);
const EVEN_ODD_WHOLE: Ends = Ends::EVEN_ODD.seated(Seat::Whole);
const ODD_EVEN_WHOLE: Ends = Ends::ODD_EVEN.seated(Seat::Whole);

fn forward(ends: Ends, x: &[f64]) -> Vec<f64> {
    run(ends, x, Plan::forward)
}

fn inverse(ends: Ends, c: &[f64]) -> Vec<f64> {
    run(ends, c, Plan::inverse)
}

fn turned(ends: Ends, c: &[f64]) -> Vec<f64> {
    run(ends, c, Plan::inverse_turned)
}

/// Lends scratch full of NaN: a result that depends on its contents is NaN as well.
fn run(ends: Ends, input: &[f64], transform: impl Fn(&Plan, &mut [f64], &mut [f64])) -> Vec<f64> {
    let plan = Plan::new(ends, input.len()).unwrap();
    let mut output = input.to_vec();
    transform(&plan, &mut output, &mut vec![f64::NAN; plan.scratch_len()]);
    output
}

/// Twice the plain sum, without the orthonormal factor: the convention of the FFTW manual, section 4.8, and of SciPy.
fn unnormalised(ends: Ends, x: &[f64]) -> Vec<f64> {
    forward(ends, x).iter().enumerate().map(|(k, c)| 2.0 * c / amplitude(ends, x.len(), k)).collect()
}

fn norm(x: &[f64]) -> f64 {
    x.iter().map(|v| v * v).sum::<f64>().sqrt()
}

fn distance(x: &[f64], y: &[f64]) -> f64 {
    assert_eq!(x.len(), y.len());
    x.iter().zip(y).map(|(a, b)| (a - b) * (a - b)).sum::<f64>().sqrt()
}

fn assert_close(found: &[f64], expected: &[f64], tolerance: f64, what: &str) {
    assert_eq!(found.len(), expected.len(), "{what}");
    for (i, (f, e)) in found.iter().zip(expected).enumerate() {
        assert!((f - e).abs() <= tolerance, "{what} [{i}]: {f} is not {e} within {tolerance:e}");
    }
}

/// Deterministic numbers between -1 and 1 (Marsaglia 2003, Xorshift RNGs, J. Statistical Software 8(14), triple 13, 7, 17).
fn noise(len: usize, seed: u64) -> Vec<f64> {
    let mut state = seed.wrapping_mul(0x9E37_79B9_7F4A_7C15) | 1;
    let mut next = || {
        state ^= state << 13;
        state ^= state >> 7;
        state ^= state << 17;
        state as f64 / u64::MAX as f64 * 2.0 - 1.0
    };
    (0..len).map(|_| next()).collect()
}
