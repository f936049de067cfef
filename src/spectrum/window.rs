//! Windows as sums of cosines, by their published coefficients.

use std::f64::consts::TAU;

use crate::error::{Error, Result};
use crate::numeric::sum::{sum, sum_of_squares};
use crate::place::escape;

/// A window w_n = a_0 - a_1 cos(2 pi n/M) + a_2 cos(4 pi n/M) - ..., n = 0..M-1: the periodic form, to which published figures
/// of merit belong.
#[derive(Debug, PartialEq)]
pub struct Window {
    /// Name on the command line.
    pub name: &'static str,
    /// a_0, a_1, ...
    pub coefficients: &'static [f64],
    /// Overlap of segments that suits it, as a share of the segment.
    pub overlap: f64,
    /// Where the coefficients were published, and what it is for.
    pub source: &'static str,
}

const fn row(name: &'static str, coefficients: &'static [f64], overlap: f64, source: &'static str) -> Window {
    Window { name, coefficients, overlap, source }
}

/// The windows. The first is the default.
#[rustfmt::skip]
pub static WINDOWS: &[Window] = &[
    row("hann", &[0.5, 0.5], 0.5, "Harris 1978, Proc. IEEE 66, 51: general use"),
    row("rectangular", &[1.0], 0.0, "no window: whole cycles, or transients that die out within the segment"),
    row("hamming", &[0.54, 0.46], 0.5, "Harris 1978"),
    row("blackman", &[0.42, 0.50, 0.08], 0.5, "Harris 1978"),
    row("blackman-harris", &[0.35875, 0.48829, 0.14128, 0.01168], 0.66, "Harris 1978, four terms, side lobes -92 dB"),
    row("nuttall", &[0.3635819, 0.4891775, 0.1365995, 0.0106411], 0.66, "Nuttall 1981, IEEE Trans. ASSP 29, 84, side lobes -98 dB"),
    row("flat-top", &[1.0, 1.933, 1.286, 0.388, 0.0322], 0.75, "coefficients given for ISO 18431-2: amplitudes of lines"),
    row("flat-top-hft70", &[1.0, 1.90796, 1.07349, 0.18199], 0.75, "Heinzel, Ruediger and Schilling 2002, D.3.1"),
    row("flat-top-hft95", &[1.0, 1.9383379, 1.3045202, 0.4028270, 0.0350665], 0.75, "Heinzel, Ruediger and Schilling 2002, D.3.2"),
    row("flat-top-hft90d", &[1.0, 1.942604, 1.340318, 0.440811, 0.043097], 0.75, "Heinzel, Ruediger and Schilling 2002, D.3.3"),
    row("flat-top-5", &[0.21557895, 0.41663158, 0.277263158, 0.083578947, 0.006947368], 0.75, "D'Antona and Ferrero 2006"),
];

/// The window of a name.
///
/// # Errors
/// `Usage` for an unknown name.
pub fn window(name: &str) -> Result<&'static Window> {
    WINDOWS.iter().find(|window| window.name == name).ok_or_else(|| {
        let known: Vec<&str> = WINDOWS.iter().map(|window| window.name).collect();
        Error::usage(format!("not a window: \"{}\"", escape(name))).remedy(format!("use one of {}", known.join(", ")))
    })
}

impl Window {
    /// The window over `len` samples.
    pub fn samples(&self, len: usize) -> Vec<f64> {
        let at = |n: usize| {
            let mut total = 0.0;
            for (j, a) in self.coefficients.iter().enumerate() {
                // The angle is reduced in whole numbers, so that long windows stay exact.
                let angle = TAU * ((j * n) % len) as f64 / len as f64;
                total += if j % 2 == 0 { *a } else { -*a } * angle.cos();
            }
            total
        };
        (0..len).map(at).collect()
    }
}

/// Effective noise bandwidth M sum w^2 / (sum w)^2 in lines, and so in Hz after multiplication by the spacing.
pub fn noise_bandwidth_lines(samples: &[f64]) -> f64 {
    samples.len() as f64 * sum_of_squares(samples) / sum(samples).powi(2)
}

#[cfg(test)]
mod tests {
    use super::*;

    /// |W(d)|^2 / |W(0)|^2 of the window at `d` lines.
    fn response(samples: &[f64], d: f64) -> f64 {
        let (mut re, mut im) = (0.0, 0.0);
        for (n, w) in samples.iter().enumerate() {
            let angle = TAU * d * n as f64 / samples.len() as f64;
            re += w * angle.cos();
            im -= w * angle.sin();
        }
        (re * re + im * im) / sum(samples).powi(2)
    }

    fn decibels(power: f64) -> f64 {
        10.0 * power.log10()
    }

    fn overlap_correlation(samples: &[f64], share: f64) -> f64 {
        let step = ((1.0 - share) * samples.len() as f64).round() as usize;
        let product: f64 = samples.iter().zip(&samples[step..]).map(|(a, b)| a * b).sum();
        product / sum_of_squares(samples)
    }

