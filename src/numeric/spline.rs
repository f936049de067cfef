//! The cubic spline through points on any ascending positions, without a knot next to the ends.

/// Values at `wanted` (ascending) of the cubic spline through `y` at `x` (strictly ascending, equally many). The third
/// derivative is continuous at the second and the last but one point (not-a-knot, de Boor 1978), so a cubic is
/// reproduced; with three points the ends are free of curvature, with two it is a line, with one a constant. Outside
/// the points the end cubics go on. Without points: NaN.
pub fn cubic_spline(x: &[f64], y: &[f64], wanted: impl Iterator<Item = f64>) -> Vec<f64> {
    let count = x.len().min(y.len());
    if count < 2 {
        let constant = y.first().copied().unwrap_or(f64::NAN);
        return wanted.map(|_| constant).collect();
    }
    let curvature = second_derivatives(&x[..count], &y[..count]);
    let mut at = 0;
    wanted
        .map(|position| {
            while at + 2 < count && x[at + 1] <= position {
                at += 1;
            }
            let h = x[at + 1] - x[at];
            let (a, b) = ((x[at + 1] - position) / h, (position - x[at]) / h);
            let bend = (a * a * a - a) * curvature[at] + (b * b * b - b) * curvature[at + 1];
            a * y[at] + b * y[at + 1] + bend * h * h / 6.0
        })
        .collect()
}

fn second_derivatives(x: &[f64], y: &[f64]) -> Vec<f64> {
    let last = x.len() - 1;
    let mut m = vec![0.0; x.len()];
    if last < 2 {
        return m;
    }
    let h = |i: usize| x[i + 1] - x[i];
    let slope = |i: usize| (y[i + 1] - y[i]) / h(i);
    let not_a_knot = last >= 3;
    // Forward elimination of the tridiagonal system for m[1..last]; `upper` and m hold the reduced rows.
    let mut upper = vec![0.0; x.len()];
    for i in 1..last {
        let (left, right) = (h(i - 1), h(i));
        let mut lower = left;
        let mut diagonal = 2.0 * (left + right);
        let mut above = right;
        if not_a_knot && i == 1 {
            diagonal += left * (left + right) / right;
            above -= left * left / right;
            lower = 0.0;
        }
        if not_a_knot && i == last - 1 {
            diagonal += right * (left + right) / left;
            lower -= right * right / left;
            above = 0.0;
        }
        let pivot = diagonal - lower * upper[i - 1];
        upper[i] = above / pivot;
        m[i] = (6.0 * (slope(i) - slope(i - 1)) - lower * m[i - 1]) / pivot;
    }
    for i in (1..last - 1).rev() {
        m[i] -= upper[i] * m[i + 1];
    }
    if not_a_knot {
        m[0] = ((h(0) + h(1)) * m[1] - h(0) * m[2]) / h(1);
        m[last] = ((h(last - 1) + h(last - 2)) * m[last - 1] - h(last - 1) * m[last - 2]) / h(last - 2);
    }
    m
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_cubic_is_reproduced_on_uneven_points() {
        let cubic = |x: f64| 2.0 - x + 0.5 * x * x - 0.3 * x * x * x;
        for count in [4, 5, 9, 40] {
            let x: Vec<f64> = (0..count).map(|n| f64::from(n) + 0.3 * (f64::from(n) * 1.7).sin()).collect();
            let y: Vec<f64> = x.iter().map(|&x| cubic(x)).collect();
            let wanted: Vec<f64> = (0..4 * count).map(|n| f64::from(n) * 0.26 - 0.2).collect();
            for (got, &at) in cubic_spline(&x, &y, wanted.iter().copied()).iter().zip(&wanted) {
                // Rounding of values up to 0.3 x 41^3 through a well-conditioned system.
                assert!((got - cubic(at)).abs() < 1e-14 * 2e4 * 100.0, "{count} {at}: {got}");
            }
        }
    }

    #[test]
    fn few_points_make_lines() {
        let at = |x: &[f64], y: &[f64]| cubic_spline(x, y, [0.5].into_iter())[0];
        assert_eq!(at(&[0.0, 1.0], &[2.0, 4.0]), 3.0);
        assert_eq!(at(&[0.0], &[2.0]), 2.0);
        assert!(at(&[], &[]).is_nan());
        assert!((at(&[0.0, 1.0, 2.0], &[0.0, 1.0, 2.0]) - 0.5).abs() < 1e-15);
    }
}
