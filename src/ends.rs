//! How the record goes on past its two ends, and what follows from it: mirrors, length, frequencies, sample positions.
//!
//! | ends (left, right) | half-sample seat: forward / inverse; f_k | whole-sample seat: forward / inverse; L; f_k; half-weight samples |
//! |---|---|---|
//! | periodic | real DFT; k/(N h) | the same |
//! | even, even | DCT-II / DCT-III; k/(2L) | DCT-I / DCT-I; L = (N-1)h; k/(2L); both ends |
//! | odd, odd | DST-II / DST-III; (k+1)/(2L) | DST-I / DST-I; L = (N+1)h; (k+1)/(2L); none |
//! | even, odd | DCT-IV / DCT-IV; (k+1/2)/(2L) | DCT-III / DCT-II; L = N h; (k+1/2)/(2L); sample 0 |
//! | odd, even | DST-IV / DST-IV; (k+1/2)/(2L) | DST-III / DST-II; L = N h; (k+1/2)/(2L); sample N-1 |
//!
//! On the half-sample seat x_n = (n + 1/2) h and L = N h: the mirrors stand half a step outside the end samples. On the
//! whole-sample seat an even mirror stands on the end sample (weight 1/2, since its neighbours count twice and it counts
//! once) and an odd mirror on the missing neighbour; x = 0 is the left mirror. Seats are not mixed.
//!
//! Sources: Martucci 1994, IEEE Trans. Signal Processing 42, 1038 (symmetric convolution); Strang 1999, SIAM Review 41,
//! 135 (the boundary conditions give the transform type).

use serde::{Deserialize, Serialize};

/// What a mirror does to the sign of the record.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Hash, Serialize, Deserialize)]
#[serde(rename_all = "snake_case")]
pub enum Parity {
    /// The reflected record keeps its sign: slope zero at the mirror.
    Even,
    /// The reflected record changes its sign: value zero at the mirror.
    Odd,
}

impl Parity {
    /// The parity after one derivative or integral.
    #[must_use]
    pub fn flipped(self) -> Self {
        match self {
            Parity::Even => Parity::Odd,
            Parity::Odd => Parity::Even,
        }
    }
}

/// Where the mirrors sit.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Hash, Default, Serialize, Deserialize)]
#[serde(rename_all = "snake_case")]
pub enum Seat {
    /// Half a step outside the end samples.
    #[default]
    Half,
    /// On the end sample (even) or on the missing neighbour (odd).
    Whole,
}

/// What is assumed past the two ends. The transform is derived from it, never named by the user.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Hash, Serialize, Deserialize)]
#[serde(rename_all = "snake_case")]
pub enum Ends {
    /// The record repeats.
    Periodic,
    /// The record is reflected at both ends.
    Mirror {
        /// Parity of the left mirror.
        left: Parity,
        /// Parity of the right mirror.
        right: Parity,
        /// Where both mirrors sit.
        seat: Seat,
    },
}

impl Ends {
    /// Even reflection at both ends: the cosine basis.
    pub const EVEN: Ends = Ends::mirror(Parity::Even, Parity::Even, Seat::Half);
    /// Odd reflection at both ends: the sine basis.
    pub const ODD: Ends = Ends::mirror(Parity::Odd, Parity::Odd, Seat::Half);
    /// Even at the left, odd at the right.
    pub const EVEN_ODD: Ends = Ends::mirror(Parity::Even, Parity::Odd, Seat::Half);
    /// Odd at the left, even at the right.
    pub const ODD_EVEN: Ends = Ends::mirror(Parity::Odd, Parity::Even, Seat::Half);

    /// Reflection with the given parities and seat.
    pub const fn mirror(left: Parity, right: Parity, seat: Seat) -> Ends {
        Ends::Mirror { left, right, seat }
    }

    /// All nine: periodic, then the four reflections on the half-sample seat, then on the whole-sample seat.
    pub fn all() -> impl Iterator<Item = Ends> {
        let mirrors = [Ends::EVEN, Ends::ODD, Ends::EVEN_ODD, Ends::ODD_EVEN];
        std::iter::once(Ends::Periodic).chain(mirrors).chain(mirrors.map(|ends| ends.seated(Seat::Whole)))
    }

