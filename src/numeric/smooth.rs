//! Lengths without large prime factors, whose transforms are the fastest.

/// Whether no prime factor exceeds 13.
pub fn is_smooth(mut len: usize) -> bool {
    for radix in [2, 3, 5, 7, 11, 13] {
        while len > 0 && len.is_multiple_of(radix) {
            len /= radix;
        }
    }
    len == 1
}

/// The least length from `least` on without a prime factor above 13.
pub fn smooth_from(least: usize) -> usize {
    (least.max(1)..).find(|len| is_smooth(*len)).unwrap_or(least)
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn smooth_lengths_are_products_of_small_primes() {
        assert_eq!((smooth_from(0), smooth_from(1009)), (1, 1014));
        assert!(is_smooth(13 * 11 * 8) && !is_smooth(17) && !is_smooth(0));
    }
}
