//! The numbers that an output can hold: a restored sample is brought to one of them before any error is counted.

/// What restored samples are rounded to.
#[derive(Debug, Clone, Copy, PartialEq)]
pub enum Cast {
    /// Doubles: nothing changes.
    Double,
    /// Single-precision numbers.
    Single,
    /// Multiples of numerator / denominator: a converter's steps, or decimals of a text.
    Grid {
        /// Upper part of the step.
        numerator: f64,
        /// Lower part of the step.
        denominator: f64,
    },
}

impl Cast {
    /// The cast that all samples pass unchanged: single precision where the source stores it, the coarsest decimal or
    /// binary grid where all are on one, doubles otherwise.
    pub fn of(samples: &[f64], single: bool) -> Cast {
        if single && samples.iter().all(|v| f64::from(*v as f32) == *v) {
            return Cast::Single;
        }
        match denominator(samples, 0.0) {
            Some(denominator) => Cast::Grid { numerator: 1.0, denominator },
            None => Cast::Double,
        }
    }

    /// The nearest number that the output can hold.
    pub fn apply(self, sample: f64) -> f64 {
        match self {
            Cast::Double => sample,
            Cast::Single => f64::from(sample as f32),
            Cast::Grid { numerator, denominator } => {
                let steps = (sample * denominator / numerator + 0.5).floor();
                // A zero without a sign: the grid has only one.
                steps * numerator / denominator + 0.0
            }
        }
    }

    /// The bound that holds after the cast where the given one holds before it, for samples that the cast leaves alone:
    /// on a grid of step d an error below (k + 1/2) d rounds to at most k d.
    pub fn widened(self, bound: f64, largest: f64) -> f64 {
        match self {
            Cast::Double => bound,
            Cast::Single => (bound - largest * f64::from(f32::EPSILON)).max(bound * 0.5),
            Cast::Grid { .. } => (self.steps(bound) as f64 + 0.5) * self.step().unwrap_or(0.0),
        }
    }

    /// The step of a grid.
    pub fn step(self) -> Option<f64> {
        match self {
            Cast::Grid { numerator, denominator } => Some(numerator / denominator),
            _ => None,
        }
    }

    /// Whole steps of the grid within a bound; a bound written in decimals counts as what it stands for.
    pub fn steps(self, bound: f64) -> u64 {
        self.step().map_or(0, |step| (bound / step * (1.0 + 4.0 * f64::EPSILON)).floor().min(9e15) as u64)
    }
}

/// The least power of ten or of two for which all but a share of the samples are whole multiples of its reciprocal.
pub fn denominator(samples: &[f64], share: f64) -> Option<f64> {
    let tens = (0..=15).map(|p| 10_f64.powi(p));
    let twos = (1..=52).map(|p| 2_f64.powi(p));
    let mut all: Vec<f64> = tens.chain(twos).collect();
    all.sort_by(f64::total_cmp);
    let allowed = (samples.len() as f64 * share) as usize;
    all.into_iter().find(|denominator| samples.iter().filter(|v| !on_grid(**v, *denominator)).nth(allowed).is_none())
}

/// True for whole multiples of 1 / denominator.
pub fn on_grid(sample: f64, denominator: f64) -> bool {
    let k = (sample * denominator).round();
    k.abs() < 9_007_199_254_740_992.0 && k / denominator == sample
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn decimals_and_converter_steps_are_found() {
        let decimals: Vec<f64> = (-300..300).map(|k| f64::from(k) / 1000.0).collect();
        assert_eq!(Cast::of(&decimals, false), Cast::Grid { numerator: 1.0, denominator: 1000.0 });
        let converter: Vec<f64> = (-300..300).map(|k| f64::from(k) / 32768.0).collect();
        assert_eq!(Cast::of(&converter, false), Cast::Grid { numerator: 1.0, denominator: 32768.0 });
        // 0.1 + 0.2 takes 17 decimals to write: no grid of integers below 2^53 holds it.
        assert_eq!(Cast::of(&[0.1, 0.3, 0.1 + 0.2], false), Cast::Double);
    }

    #[test]
    fn a_widened_bound_holds_after_the_cast() {
        let cast = Cast::Grid { numerator: 1.0, denominator: 1000.0 };
        // Two steps of 0.001 are within 0.002, although 0.002 / 0.001 may come out just below two.
        assert_eq!(cast.steps(0.002), 2);
        let wide = cast.widened(0.002, 1.0);
        for part in -999..1000 {
            let off = wide * (1.0 - 1e-9) * f64::from(part) / 999.0;
            assert!((cast.apply(0.123 + off) - 0.123).abs() <= 0.002 + 1e-15, "{part}");
        }
    }
}
