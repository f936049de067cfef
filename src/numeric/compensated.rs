//! A running sum that keeps what rounding drops.

/// Neumaier's compensated sum (1974, Zeitschrift für Angewandte Mathematik und Mechanik 54, 39): the error stays near one rounding of
/// the result plus n eps^2 times the sum of magnitudes, whatever the order of the terms.
#[derive(Debug, Clone, Copy, Default)]
pub struct Compensated {
    sum: f64,
    dropped: f64,
}

impl Compensated {
    /// Adds a term.
    pub fn add(&mut self, term: f64) {
        let next = self.sum + term;
        let (larger, smaller) = if self.sum.abs() >= term.abs() { (self.sum, term) } else { (term, self.sum) };
        self.dropped += (larger - next) + smaller;
        self.sum = next;
    }

    /// The sum so far.
    pub fn value(self) -> f64 {
        self.sum + self.dropped
    }
}

impl FromIterator<f64> for Compensated {
    fn from_iter<I: IntoIterator<Item = f64>>(terms: I) -> Self {
        let mut sum = Self::default();
        terms.into_iter().for_each(|term| sum.add(term));
        sum
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_small_term_between_two_large_ones_is_kept() {
        // A plain sum gives 0.
        assert_eq!([1.0, 1e100, 1.0, -1e100].into_iter().collect::<Compensated>().value(), 2.0);
    }
}
