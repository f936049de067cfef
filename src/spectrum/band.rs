//! The RMS in a band of a density, lines at the edges counted by their share, with confidence limits.

use super::density::Density;
use super::limits::Limits;

/// What a band holds.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct BandLevel {
    /// Lower edge, in Hz or 1/m.
    pub low: f64,
    /// Upper edge.
    pub high: f64,
    /// Mean square of the band, in unit^2.
    pub mean_square: f64,
    /// Degrees of freedom of the mean square.
    pub freedom: f64,
    /// Width of the band in spacings.
    pub lines: f64,
}

impl BandLevel {
    /// Root mean square, in the unit of the samples.
    pub fn rms(&self) -> f64 {
        self.mean_square.sqrt()
    }

    /// Limits of the root mean square.
    pub fn rms_limits(&self, limits: &mut Limits) -> (f64, f64) {
        let (low, high) = limits.factors(self.freedom);
        ((self.mean_square * low).sqrt(), (self.mean_square * high).sqrt())
    }
}

/// The mean square between `low` and `high` (Hz or 1/m), cut to what the density covers.
///
/// Its degrees of freedom are twice the squared mean over the variance, which sums the covariances of the lines.
pub fn band(density: &Density, low: f64, high: f64) -> BandLevel {
    let (low, high) = (low.max(0.0), high.min(density.rate / 2.0));
    let spacing = density.spacing;
    let last = density.len() - 1;
    let first = ((low / spacing - 0.5).floor().max(0.0) as usize).min(last);
    let end = ((high / spacing + 0.5).ceil().max(0.0) as usize).min(last);
    let part = |k: usize| density.share(k, low, high) * density.values[k];
    let parts: Vec<f64> = (first..=end).map(part).collect();
    let total = crate::numeric::sum::sum(&parts);
    let mut variance = 0.0;
    for (i, a) in parts.iter().enumerate() {
        if *a == 0.0 {
            continue;
        }
        let k = first + i;
        for distance in 0..parts.len() - i {
            let correlation = density.correlation(k, distance);
            if correlation == 0.0 && distance > NEAR {
                break;
            }
            let b = parts[i + distance];
            let freedom = (density.freedom[k] * density.freedom[k + distance]).sqrt();
            let both = if distance == 0 { 1.0 } else { 2.0 };
            variance += both * a * b * correlation * 2.0 / freedom;
        }
    }
    BandLevel {
        low,
        high,
        mean_square: total * spacing,
        freedom: if variance > 0.0 { 2.0 * total * total / variance } else { density.freedom[first] },
        lines: (high - low).max(0.0) / spacing,
    }
}

/// Correlations by distance may touch zero before they end, never past this many lines.
const NEAR: usize = 32;

#[cfg(test)]
mod tests {
    use super::*;
    use crate::basis::Planner;
    use crate::spectrum::{Detrend, Segments, sine, welch, window};

    fn record(len: usize) -> Vec<f64> {
        (0..len).map(|n| (0.37 * n as f64).sin() + 0.4 * ((n * n) as f64 * 0.011).cos()).collect()
    }

    #[test]
    fn bands_of_a_partition_add_up() {
        let record = record(997);
        let segments = Segments::new(997, 128, 0.5).unwrap();
        let hann = window("hann").unwrap();
        for density in [
            welch(&record, 40.0, segments, hann, Detrend::Mean, &Planner::new()).unwrap(),
            welch(&record, 40.0, Segments::new(997, 127, 0.5).unwrap(), hann, Detrend::Mean, &Planner::new()).unwrap(),
            sine(&record, 40.0, 6, Detrend::Mean, &Planner::new()).unwrap(),
            sine(&record[1..], 40.0, 6, Detrend::Mean, &Planner::new()).unwrap(),
        ] {
            let edges = [0.0, 0.07, 0.1, 3.337, 3.4, 11.0, 19.9, 20.0];
            let parts: f64 = edges.windows(2).map(|e| band(&density, e[0], e[1]).mean_square).sum();
            let whole = density.sum();
            assert!((parts - whole).abs() < 1e-14 * whole, "{parts} {whole}");
            assert!((band(&density, -1.0, 1e9).mean_square - whole).abs() < 1e-14 * whole);
        }
    }

    #[test]
    fn a_wide_band_has_two_degrees_of_freedom_a_cycle_of_time_and_bandwidth() {
        // A flat density over B Hz and T s holds B T independent pairs (Bendat and Piersol).
        let mut density = welch(
            &record(4096),
            1000.0,
            Segments::new(4096, 256, 0.5).unwrap(),
            window("hann").unwrap(),
            Detrend::Mean,
            &Planner::new(),
        )
        .unwrap();
        density.values.iter_mut().for_each(|v| *v = 1.0);
        let found = band(&density, 100.0, 400.0).freedom;
        let pairs = 300.0 * 4.096;
        // Hann segments overlapped by half leave about 8 % of the information unused (ends of the record included).
        assert!(found > 1.8 * pairs && found < 2.0 * pairs, "{found} {pairs}");
    }

    #[test]
    fn an_empty_band_holds_nothing() {
        let density = sine(&record(64), 8.0, 3, Detrend::Mean, &Planner::new()).unwrap();
        let empty = band(&density, 5.0, 6.0);
        assert_eq!((empty.mean_square, empty.lines), (0.0, 0.0));
        assert!(empty.freedom > 0.0);
    }
}