    /// The same reflection on another seat; a periodic record has none.
    #[must_use]
    pub const fn seated(self, seat: Seat) -> Ends {
        match self {
            Ends::Periodic => Ends::Periodic,
            Ends::Mirror { left, right, .. } => Ends::Mirror { left, right, seat },
        }
    }

    /// The seat; a periodic record counts as half-sample.
    pub const fn seat(self) -> Seat {
        match self {
            Ends::Periodic => Seat::Half,
            Ends::Mirror { seat, .. } => seat,
        }
    }

    /// The ends of the time-reversed record.
    #[must_use]
    pub const fn reversed(self) -> Ends {
        match self {
            Ends::Periodic => Ends::Periodic,
            Ends::Mirror { left, right, seat } => Ends::Mirror { left: right, right: left, seat },
        }
    }

    /// The trade's name: `periodic`, `even`, `odd`, `even-odd`, `odd-even`.
    pub const fn name(self) -> &'static str {
        match self {
            Ends::Periodic => "periodic",
            Ends::Mirror { left: Parity::Even, right: Parity::Even, .. } => "even",
            Ends::Mirror { left: Parity::Odd, right: Parity::Odd, .. } => "odd",
            Ends::Mirror { left: Parity::Even, right: Parity::Odd, .. } => "even-odd",
            Ends::Mirror { left: Parity::Odd, right: Parity::Even, .. } => "odd-even",
        }
    }

    /// The name of the forward transform, for reports.
    pub const fn transform(self) -> &'static str {
        use Parity::{Even, Odd};
        match self {
            Ends::Periodic => "real DFT",
            Ends::Mirror { left, right, seat: Seat::Half } => match (left, right) {
                (Even, Even) => "DCT-II",
                (Odd, Odd) => "DST-II",
                (Even, Odd) => "DCT-IV",
                (Odd, Even) => "DST-IV",
            },
            Ends::Mirror { left, right, seat: Seat::Whole } => match (left, right) {
                (Even, Even) => "DCT-I",
                (Odd, Odd) => "DST-I",
                (Even, Odd) => "DCT-III",
                (Odd, Even) => "DST-III",
            },
        }
    }

    /// Distance between the mirrors (or the period) in steps, L / h, for a record of `len` samples.
    pub fn length(self, len: usize) -> f64 {
        let n = len as f64;
        match self {
            Ends::Mirror { left, right, seat: Seat::Whole } => match (left, right) {
                (Parity::Even, Parity::Even) => n - 1.0,
                (Parity::Odd, Parity::Odd) => n + 1.0,
                _ => n,
            },
            _ => n,
        }
    }

    /// Position of sample 0 in steps from the left mirror, x_0 / h.
    pub const fn first_position(self) -> f64 {
        match self {
            Ends::Periodic => 0.5,
            Ends::Mirror { seat: Seat::Half, .. } => 0.5,
            Ends::Mirror { left: Parity::Even, .. } => 0.0,
            Ends::Mirror { left: Parity::Odd, .. } => 1.0,
        }
    }

    /// Frequency of basis function `k` in cycles per sample. The periodic basis is packed as constant, then cosine and
    /// sine of each harmonic in turn, then the Nyquist cosine of an even length.
    pub fn frequency(self, len: usize, k: usize) -> f64 {
        let Ends::Mirror { left, right, .. } = self else {
            return k.div_ceil(2) as f64 / len as f64;
        };
        let length = self.length(len);
        if length == 0.0 {
            return 0.0; // one sample between two even mirrors on it: only the constant exists
        }
        let half_cycles = match (left, right) {
            (Parity::Even, Parity::Even) => k as f64,
            (Parity::Odd, Parity::Odd) => (k + 1) as f64,
            _ => k as f64 + 0.5,
        };
        half_cycles / (2.0 * length)
    }

    /// Weight of sample `n` in the inner product: 1/2 on an even mirror, otherwise 1. A single sample between two even
    /// whole-sample mirrors is the identity and keeps weight 1.
    pub fn weight(self, len: usize, n: usize) -> f64 {
        let Ends::Mirror { left, right, seat: Seat::Whole } = self else { return 1.0 };
        if len == 1 && left == Parity::Even && right == Parity::Even {
            return 1.0;
        }
        let on_left = n == 0 && left == Parity::Even;
        let on_right = n + 1 == len && right == Parity::Even;
        if on_left || on_right { 0.5 } else { 1.0 }
    }

    /// Sample index (possibly negative or past the end) of the extension, as the record's sample and its sign; `None`
    /// where an odd mirror on a missing neighbour makes the extension zero. Never recurses: folds by the period.
    pub fn fold(self, len: usize, index: i64) -> Option<(usize, f64)> {
        let n = len as i64;
        match self {
            Ends::Periodic => Some((index.rem_euclid(n) as usize, 1.0)),
            Ends::Mirror { left, right, seat } => {
                if len == 1 && seat == Seat::Whole && left == Parity::Even && right == Parity::Even {
                    return Some((0, 1.0));
                }
                // Twice the position, so that half-sample mirrors stay on integers.
                let first2 = (self.first_position() * 2.0) as i64;
                let length2 = (self.length(len) * 2.0) as i64;
                let position2 = 2 * index + first2;
                let lap = position2.div_euclid(length2);
                let inside2 = position2.rem_euclid(length2);
                // Every lap is one crossing of a mirror; laps alternate between the record and its reflection.
                let sign_of = |parity: Parity| if parity == Parity::Odd { -1.0 } else { 1.0 };
                let both = sign_of(left) * sign_of(right);
                let half_laps = lap.div_euclid(2);
                let mut sign = if half_laps.rem_euclid(2) == 1 { both } else { 1.0 };
                let mirrored = lap.rem_euclid(2) == 1;
                let p2 = if mirrored { length2 - inside2 } else { inside2 };
                if mirrored {
                    sign *= sign_of(right);
                }
                let sample2 = p2 - first2;
                let sample = sample2.div_euclid(2);
                if sample2.rem_euclid(2) != 0 || sample < 0 || sample >= n {
                    return None; // the missing neighbour under an odd mirror
                }
                Some((sample as usize, sign))
            }
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn stretch(ends: Ends, record: &[f64], from: i64, to: i64) -> Vec<f64> {
        (from..to).map(|i| ends.fold(record.len(), i).map_or(0.0, |(n, sign)| sign * record[n])).collect()
    }

    #[test]
    fn every_extension_continues_as_drawn_by_hand() {
        let x = [1.0, 2.0, 3.0];
        let whole = |ends: Ends| ends.seated(Seat::Whole);
        let cases: [(Ends, [f64; 9]); 9] = [
            (Ends::Periodic, [1., 2., 3., 1., 2., 3., 1., 2., 3.]),
            (Ends::EVEN, [3., 2., 1., 1., 2., 3., 3., 2., 1.]),
            (Ends::ODD, [-3., -2., -1., 1., 2., 3., -3., -2., -1.]),
            (Ends::EVEN_ODD, [3., 2., 1., 1., 2., 3., -3., -2., -1.]),
            (Ends::ODD_EVEN, [-3., -2., -1., 1., 2., 3., 3., 2., 1.]),
            (whole(Ends::EVEN), [2., 3., 2., 1., 2., 3., 2., 1., 2.]),
            (whole(Ends::ODD), [-2., -1., 0., 1., 2., 3., 0., -3., -2.]),
            (whole(Ends::EVEN_ODD), [0., 3., 2., 1., 2., 3., 0., -3., -2.]),
            (whole(Ends::ODD_EVEN), [-2., -1., 0., 1., 2., 3., 2., 1., 0.]),
        ];
        for (ends, expected) in cases {
            assert_eq!(stretch(ends, &x, -3, 6), expected, "{} {:?}", ends.name(), ends.seat());
        }
    }

    #[test]
    fn far_laps_keep_the_sign() {
        // Mixed ends have period 4L with a sign change after 2L.
        let x = [1.0, 2.0, 3.0];
        let near = stretch(Ends::EVEN_ODD, &x, 0, 6);
        let far = stretch(Ends::EVEN_ODD, &x, 6, 12);
        assert_eq!(near.iter().map(|v| -v).collect::<Vec<_>>(), far);
        assert_eq!(stretch(Ends::EVEN_ODD, &x, 12, 18), near);
    }
}
