//! The fast transforms against the slow definition.

use endgrain::basis::direct::Definition;
use endgrain::ends::Ends;

use crate::{distance, forward, inverse, noise, norm, turned};

/// Every transform is at most three Fourier transforms deep (a prime length takes two of about twice its size), each
/// with an error of about eps log2(n) of the norm in the mean; the definition itself adds a few eps.
fn tolerance(len: usize) -> f64 {
    4.0 * f64::EPSILON * (2.0 + (len as f64).log2())
}

#[test]
fn every_short_length_and_some_primes() {
    for ends in Ends::all() {
        for len in (1..=64).chain([97, 127, 1009]) {
            let x = noise(len, len as u64);
            let basis = Definition::new(ends, len);
            // Samples on an even mirror come back with the square root of 2: at most sqrt(2) of the norm.
            let bound = 2_f64.sqrt() * tolerance(len) * norm(&x);
            let error = distance(&forward(ends, &x), &basis.forward(&x));
            assert!(error < bound, "{ends:?} {len}: forward {error:e}, bound {bound:e}");
            let error = distance(&inverse(ends, &x), &basis.inverse(&x));
            assert!(error < bound, "{ends:?} {len}: inverse {error:e}, bound {bound:e}");
            let error = distance(&turned(ends, &x), &basis.inverse_turned(&x));
            assert!(error < bound, "{ends:?} {len}: turned {error:e}, bound {bound:e}");
        }
    }
}

#[test]
fn long_records_at_some_coefficients() {
    // A short one, then smooth, odd, with a factor above 13 on one and on both sides of the grid, with a large prime
    // factor, prime.
    let few = [8192, 10_125, 81 * 127, 19 * 23 * 25, 2 * 20_011].map(|len| (len, 32));
    for (len, count) in [(4096, 256), (65_537, 256)].into_iter().chain(few) {
        let x = noise(len, 7);
        for ends in Ends::all() {
            let c = forward(ends, &x);
            let basis = Definition::new(ends, len);
            for i in 0..count {
                let k = i * (len - 1) / (count - 1);
                let error = (c[k] - basis.coefficient(&x, k)).abs();
                // The error is spread over all coefficients: one holds 1/sqrt(len) of the norm, 5 deviations.
                let bound = 5.0 * tolerance(len) * norm(&x) / (len as f64).sqrt();
                assert!(error < bound, "{ends:?} {len} {k}: {error:e}, bound {bound:e}");
            }
            let error = distance(&inverse(ends, &c), &x);
            assert!(error < 2.0 * 2_f64.sqrt() * tolerance(len) * norm(&x), "{ends:?} {len}: back {error:e}");
        }
    }
}
