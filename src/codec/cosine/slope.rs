//! A polynomial taken off before the cosine transform, chosen so that the coefficients cost the fewest bits.

/// Highest power of t.
pub const MOST: usize = 4;

/// Adds sum of factor_j t^j, j from 1, with t = (n + 1/2) / N, times `sign`.
pub fn add(samples: &mut [f64], factors: &[f32], sign: f64) {
    let len = samples.len() as f64;
    for (n, sample) in samples.iter_mut().enumerate() {
        let t = (n as f64 + 0.5) / len;
        let mut sum = 0.0;
        for factor in factors.iter().rev() {
            sum = (sum + f64::from(*factor)) * t;
        }
        *sample += sign * sum;
    }
}

/// Factors of t, t^2, ... t^degree whose removal makes `coefficients` cheapest with that step: weighted least squares,
/// each coefficient weighed by one over its own square, repeated until it settles. `powers` holds the transforms of t^j.
///
/// The cost of a coefficient is about half the logarithm of its square, whose slope is that weight.
pub fn fit(coefficients: &[f64], powers: &[Vec<f64>], step: f64) -> Option<Vec<f32>> {
    let degree = powers.len();
    // A smooth record's coefficients fall steadily: those past a few thousand tell nothing more of a slope.
    let used = coefficients.len().min(4096);
    let mut factors = vec![0.0; degree];
    for _ in 0..8 {
        let mut matrix = vec![vec![0.0; degree + 1]; degree];
        for k in 1..used {
            let mut rest = coefficients[k];
            for j in 0..degree {
                rest -= factors[j] * powers[j][k];
            }
            let weight = 1.0 / (rest * rest + step * step);
            for i in 0..degree {
                for j in 0..degree {
                    matrix[i][j] += weight * powers[i][k] * powers[j][k];
                }
                matrix[i][degree] += weight * powers[i][k] * coefficients[k];
            }
        }
        factors = solve(matrix)?;
    }
    let single: Vec<f32> = factors.iter().map(|f| *f as f32).collect();
    single.iter().all(|f| f.is_finite()).then_some(single)
}

/// Gaussian elimination with the largest pivot.
fn solve(mut rows: Vec<Vec<f64>>) -> Option<Vec<f64>> {
    let n = rows.len();
    for k in 0..n {
        let pivot = (k..n).max_by(|a, b| rows[*a][k].abs().total_cmp(&rows[*b][k].abs()))?;
        rows.swap(k, pivot);
        if rows[k][k] == 0.0 || !rows[k][k].is_finite() {
            return None;
        }
        for i in k + 1..n {
            let factor = rows[i][k] / rows[k][k];
            for j in k..=n {
                rows[i][j] -= factor * rows[k][j];
            }
        }
    }
    let mut out = vec![0.0; n];
    for k in (0..n).rev() {
        let known: f64 = (k + 1..n).map(|j| rows[k][j] * out[j]).sum();
        out[k] = (rows[k][n] - known) / rows[k][k];
    }
    Some(out)
}