    #[test]
    fn figures_of_merit_are_the_published_ones() {
        // Harris 1978, Table 1 (recomputed there where misprinted); Heinzel, Ruediger and Schilling 2002, appendix D; ISO
        // 18431-2; D'Antona and Ferrero 2006. Name, coherent gain, bandwidth, scallop loss, highest side lobe, overlap
        // correlation at 75 % and 50 %.
        type Merit = (&'static str, f64, f64, f64, Option<f64>, Option<(f64, f64)>);
        #[rustfmt::skip]
        let rows: &[Merit] = &[
            ("rectangular", 1.0, 1.0, 3.9224, Some(-13.26), Some((0.75, 0.50))),
            ("hann", 0.5, 1.5, 1.4236, Some(-31.47), Some((0.6592, 0.1667))),
            ("hamming", 0.54, 1.3628, 1.7514, Some(-42.68), Some((0.7069, 0.2338))),
            ("blackman", 0.42, 1.7268, 1.0989, Some(-58.11), Some((0.5667, 0.0896))),
            ("blackman-harris", 0.3588, 2.0044, 0.8256, Some(-92.01), Some((0.4600, 0.0376))),
            ("nuttall", 0.3636, 1.9761, 0.8506, Some(-98.17), Some((0.4700, 0.0418))),
            ("flat-top", 1.0, 3.7709, 0.0090, Some(-83.9), None),
            ("flat-top-hft70", 1.0, 3.4129, 0.0065, Some(-70.4), None),
            ("flat-top-hft95", 1.0, 3.8112, 0.0044, Some(-95.0), None),
            ("flat-top-hft90d", 1.0, 3.8832, 0.0039, Some(-90.2), None),
            ("flat-top-5", 0.2156, 3.7702, 0.0098, Some(-93.03), None),
        ];
        assert_eq!(rows.len(), WINDOWS.len());
        for &(name, gain, bandwidth, scallop, side_lobe, correlation) in rows {
            let found = window(name).unwrap();
            let samples = found.samples(4096);
            // The tables print four decimals; the flat-tops three or four digits.
            assert!((sum(&samples) / 4096.0 - gain).abs() < 5e-4, "{name}");
            assert!((noise_bandwidth_lines(&samples) - bandwidth).abs() < 5e-4, "{name}");
            // The flat-tops' figure is the largest error anywhere between two lines.
            let worst = (0..=20).map(|k| decibels(response(&samples, f64::from(k) * 0.025)).abs()).fold(0.0, f64::max);
            assert!((worst - scallop).abs() < 5e-4, "{name}: scallop {worst}");
            if let Some(level) = side_lobe {
                let first = found.coefficients.len() as f64;
                let lobes = (0..400).map(|k| decibels(response(&samples, first + 0.02 + f64::from(k) * 0.05)));
                let highest = lobes.fold(f64::NEG_INFINITY, f64::max);
                assert!((highest - level).abs() < 0.1, "{name}: side lobe {highest}");
            }
            if let Some((three_quarters, half)) = correlation {
                assert!((overlap_correlation(&samples, 0.75) - three_quarters).abs() < 5e-4, "{name}");
                assert!((overlap_correlation(&samples, 0.50) - half).abs() < 5e-4, "{name}");
            }
        }
    }

    #[test]
    fn a_misprinted_row_is_known_by_its_side_lobes() {
        // Harris 1978, Table 1, four terms, -74 dB: as printed, and as corrected (Nuttall 1981, quoted in Lyons,
        // "Understanding Digital Signal Processing").
        for (coefficients, level) in
            [(&[0.40217, 0.49703, 0.09392, 0.00183], -56.6), (&[0.40217, 0.49703, 0.09892, 0.00188], -74.39)]
        {
            let samples = row("four terms", coefficients, 0.5, "Harris 1978").samples(4096);
            // The main lobe ends where the response rises again, wherever that is.
            let falls: Vec<f64> = (0..2000).map(|k| response(&samples, f64::from(k) * 0.01)).collect();
            let rise = falls.windows(2).position(|pair| pair[1] > pair[0]).unwrap();
            let highest = decibels(falls[rise..].iter().copied().fold(0.0, f64::max));
            assert!((highest - level).abs() < 0.1, "{highest}");
        }
    }

    #[test]
    fn hann_is_periodic_and_falls_off_by_18_decibels_an_octave() {
        // The symmetric form would give 1.7142857, 1.6 and 1.5238095 at these lengths.
        for len in [8, 16, 64] {
            assert!((noise_bandwidth_lines(&window("hann").unwrap().samples(len)) - 1.5).abs() < 1e-12);
        }
        // Harris 1978, Table 1: fall-off per octave of the envelope, fitted over two octaves of side-lobe tops.
        for (name, slope) in [("rectangular", -6.0), ("hann", -18.0), ("hamming", -6.0)] {
            let samples = window(name).unwrap().samples(8192);
            let top = |from: f64| (0..100).map(|k| response(&samples, from + f64::from(k) * 0.01)).fold(0.0, f64::max);
            // Hamming's first lobes do not follow the law yet: measured far out, well below the folding at 4096.
            let fall = (decibels(top(200.0)) - decibels(top(50.0))) / 2.0;
            assert!((fall - slope).abs() < 0.3, "{name}: {fall}");
        }
    }
}
