//! Thins a long line for drawing without hiding an extreme.

/// At most `count` points of `values` at `start + n * step`: of each bucket the smallest and the largest, in their order,
/// so that no extreme is lost; the first and the last sample always. Short lines come whole.
pub fn thinned(values: &[f64], start: f64, step: f64, count: usize) -> Vec<[f64; 2]> {
    chosen(values, count).into_iter().map(|n| [start + n as f64 * step, values[n]]).collect()
}

/// The same with the places given; as many as there are values.
pub fn thinned_along(places: &[f64], values: &[f64], count: usize) -> Vec<[f64; 2]> {
    chosen(values, count).into_iter().filter_map(|n| Some([*places.get(n)?, values[n]])).collect()
}

/// The same of rows that may lack a value, each at its place: a gap breaks the line by a point without a value, and hides no
/// extreme.
pub fn thinned_with_gaps(values: &[f64], place: &dyn Fn(usize) -> f64, count: usize) -> Vec<[f64; 2]> {
    if !values.iter().any(|v| v.is_nan()) {
        return chosen(values, count).into_iter().map(|n| [place(n), values[n]]).collect();
    }
    let rows: Vec<usize> = (0..values.len()).filter(|&n| !values[n].is_nan()).collect();
    let held: Vec<f64> = rows.iter().map(|&n| values[n]).collect();
    let mut points = Vec::new();
    let mut before: Option<usize> = None;
    // Between any two points there is at most one break.
    for k in chosen(&held, count / 2) {
        let gap = before.and_then(|before| (before..k).find(|&m| rows[m + 1] != rows[m] + 1));
        points.extend(gap.map(|m| [place(rows[m] + 1), f64::NAN]));
        points.push([place(rows[k]), held[k]]);
        before = Some(k);
    }
    points
}

/// Indices kept.
fn chosen(values: &[f64], count: usize) -> Vec<usize> {
    let len = values.len();
    if len <= count.max(4) {
        return (0..len).collect();
    }
    let buckets = (count.max(4) - 2) / 2;
    let mut kept = vec![0];
    for bucket in 0..buckets {
        let range = bucket * len / buckets..(bucket + 1) * len / buckets;
        let order = |a: &usize, b: &usize| values[*a].total_cmp(&values[*b]);
        if let (Some(low), Some(high)) = (range.clone().min_by(order), range.max_by(order)) {
            kept.extend([low.min(high), low.max(high)]);
        }
    }
    kept.push(len - 1);
    kept.dedup();
    kept
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn no_extreme_is_hidden() {
        let mut values: Vec<f64> = (0..100_000).map(|n| (n as f64 * 0.01).sin()).collect();
        values[54_321] = 9.0;
        values[77_777] = -9.0;
        let points = thinned(&values, 0.0, 1.0, 200);
        assert!(points.len() <= 200, "{}", points.len());
        assert!(points.contains(&[54_321.0, 9.0]));
        assert!(points.contains(&[77_777.0, -9.0]));
        assert!(points.windows(2).all(|pair| pair[0][0] < pair[1][0]), "in order");
        assert_eq!((points[0][0], points[points.len() - 1][0]), (0.0, 99_999.0));
    }

    #[test]
    fn gaps_break_a_line_and_hide_no_extreme() {
        let mut values: Vec<f64> = (0..10_000).map(|n| (n as f64 * 0.01).sin()).collect();
        values[5000..5010].fill(f64::NAN);
        values[5020] = 9.0;
        values[8000] = f64::NAN;
        let points = thinned_with_gaps(&values, &|n| n as f64, 100);
        assert!(points.len() <= 100, "{}", points.len());
        assert!(points.contains(&[5020.0, 9.0]));
        let breaks: Vec<f64> = points.iter().filter(|p| p[1].is_nan()).map(|p| p[0]).collect();
        assert_eq!(breaks, [5000.0, 8000.0]);
        assert!(points.windows(2).all(|pair| pair[0][0] < pair[1][0]), "in order");
        assert!(thinned_with_gaps(&[f64::NAN; 3], &|n| n as f64, 100).is_empty());
    }

    #[test]
    fn short_lines_come_whole() {
        assert_eq!(thinned(&[1.0, 2.0, 0.5], 10.0, 0.5, 4), [[10.0, 1.0], [10.5, 2.0], [11.0, 0.5]]);
        assert!(thinned(&[], 0.0, 1.0, 10).is_empty());
    }
}
