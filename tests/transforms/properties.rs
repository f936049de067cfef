//! What must hold for every record.

use endgrain::basis::{Plan, Planner};
use endgrain::ends::Ends;
use proptest::prelude::*;

use crate::{distance, forward, inverse, noise, norm, turned};

/// Two transforms of log2(n) stages each, a few roundings a stage.
fn tolerance(len: usize) -> f64 {
    8.0 * f64::EPSILON * (2.0 + (len as f64).log2())
}

fn ends() -> impl Strategy<Value = Ends> {
    (0..9_usize).prop_map(|which| Ends::all().nth(which).unwrap())
}

fn record() -> impl Strategy<Value = Vec<f64>> {
    prop::collection::vec(-1e3..1e3, 1..200)
}

fn weighted(ends: Ends, x: &[f64], y: &[f64]) -> f64 {
    (0..x.len()).map(|n| ends.weight(x.len(), n) * x[n] * y[n]).sum()
}

proptest! {
    #[test]
    fn inner_products_are_kept(ends in ends(), pair in prop::collection::vec((-1.0..1.0, -1.0..1.0), 1..200)) {
        let (x, y): (Vec<f64>, Vec<f64>) = pair.into_iter().unzip();
        let (a, b) = (forward(ends, &x), forward(ends, &y));
        let product: f64 = a.iter().zip(&b).map(|(a, b)| a * b).sum();
        let bound = tolerance(x.len()) * norm(&x) * norm(&y);
        prop_assert!((product - weighted(ends, &x, &y)).abs() <= bound);
        // Parseval.
        let energy: f64 = a.iter().map(|a| a * a).sum();
        prop_assert!((energy - weighted(ends, &x, &x)).abs() <= tolerance(x.len()) * norm(&x) * norm(&x));
    }

    #[test]
    fn forward_and_inverse_undo_each_other(ends in ends(), x in record()) {
        let bound = 2.0 * tolerance(x.len()) * norm(&x);
        prop_assert!(distance(&inverse(ends, &forward(ends, &x)), &x) <= bound);
        prop_assert!(distance(&forward(ends, &inverse(ends, &x)), &x) <= bound);
    }

    #[test]
    fn time_reversal_swaps_the_ends(ends in ends(), x in record()) {
        let backwards: Vec<f64> = x.iter().rev().copied().collect();
        let (c, mut r) = (forward(ends, &x), forward(ends.reversed(), &backwards));
        if ends == Ends::Periodic {
            // Sample 0 moves to the end: phases turn, the size of each pair stays.
            let pairs = |c: &[f64]| -> Vec<f64> {
                std::iter::once(c[0].abs()).chain(c[1..].chunks(2).map(norm)).collect()
            };
            prop_assert!(distance(&pairs(&c), &pairs(&r)) <= tolerance(x.len()) * norm(&x));
        } else {
            // About the middle, basis functions are even and odd in turn.
            r.iter_mut().skip(1).step_by(2).for_each(|v| *v = -*v);
            prop_assert!(distance(&c, &r) <= tolerance(x.len()) * norm(&x));
        }
    }

    /// sin and cos at one angle: the squares of a function and of its quarter turn add to A_k^2 on every sample.
    #[test]
    fn a_function_and_its_quarter_turn_complete_a_circle(ends in ends(), len in 1..60_usize, seed in any::<prop::sample::Index>()) {
        let k = seed.index(len);
        let is_flat_periodic = ends == Ends::Periodic && (k == 0 || (len % 2 == 0 && k == len - 1));
        let mut unit = vec![0.0; len];
        unit[k] = 1.0;
        let square = endgrain::basis::amplitude(ends, len, k).powi(2);
        for (value, turned) in inverse(ends, &unit).into_iter().zip(turned(ends, &unit)) {
            prop_assert!((value * value + turned * turned - square).abs() <= 2.0 * tolerance(len), "{ends:?} {len} {k}");
            prop_assert!(!is_flat_periodic || turned == 0.0);
        }
    }
}

#[test]
fn longer_scratch_changes_nothing() {
    for ends in Ends::all() {
        for len in [1, 2, 3, 30, 31] {
            let plan = Planner::new().plan(ends, len).unwrap();
            let x = noise(len, 5);
            let mut y = x.clone();
            plan.forward(&mut y, &mut vec![f64::NAN; plan.scratch_len() + 3]);
            assert_eq!(y, forward(ends, &x), "{ends:?} {len}");
        }
    }
}

#[test]
#[should_panic(expected = "numbers of scratch was lent")]
fn too_little_scratch_is_a_programming_error() {
    let plan = Plan::new(Ends::EVEN, 10).unwrap();
    let mut scratch = vec![0.0; plan.scratch_len() - 1];
    plan.forward(&mut [0.0; 10], &mut scratch);
}

#[test]
#[should_panic(expected = "a plan for 10 samples was given 9")]
fn another_length_is_a_programming_error() {
    let plan = Plan::new(Ends::EVEN, 10).unwrap();
    plan.forward(&mut [0.0; 9], &mut vec![0.0; plan.scratch_len()]);
}
