//! The running median: what drifts slowly in a row of numbers, blind to single outliers.

use std::cmp::Ordering;

/// Running median over `window` values (odd), one per value; at the ends the window is what there is of it. Only every
/// `stride`-th median is formed, straight lines join them.
pub fn running_median(values: &[f64], window: usize, stride: usize) -> Vec<f64> {
    let half = window / 2;
    let stride = stride.max(1);
    if values.is_empty() {
        return Vec::new();
    }
    let mut sorted: Vec<f64> = Vec::with_capacity(window + stride);
    let (mut from, mut to) = (0usize, 0usize);
    let mut result = vec![0.0; values.len()];
    let mut last: Option<(usize, f64)> = None;
    let mut centre = 0usize;
    loop {
        let (new_from, new_to) = (centre.saturating_sub(half), (centre + half + 1).min(values.len()));
        if stride == 1 {
            while to < new_to {
                let at = sorted.partition_point(|v| v.total_cmp(&values[to]) == Ordering::Less);
                sorted.insert(at, values[to]);
                to += 1;
            }
            while from < new_from {
                let at = sorted.partition_point(|v| v.total_cmp(&values[from]) == Ordering::Less);
                sorted.remove(at);
                from += 1;
            }
        } else {
            sorted.clear();
            sorted.extend_from_slice(&values[new_from..new_to]);
            let middle = sorted.len() / 2;
            sorted.select_nth_unstable_by(middle, f64::total_cmp);
        }
        let median = sorted[sorted.len() / 2];
        if let Some((start, value)) = last {
            let slope = (median - value) / (centre - start) as f64;
            for n in start + 1..centre {
                result[n] = value + slope * (n - start) as f64;
            }
        }
        result[centre] = median;
        last = Some((centre, median));
        if centre + 1 == values.len() {
            return result;
        }
        centre = (centre + stride).min(values.len() - 1);
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn agrees_with_sorting_every_window() {
        let values: Vec<f64> = (0..500).map(|n| ((n * 7919) % 503) as f64 + n as f64 * 0.3).collect();
        let plain: Vec<f64> = (0..values.len())
            .map(|n| {
                let mut window = values[n.saturating_sub(10)..(n + 11).min(values.len())].to_vec();
                window.sort_by(f64::total_cmp);
                window[window.len() / 2]
            })
            .collect();
        assert_eq!(running_median(&values, 21, 1), plain);
        let strided = running_median(&values, 21, 7);
        for n in (0..values.len()).step_by(7) {
            assert_eq!(strided[n], plain[n], "row {n}");
        }
        assert_eq!(strided.last(), plain.last());
    }

    #[test]
    fn few_values_are_their_own_median() {
        assert!(running_median(&[], 101, 1).is_empty());
        assert_eq!(running_median(&[5.0], 101, 20), [5.0]);
    }
}
