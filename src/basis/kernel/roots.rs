//! Points on the unit circle to full accuracy, looked up from two short tables.

use crate::basis::angle;

/// exp(-2 pi i k / n) for 0 <= k < n.
pub fn root(k: u64, n: u64) -> [f64; 2] {
    let (cosine, sine) = angle::of_turns(k, n);
    [cosine, -sine]
}

/// All powers of exp(-2 pi i / n): w^k is the product of a coarse and a fine entry, about 2 sqrt(n) entries in all.
#[derive(Debug, Clone)]
pub struct Roots {
    shift: u32,
    coarse: Vec<[f64; 2]>,
    fine: Vec<[f64; 2]>,
}

impl Roots {
    /// Tables for the n-th roots of unity.
    pub fn new(n: u64) -> Self {
        let shift = (64 - n.leading_zeros()) / 2;
        let block = 1u64 << shift;
        Self {
            shift,
            coarse: (0..=n / block).map(|k| root((k * block) % n, n)).collect(),
            fine: (0..block).map(|k| root(k % n, n)).collect(),
        }
    }

    /// exp(-2 pi i k / n) for 0 <= k < n.
    #[inline(always)]
    pub fn at(&self, k: u64) -> [f64; 2] {
        let coarse = self.coarse[(k >> self.shift) as usize];
        let fine = self.fine[(k & ((1 << self.shift) - 1)) as usize];
        product(coarse, fine)
    }
}

/// Product of two complex numbers given as (real, imaginary).
#[inline(always)]
pub fn product(a: [f64; 2], b: [f64; 2]) -> [f64; 2] {
    [a[0] * b[0] - a[1] * b[1], a[0] * b[1] + a[1] * b[0]]
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn two_tables_agree_with_one_angle() {
        for n in [1u64, 2, 3, 100, 4_000_000, 4 * 1_234_567] {
            let roots = Roots::new(n);
            for k in (0..n).step_by((n as usize / 997).max(1)).chain([n - 1]) {
                let (got, want) = (roots.at(k), root(k, n));
                let far = (got[0] - want[0]).hypot(got[1] - want[1]);
                // Each entry within half a unit in the last place or so per part, and one complex product.
                assert!(far <= 4.0 * f64::EPSILON, "{k}/{n}: {far:e}");
            }
        }
    }
}
