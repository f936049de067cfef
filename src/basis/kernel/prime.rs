//! Real Fourier transforms of a prime number of points by two real convolutions.
//!
//! Rader 1968, Proc. IEEE 56, 1107: with a primitive root g, the numbers 1..P are the powers of g, and the transform is a
//! convolution with b_m = exp(-2 pi i g^-m / P) over the exponents. Since g^h = -1 for h = (P - 1)/2, Re b has the period h
//! and Im b the antiperiod h: for real samples two real convolutions of h points are left, one with the sums of
//! samples P/2 exponents apart and one with their differences. Both are done without wrapping, in a smooth length.

use super::convolution::Convolution;
use super::grid::{height, primes};
use super::roots::Roots;
use crate::numeric::smooth::smooth_from;

/// Points of a convolution from which two threads are worth it.
const PARALLEL: usize = 1 << 17;

/// A plan for P points, P an odd prime.
pub struct PrimeTransform {
    prime: usize,
    /// g^q modulo P for q < P - 1.
    powers: Vec<u32>,
    convolution: Convolution,
    cosines: Vec<f64>,
    sines: Vec<f64>,
}

impl PrimeTransform {
    /// A plan, or none where `prime` is too short for a grid or too long for the table of powers.
    pub fn new(prime: usize) -> Option<Self> {
        let modulus = u64::from(u32::try_from(prime).ok()?);
        let half = prime / 2;
        let mut len = smooth_from(2 * half - 1);
        let height = loop {
            match height(len) {
                Some(height) => break height,
                None if len < 4 * prime => len = smooth_from(len + 1),
                None => return None,
            }
        };
        let convolution = Convolution::new(height, len / height);
        let root = primitive_root(modulus);
        let powers: Vec<u32> =
            std::iter::successors(Some(1), |g| Some(g * root % modulus)).take(prime - 1).map(|g| g as u32).collect();
        let roots = Roots::new(modulus);
        let (mut cosines, mut sines) = (vec![0.0; len], vec![0.0; len]);
        for m in 0..half {
            // g^-m is g^(P-1-m).
            let [c, s] = roots.at(u64::from(powers[(prime - 1 - m) % (prime - 1)]));
            (cosines[m], sines[m]) = (c, s);
            if m > 0 {
                (cosines[len - half + m], sines[len - half + m]) = (c, -s);
            }
        }
        let (cosines, sines) = (convolution.kernel(&cosines), convolution.kernel(&sines));
        Some(Self { prime, powers, convolution, cosines, sines })
    }

    /// Entries of the spectrum: k = 0..=(P-1)/2.
    pub fn spectrum_len(&self) -> usize {
        self.prime / 2 + 1
    }

    /// Numbers of scratch that a transform needs.
    pub fn scratch_len(&self) -> usize {
        2 * (self.convolution.len() + self.convolution.scratch_len())
    }

    /// X_k = sum_n x_n exp(-2 pi i k n / P), unscaled.
    pub fn forward(&self, x: impl Fn(usize) -> f64, re: &mut [f64], im: &mut [f64], scratch: &mut [f64]) {
        let half = self.prime / 2;
        let (sums, gaps, work) = self.lend(scratch);
        let first = x(0);
        let mut total = first;
        for q in 0..half {
            let (a, b) = (x(self.powers[q] as usize), x(self.powers[q + half] as usize));
            (sums[q], gaps[q]) = (a + b, a - b);
            total += a + b;
        }
        self.convolve(sums, gaps, work);
        (re[0], im[0]) = (total, 0.0);
        for r in 0..half {
            let (k, sign) = self.entry(r);
            (re[k], im[k]) = (first + sums[r], sign * gaps[r]);
        }
    }

    /// x_n = Re X_0 + 2 sum_(k>0) Re(X_k exp(2 pi i k n / P)), that is P times the samples of that spectrum.
    pub fn inverse(&self, re: &[f64], im: &[f64], mut x: impl FnMut(usize, f64), scratch: &mut [f64]) {
        let half = self.prime / 2;
        let (evens, odds, work) = self.lend(scratch);
        let mut total = 0.0;
        for r in 0..half {
            let (k, sign) = self.entry_of_power(r);
            (evens[r], odds[r]) = (re[k], sign * im[k]);
            total += re[k];
        }
        self.convolve(evens, odds, work);
        x(0, re[0] + 2.0 * total);
        for q in 0..half {
            let (a, b) = (2.0 * evens[q], 2.0 * odds[q]);
            x(self.powers[(self.prime - 1 - q) % (self.prime - 1)] as usize, re[0] + a + b);
            x(self.powers[half - q] as usize, re[0] + a - b);
        }
    }

