//! Octave and one-third-octave bands by IEC 61260-1, base ten.

use super::band::{BandLevel, band};
use super::density::Density;

/// A band of fewer lines than this is not resolved: a tone in it may read 0.5 dB low, or far lower.
pub const FEWEST_LINES: f64 = 5.0;

/// Width of the bands.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Fraction {
    /// One octave.
    Octave,
    /// A third of one.
    Third,
}

impl Fraction {
    /// Tenths of a decade from band to band.
    fn tenths(self) -> i32 {
        match self {
            Fraction::Octave => 3,
            Fraction::Third => 1,
        }
    }
}

/// One band.
#[derive(Debug, Clone, PartialEq)]
pub struct OctaveBand {
    /// Nominal mid-frequency, as instruments label it.
    pub nominal: f64,
    /// Exact mid-frequency, in Hz.
    pub centre: f64,
    /// Level; `None` where the band holds fewer than [`FEWEST_LINES`] lines.
    pub level: Option<BandLevel>,
    /// Width in lines.
    pub lines: f64,
}

/// The bands that lie between half the first line and the Nyquist frequency and are at least one line wide.
///
/// Mid-frequencies 1000 G^(x/b) Hz and edges G^(-1/(2b)), G^(1/(2b)) with G = 10^(3/10) (IEC 61260-1:2014, 5.2 to 5.6; from
/// memory). Edges are those of ideal bands, not of the standard's filters.
pub fn octave_bands(density: &Density, fraction: Fraction) -> Vec<OctaveBand> {
    let tenths = fraction.tenths();
    let half = 10_f64.powf(f64::from(tenths) / 20.0);
    let lowest = density.spacing / (half - half.recip());
    let highest = density.rate / 2.0 / half;
    let place = |frequency: f64| 10.0 * (frequency / 1000.0).log10() / f64::from(tenths);
    let (from, to) = (place(lowest).ceil() as i32, (place(highest) + 1e-9).floor() as i32);
    (from..=to)
        .map(|x| {
            let centre = 1000.0 * 10_f64.powf(f64::from(x * tenths) / 10.0);
            let level = band(density, centre / half, centre * half);
            OctaveBand {
                nominal: nominal(x * tenths),
                centre,
                lines: level.lines,
                level: (level.lines >= FEWEST_LINES).then_some(level),
            }
        })
        .collect()
}

/// The rounded value of 1000 x 10^(tenths/10): the preferred numbers of IEC 61260-1, annex E (from memory).
fn nominal(tenths: i32) -> f64 {
    const DECADE: [f64; 10] = [1.0, 1.25, 1.6, 2.0, 2.5, 3.15, 4.0, 5.0, 6.3, 8.0];
    let exponent = tenths.div_euclid(10) + 3;
    let figure = DECADE[tenths.rem_euclid(10) as usize];
    if exponent >= 0 { figure * 10_f64.powi(exponent) } else { figure / 10_f64.powi(-exponent) }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::basis::Planner;
    use crate::spectrum::{Detrend, Segments, welch, window};

    fn tone(frequency: f64, rate: f64, len: usize) -> Density {
        let samples: Vec<f64> =
            (0..len).map(|n| 2f64.sqrt() * (std::f64::consts::TAU * frequency * n as f64 / rate).sin()).collect();
        let segments = Segments::new(len, len / 4, 0.5).unwrap();
        welch(&samples, rate, segments, window("hann").unwrap(), Detrend::Mean, &Planner::new()).unwrap()
    }

    #[test]
    fn mid_frequencies_and_names_are_the_standard_s() {
        let density = tone(100.0, 4000.0, 16000);
        let thirds = octave_bands(&density, Fraction::Third);
        let names: Vec<f64> = thirds.iter().map(|band| band.nominal).filter(|f| *f >= 25.0).collect();
        // IEC 61260-1, annex E; ISO 266.
        let expected = [
            25.0, 31.5, 40.0, 50.0, 63.0, 80.0, 100.0, 125.0, 160.0, 200.0, 250.0, 315.0, 400.0, 500.0, 630.0, 800.0,
            1000.0, 1250.0, 1600.0,
        ];
        assert_eq!(names, expected);
        let octaves = octave_bands(&density, Fraction::Octave);
        let names: Vec<f64> = octaves.iter().map(|band| band.nominal).filter(|f| *f >= 8.0).collect();
        assert_eq!(names, [8.0, 16.0, 31.5, 63.0, 125.0, 250.0, 500.0, 1000.0]);
        let found = thirds.iter().find(|band| band.nominal == 31.5).unwrap().centre;
        assert!((found - 31.622_776_6).abs() < 1e-6);
    }

    #[test]
    fn a_tone_reads_in_full_where_the_band_is_resolved_and_not_at_all_where_it_is_not() {
        // Spacing 1 Hz: the band about 100 Hz is 23 lines wide, that about 20 Hz 4.6, that about 25 Hz 5.8.
        let density = tone(100.0, 4000.0, 16000);
        let bands = octave_bands(&density, Fraction::Third);
        let at = |nominal: f64| bands.iter().find(|band| band.nominal == nominal).unwrap();
        let level = at(100.0).level.as_ref().unwrap();
        assert!((10.0 * level.mean_square.log10()).abs() < 0.01, "{}", level.mean_square);
        assert!(at(20.0).level.is_none() && at(25.0).level.is_some());
        assert!(bands.iter().all(|band| band.centre * 10_f64.powf(0.05) <= 2000.0));
    }
}
