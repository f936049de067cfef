//! Analogues: past stretches that ended as the present one does, and what came after them.

/// How to look for analogues.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub struct Search {
    /// Values compared, the latest `width`.
    pub width: usize,
    /// How many of the nearest stretches are averaged.
    pub neighbours: usize,
}

/// Continues `past` (oldest first) by `steps` values: the mean of what followed the nearest stretches, each measured
/// from its own last value. Only stretches followed by at least min(steps, n/4) values are looked at. Where no
/// continuation reaches, the last value is held.
pub fn continued(past: &[f64], search: Search, steps: usize) -> Vec<f64> {
    let n = past.len();
    let Some(&last) = past.last() else { return vec![0.0; steps] };
    let width = search.width.clamp(1, n);
    let after = steps.min(n / 4).max(1);
    // Index of the last value of each admitted stretch.
    let ends = width - 1..n.saturating_sub(after);
    let pattern: Vec<f64> = past[n - width..].iter().map(|v| v - last).collect();
    let mut nearest: Vec<(f64, usize)> = Vec::with_capacity(search.neighbours + 1);
    for end in ends {
        let limit = if nearest.len() < search.neighbours { f64::INFINITY } else { nearest[nearest.len() - 1].0 };
        let distance = distance(&pattern, &past[end + 1 - width..=end], past[end], limit);
        if distance < limit {
            let place = nearest.partition_point(|(d, _)| *d <= distance);
            nearest.insert(place, (distance, end));
            nearest.truncate(search.neighbours);
        }
    }
    let mut ahead = Vec::with_capacity(steps);
    let mut held = last;
    for step in 1..=steps {
        let reaching = nearest.iter().filter(|(_, end)| end + step < n);
        let (count, sum) = reaching.fold((0, 0.0), |(c, s), &(_, end)| (c + 1, s + past[end + step] - past[end]));
        if count > 0 {
            held = last + sum / f64::from(count);
        }
        ahead.push(held);
    }
    ahead
}

/// Sum of squares of (stretch - last) - pattern; given up once it exceeds `limit`. The latest values, which differ most
/// where the stretch does not fit, come first.
fn distance(pattern: &[f64], stretch: &[f64], last: f64, limit: f64) -> f64 {
    let mut total = 0.0;
    for (p, s) in pattern.rchunks(32).zip(stretch.rchunks(32)) {
        let mut lanes = [0.0; 4];
        let (quads_p, quads_s) = (p.chunks_exact(4), s.chunks_exact(4));
        let (rest_p, rest_s) = (quads_p.remainder(), quads_s.remainder());
        for (p, s) in quads_p.zip(quads_s) {
            for lane in 0..4 {
                let d = s[lane] - last - p[lane];
                lanes[lane] += d * d;
            }
        }
        total += lanes.iter().sum::<f64>();
        total += rest_p.iter().zip(rest_s).map(|(p, s)| (s - last - p).powi(2)).sum::<f64>();
        if total >= limit {
            return total;
        }
    }
    total
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_repeated_pattern_comes_again_on_top_of_its_drift() {
        // Period 10 and a rise of 1 a period: continuations are measured from the stretch's last value.
        let at = |n: usize| [0., 3., 1., 4., 1., 5., 9., 2., 6., 5.][n % 10] + (n / 10) as f64;
        let past: Vec<f64> = (0..104).map(at).collect();
        let ahead = continued(&past, Search { width: 12, neighbours: 3 }, 20);
        for (step, value) in ahead.iter().enumerate() {
            assert!((value - at(104 + step)).abs() < 1e-12, "{step}");
        }
    }

    #[test]
    fn the_value_is_held_where_no_continuation_reaches() {
        let past: Vec<f64> = (0..16).map(f64::from).collect();
        let ahead = continued(&past, Search { width: 4, neighbours: 1 }, 100);
        assert_eq!(ahead[99], ahead[98]);
        assert_eq!(ahead.len(), 100);
        assert_eq!(continued(&[2.0], Search { width: 4, neighbours: 5 }, 3), vec![2.0; 3]);
        assert_eq!(continued(&[], Search { width: 4, neighbours: 5 }, 3), vec![0.0; 3]);
    }
}