    /// Where entry g^-r of the spectrum stands: at k or, conjugated, at P - k.
    fn entry(&self, r: usize) -> (usize, f64) {
        self.entry_of_power((self.prime - 1 - r) % (self.prime - 1))
    }

    fn entry_of_power(&self, r: usize) -> (usize, f64) {
        let k = self.powers[r] as usize;
        if k <= self.prime / 2 { (k, 1.0) } else { (self.prime - k, -1.0) }
    }

    fn convolve(&self, one: &mut [f64], two: &mut [f64], work: &mut [f64]) {
        one[self.prime / 2..].fill(0.0);
        two[self.prime / 2..].fill(0.0);
        let (work, more) = work.split_at_mut(self.convolution.scratch_len());
        // The two do not touch each other; short ones are done before another thread has taken one up.
        if self.convolution.len() < PARALLEL {
            self.convolution.apply(one, &self.cosines, work);
            self.convolution.apply(two, &self.sines, more);
        } else {
            rayon::join(
                || self.convolution.apply(one, &self.cosines, work),
                || self.convolution.apply(two, &self.sines, more),
            );
        }
    }

    fn lend<'a>(&self, scratch: &'a mut [f64]) -> (&'a mut [f64], &'a mut [f64], &'a mut [f64]) {
        let len = self.convolution.len();
        let (one, rest) = scratch.split_at_mut(len);
        let (two, work) = rest.split_at_mut(len);
        (one, two, work)
    }
}

/// The least number whose powers are all of 1..prime.
fn primitive_root(prime: u64) -> u64 {
    let factors = primes(prime as usize - 1);
    let generates = |g: &u64| factors.iter().all(|f| power(*g, (prime - 1) / *f as u64, prime) != 1);
    (2..prime).find(generates).unwrap_or(1)
}

fn power(base: u64, mut exponent: u64, modulus: u64) -> u64 {
    let (mut result, mut square) = (1, base % modulus);
    while exponent > 0 {
        if exponent % 2 == 1 {
            result = result * square % modulus;
        }
        square = square * square % modulus;
        exponent /= 2;
    }
    result
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::basis::kernel::roots::root;

    #[test]
    fn prime_lengths_meet_the_definition_and_come_back() {
        for prime in [257usize, 1009, 2003] {
            let plan = PrimeTransform::new(prime).expect("long enough for a grid");
            let x: Vec<f64> = (0..prime).map(|n| ((n * n + 3) % 101) as f64 / 101.0 - 0.4).collect();
            let norm = x.iter().map(|v| v * v).sum::<f64>().sqrt();
            let (mut re, mut im) = (vec![f64::NAN; plan.spectrum_len()], vec![f64::NAN; plan.spectrum_len()]);
            let mut scratch = vec![f64::NAN; plan.scratch_len()];
            plan.forward(|n| x[n], &mut re, &mut im, &mut scratch);
            for k in [0, 1, 2, prime / 3, prime / 2] {
                let (mut a, mut b) = (0.0, 0.0);
                for (n, v) in x.iter().enumerate() {
                    let [c, s] = root((k * n) as u64, prime as u64);
                    (a, b) = (a + v * c, b + v * s);
                }
                // Two transforms and the sum above: some log2(P) roundings of a norm of sqrt(P) |x|.
                let bound = 16.0 * f64::EPSILON * (prime as f64).sqrt() * norm;
                assert!((a - re[k]).abs() < bound && (b - im[k]).abs() < bound, "{prime}, {k}");
            }
            let mut back = vec![f64::NAN; prime];
            plan.inverse(&re, &im, |n, v| back[n] = v / prime as f64, &mut scratch);
            let far = x.iter().zip(&back).map(|(a, b)| (a - b) * (a - b)).sum::<f64>().sqrt();
            assert!(far < 16.0 * f64::EPSILON * norm, "{prime}: {far:e} of {norm}");
        }
    }

    #[test]
    fn roots_are_primitive() {
        // Least primitive roots, OEIS A001918 (values from memory).
        assert_eq!([3u64, 5, 7, 11, 13, 17, 41, 71].map(primitive_root), [2, 2, 3, 2, 2, 3, 6, 7]);
    }
}
