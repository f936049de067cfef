//! A curve through given points that overshoots none of them: the monotone piecewise cubic.

/// Piecewise cubic Hermite interpolation with slopes that keep each piece monotone (Fritsch and Butland 1984, SIAM J. Sci.
/// Stat. Comput. 5, 300; ends by the three-point formula, limited).
#[derive(Debug, Clone, PartialEq)]
pub struct Monotone {
    x: Vec<f64>,
    y: Vec<f64>,
    slopes: Vec<f64>,
}

impl Monotone {
    /// The curve through points of ascending `x`; `None` for fewer than two points, or an `x` that does not ascend.
    pub fn through(x: Vec<f64>, y: Vec<f64>) -> Option<Monotone> {
        if x.len() < 2 || x.len() != y.len() || !x.is_sorted_by(|a, b| a < b) {
            return None;
        }
        let widths: Vec<f64> = x.windows(2).map(|p| p[1] - p[0]).collect();
        let secants: Vec<f64> = y.windows(2).zip(&widths).map(|(p, h)| (p[1] - p[0]) / h).collect();
        let last = x.len() - 1;
        let slopes = (0..x.len())
            .map(|n| match n {
                _ if last == 1 => secants[0],
                0 => end_slope(widths[0], widths[1], secants[0], secants[1]),
                n if n == last => end_slope(widths[last - 1], widths[last - 2], secants[last - 1], secants[last - 2]),
                n => inner_slope(widths[n - 1], widths[n], secants[n - 1], secants[n]),
            })
            .collect();
        Some(Monotone { x, y, slopes })
    }

    /// The value at `x`; beyond the first and last point theirs are held.
    pub fn at(&self, x: f64) -> f64 {
        let last = self.x.len() - 1;
        if x <= self.x[0] {
            return self.y[0];
        }
        if x >= self.x[last] {
            return self.y[last];
        }
        let n = self.x.partition_point(|&knot| knot <= x) - 1;
        let h = self.x[n + 1] - self.x[n];
        let t = (x - self.x[n]) / h;
        let (rise, fall) = (t * t * (3.0 - 2.0 * t), (1.0 - t) * (1.0 - t) * (1.0 + 2.0 * t));
        let (start, end) = (t * (1.0 - t) * (1.0 - t), t * t * (1.0 - t));
        fall * self.y[n] + rise * self.y[n + 1] + h * (start * self.slopes[n] - end * self.slopes[n + 1])
    }
}

/// The weighted harmonic mean of both secants, or 0 where they disagree in direction.
fn inner_slope(before: f64, after: f64, left: f64, right: f64) -> f64 {
    if left * right <= 0.0 {
        return 0.0;
    }
    let (a, b) = (2.0 * after + before, after + 2.0 * before);
    (a + b) / (a / left + b / right)
}

/// The parabola's slope at its end, kept in the direction of the nearer secant and within three times it.
fn end_slope(near: f64, next: f64, secant: f64, second: f64) -> f64 {
    let slope = ((2.0 * near + next) * secant - near * second) / (near + next);
    if slope * secant <= 0.0 {
        0.0
    } else if secant * second < 0.0 && slope.abs() > 3.0 * secant.abs() {
        3.0 * secant
    } else {
        slope
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn lines_are_reproduced_and_nothing_overshoots() {
        let line = Monotone::through(vec![0.0, 1.0, 3.0, 4.0], vec![1.0, 3.0, 7.0, 9.0]).expect("ascending");
        for n in 0..=40 {
            let x = f64::from(n) / 10.0;
            assert!((line.at(x) - (1.0 + 2.0 * x)).abs() < 1e-14);
        }
        let step = Monotone::through(vec![0.0, 1.0, 2.0, 3.0], vec![0.0, 0.0, 1.0, 1.0]).expect("ascending");
        assert!((0..=300).all(|n| (0.0..=1.0).contains(&step.at(f64::from(n) / 100.0))));
        assert_eq!((step.at(-5.0), step.at(9.0)), (0.0, 1.0));
        assert!(Monotone::through(vec![0.0], vec![1.0]).is_none());
        assert!(Monotone::through(vec![0.0, 0.0], vec![1.0, 2.0]).is_none());
        assert!(Monotone::through(vec![0.0, f64::NAN], vec![1.0, 2.0]).is_none());
    }

    #[test]
    fn values_are_those_of_an_independent_library() {
        // SciPy 1.17.1, interpolate.PchipInterpolator([0, 1, 2.5, 4, 4.5], [0, 2, 1, 1.5, 4]) at 0.5, 1.5, 3, 4.25.
        let curve = Monotone::through(vec![0.0, 1.0, 2.5, 4.0, 4.5], vec![0.0, 2.0, 1.0, 1.5, 4.0]).expect("ascending");
        for (x, y) in SCIPY {
            assert!((curve.at(x) - y).abs() < 1e-14, "{x}: {} {y}", curve.at(x));
        }
    }

    const SCIPY: [(f64, f64); 4] =
        [(0.5, 1.3833333333333333), (1.5, 1.740740740740741), (3.0, 1.0483288166214995), (4.25, 2.4103150406504064)];
}
