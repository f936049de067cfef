//! The narrowest strip between two parallel lines that holds every stamp: how even a row of stamps is, exactly.

/// The upper and lower hulls of points (n, t), n strictly ascending.
#[derive(Debug, Clone)]
pub struct Strip {
    upper: Vec<(i64, i64)>,
    lower: Vec<(i64, i64)>,
}

impl Strip {
    /// The hulls of the points, which come with strictly ascending n. Exact: differences of n and of t must fit 63 bits.
    pub fn new(points: impl Iterator<Item = (i64, i64)>) -> Strip {
        let mut strip = Strip { upper: Vec::new(), lower: Vec::new() };
        for point in points {
            // A point joins the upper hull after all that lie on or under the line to it; mirrored for the lower.
            while let [.., a, b] = strip.upper[..] {
                if turn(a, b, point) < 0 {
                    break;
                }
                strip.upper.pop();
            }
            strip.upper.push(point);
            while let [.., a, b] = strip.lower[..] {
                if turn(a, b, point) > 0 {
                    break;
                }
                strip.lower.pop();
            }
            strip.lower.push(point);
        }
        strip
    }

    /// The hulls of `len` points if some strip no higher than `limit` holds them all. A thinned choice is tried first:
    /// what does not hold that does not hold all.
    pub fn within(len: usize, point: impl Fn(usize) -> (i64, i64), limit: f64) -> Option<Strip> {
        const THINNED: usize = 64;
        if len > 100 * THINNED {
            let thinned = Strip::new((0..len).step_by(THINNED).map(&point));
            if thinned.narrowest().0 > limit {
                return None;
            }
        }
        let strip = Strip::new((0..len).map(point));
        (strip.narrowest().0 <= limit).then_some(strip)
    }

    /// max(t - n h) - min(t - n h): how far the stamps stray from even steps of `h`. 0 without points.
    pub fn width(&self, h: f64) -> f64 {
        self.extremes(h).map_or(0.0, |(top, bottom)| (top.1 - bottom.1) as f64 - (top.0 - bottom.0) as f64 * h)
    }

    /// The smallest width over all h, and an h that has it. (0, 0) with fewer than two points.
    pub fn narrowest(&self) -> (f64, f64) {
        let slopes = self.slopes();
        // Width is convex and piecewise linear in h, with corners at the slopes of the hull edges. Its derivative is
        // n(bottom) - n(top), so the first corner after which that is not negative is the minimum.
        let at = slopes.windows(2).position(|pair| {
            let between = pair[0] + (pair[1] - pair[0]) / 2.0;
            self.extremes(between).is_some_and(|(top, bottom)| bottom.0 >= top.0)
        });
        let h = match (at, slopes.last()) {
            (Some(at), _) => slopes[at],
            (None, Some(&last)) => last,
            (None, None) => return (0.0, 0.0),
        };
        (self.width(h).max(0.0), h)
    }

    /// All h whose width is at most `limit`: lowest and highest. `None` when there is none or no bound.
    pub fn interval(&self, limit: f64) -> Option<[f64; 2]> {
        let (least, h) = self.narrowest();
        if least > limit || self.upper.len() < 2 {
            return None;
        }
        Some([self.crossing(h, limit, Side::Low)?, self.crossing(h, limit, Side::High)?])
    }

    /// Where the width reaches `limit` on one side of the minimum `h`.
    fn crossing(&self, h: f64, limit: f64, side: Side) -> Option<f64> {
        let slopes = self.slopes();
        let mut corner = h;
        let outward: Box<dyn Iterator<Item = &f64>> = match side {
            Side::Low => Box::new(slopes.iter().rev().filter(|&&s| s < h)),
            Side::High => Box::new(slopes.iter().filter(|&&s| s > h)),
        };
        for &next in outward {
            if self.width(next) > limit {
                return self.solve(corner + (next - corner) / 2.0, limit);
            }
            corner = next;
        }
        // Beyond the last corner the first and the last point are the active ones.
        let (first, last) = (self.upper.first()?, self.upper.last()?);
        let span = (last.0 - first.0) as f64;
        let rise = (last.1 - first.1) as f64;
        match side {
            Side::Low => Some((rise - limit) / span),
            Side::High => Some((rise + limit) / span),
        }
    }

    /// The h at which the points that are active at `inside` make the width `limit`.
    fn solve(&self, inside: f64, limit: f64) -> Option<f64> {
        let (top, bottom) = self.extremes(inside)?;
        let run = (top.0 - bottom.0) as f64;
        (run != 0.0).then(|| ((top.1 - bottom.1) as f64 - limit) / run)
    }

