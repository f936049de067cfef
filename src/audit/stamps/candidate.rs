//! First guesses of the step, from single steps and from longer views that average the rounding of the stamps.

use crate::numeric::quantile::median;

/// First guesses, in ticks.
pub struct Candidates {
    /// Median of single steps.
    pub median: f64,
    /// Median over views of 20 print resolutions: coarse stamps disturb it little, gaps not at all.
    pub near: f64,
    /// All guesses, without repeats and non-positive ones.
    pub all: Vec<f64>,
}

impl Candidates {
    /// Guesses from stamps that do not go back, with print resolution `q` in ticks.
    pub fn new(ticks: &[i64], q: f64) -> Candidates {
        let rows = ticks.len() - 1;
        let mean = (ticks[rows] - ticks[0]) as f64 / rows as f64;
        let mut steps: Vec<f64> = chosen(rows).map(|n| (ticks[n + 1] - ticks[n]) as f64).collect();
        let single = median(&mut steps).unwrap_or(0.0);
        steps.retain(|d| (d / single).round() == 1.0);
        let trimmed = steps.iter().sum::<f64>() / steps.len().max(1) as f64;
        let rough = if single > 0.0 { single } else { mean };
        let view = |spans: f64| {
            let rows_spanned = ((spans * q / rough).ceil() as usize).clamp(1, (rows / 3).max(1));
            let starts = chosen(rows + 1 - rows_spanned);
            let mut views: Vec<f64> =
                starts.map(|n| (ticks[n + rows_spanned] - ticks[n]) as f64 / rows_spanned as f64).collect();
            median(&mut views).unwrap_or(0.0)
        };
        let (near, far) = (view(20.0), view(200.0));
        let mut all: Vec<f64> = Vec::new();
        for guess in [far, near, trimmed, single] {
            if guess.is_finite() && guess > 0.0 && !all.contains(&guess) {
                all.push(guess);
            }
        }
        Candidates { median: single, near: if near > 0.0 { near } else { mean }, all }
    }
}

/// The middle one of the single steps, over an even choice of rows.
pub fn middle_step(ticks: &[i64]) -> Option<i64> {
    let rows = ticks.len().checked_sub(1)?;
    let mut steps: Vec<i64> = chosen(rows).map(|n| ticks[n + 1] - ticks[n]).collect();
    if steps.is_empty() {
        return None;
    }
    let middle = steps.len() / 2;
    Some(*steps.select_nth_unstable(middle).1)
}

/// At most about 100,000 evenly chosen rows: enough for a first guess of any record.
fn chosen(rows: usize) -> impl Iterator<Item = usize> {
    (0..rows).step_by((rows / 100_000).max(1))
}