    /// The points of largest and smallest t - n h.
    fn extremes(&self, h: f64) -> Option<((i64, i64), (i64, i64))> {
        let steeper = |hull: &[(i64, i64)], n: usize| slope(hull[n], hull[n + 1]) > h;
        let last_upper = self.upper.len().checked_sub(1)?;
        let last_lower = self.lower.len().checked_sub(1)?;
        // Slopes fall along the upper hull: its top is where they pass h. They rise along the lower one.
        let top = first_where(last_upper, |n| !steeper(&self.upper, n));
        let bottom = first_where(last_lower, |n| steeper(&self.lower, n));
        Some((self.upper[top], self.lower[bottom]))
    }

    fn slopes(&self) -> Vec<f64> {
        let edges = self.upper.windows(2).chain(self.lower.windows(2));
        let mut slopes: Vec<f64> = edges.map(|edge| slope(edge[0], edge[1])).collect();
        slopes.sort_by(f64::total_cmp);
        slopes.dedup();
        slopes
    }
}

#[derive(Clone, Copy)]
enum Side {
    Low,
    High,
}

fn slope(a: (i64, i64), b: (i64, i64)) -> f64 {
    (b.1 - a.1) as f64 / (b.0 - a.0) as f64
}

/// Sign of the turn a -> b -> c: positive to the left.
fn turn(a: (i64, i64), b: (i64, i64), c: (i64, i64)) -> i128 {
    i128::from(b.0 - a.0) * i128::from(c.1 - b.1) - i128::from(b.1 - a.1) * i128::from(c.0 - b.0)
}

/// The first n below `len` where `holds`, else `len`; `holds` must stay true once it is.
fn first_where(len: usize, holds: impl Fn(usize) -> bool) -> usize {
    let (mut low, mut high) = (0, len);
    while low < high {
        let middle = low + (high - low) / 2;
        if holds(middle) {
            high = middle;
        } else {
            low = middle + 1;
        }
    }
    low
}

#[cfg(test)]
mod tests {
    use super::*;

    /// By definition, over all points.
    fn plain_width(points: &[(i64, i64)], h: f64) -> f64 {
        let rest = |p: &(i64, i64)| p.1 as f64 - p.0 as f64 * h;
        let top = points.iter().map(rest).fold(f64::NEG_INFINITY, f64::max);
        let bottom = points.iter().map(rest).fold(f64::INFINITY, f64::min);
        top - bottom
    }

    /// Golden section on the convex width, the textbook way.
    fn golden(points: &[(i64, i64)], mut a: f64, mut b: f64) -> f64 {
        let ratio = (5f64.sqrt() - 1.0) / 2.0;
        for _ in 0..200 {
            let (c, d) = (b - ratio * (b - a), a + ratio * (b - a));
            if plain_width(points, c) < plain_width(points, d) { b = d } else { a = c }
        }
        plain_width(points, (a + b) / 2.0)
    }

    #[test]
    fn agrees_with_golden_section_and_bisection() {
        let mut state = 3u64;
        let mut random = || {
            state = state.wrapping_mul(6364136223846793005).wrapping_add(1442695040888963407);
            (state >> 11) as f64 / (1u64 << 53) as f64
        };
        for trial in 0..60 {
            let h = 3.0 + 40.0 * random();
            let wild = if trial % 3 == 0 { 0.0 } else { 5.0 * random() };
            let mut n = 0;
            let points: Vec<(i64, i64)> = (0..200)
                .map(|_| {
                    n += if random() < 0.05 { 3 } else { 1 };
                    (n, (n as f64 * h + wild * random()).round() as i64)
                })
                .collect();
            let strip = Strip::new(points.iter().copied());
            let (least, best) = strip.narrowest();
            assert!((least - plain_width(&points, best)).abs() < 1e-9);
            assert!((least - golden(&points, h - 1.0, h + 1.0)).abs() < 1e-9, "{least}");
            let limit = least + 0.7;
            let Some([low, high]) = strip.interval(limit) else { panic!("there is an interval") };
            for end in [low, high] {
                // Rounding of t - n h at magnitudes of 1e4.
                assert!((plain_width(&points, end) - limit).abs() < 1e-9);
            }
            assert!(low < best && best < high);
        }
    }

    #[test]
    fn few_points_make_no_trouble() {
        assert_eq!(Strip::new([].into_iter()).narrowest(), (0.0, 0.0));
        assert_eq!(Strip::new([(0, 5)].into_iter()).interval(1.0), None);
        let two = Strip::new([(0, 0), (1, 10)].into_iter());
        assert_eq!(two.narrowest(), (0.0, 10.0));
        assert_eq!(two.interval(1.0), Some([9.0, 11.0]));
    }
}
