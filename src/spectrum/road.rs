//! The class of a measured road or track profile by its displacement density, ISO 8608.

use super::band::band;
use super::density::Density;
use crate::error::{Error, Result};

/// Classes A to H.
#[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord)]
pub enum RoadClass {
    /// Up to 32e-6 m^3 at 0.1 cycles/m.
    A,
    /// Four times as much, and so on.
    B,
    /// 128e-6 to 512e-6 m^3.
    C,
    /// 512e-6 to 2048e-6 m^3.
    D,
    /// 2048e-6 to 8192e-6 m^3.
    E,
    /// 8192e-6 to 32768e-6 m^3.
    F,
    /// 32768e-6 to 131072e-6 m^3.
    G,
    /// Above.
    H,
}

impl RoadClass {
    /// All, smoothest first.
    pub const ALL: [RoadClass; 8] = [
        RoadClass::A,
        RoadClass::B,
        RoadClass::C,
        RoadClass::D,
        RoadClass::E,
        RoadClass::F,
        RoadClass::G,
        RoadClass::H,
    ];

    /// The class of a density in m^3 at 0.1 cycles/m: limits 2^(5 + 2i) x 1e-6 m^3 (ISO 8608:2016, table C.1; A and B as
    /// printed, the others by the factor of 4, from memory).
    pub fn of(density: f64) -> RoadClass {
        let above = (0..7).filter(|i| density > 2_f64.powi(5 + 2 * i) * 1e-6).count();
        RoadClass::ALL[above]
    }

    /// The geometric mean of the class in m^3 at 0.1 cycles/m: 16e-6 for A, four times as much for the next.
    pub fn geometric_mean(self) -> f64 {
        16e-6 * 4_f64.powi(self as i32)
    }

    /// Its letter.
    pub fn letter(self) -> char {
        (b'A' + self as u8) as char
    }
}

/// A profile's line in a double-logarithmic plot.
#[derive(Debug, Clone, PartialEq)]
pub struct Road {
    /// Class by `density_at_reference`.
    pub class: RoadClass,
    /// Displacement density at 0.1 cycles/m in m^3, of the line of slope -2.
    pub density_at_reference: f64,
    /// Standard error of its natural logarithm, from the scatter of the smoothed points about the line.
    pub relative_error: f64,
    /// Slope of the best line, as the exponent w of (n/n0)^-w.
    pub waviness: f64,
    /// Its standard error.
    pub waviness_error: f64,
    /// Density at 0.1 cycles/m of the best line, in m^3.
    pub density_of_best_line: f64,
    /// Smoothed points: spatial frequency in cycles/m, density in m^3.
    pub points: Vec<[f64; 2]>,
    /// Range of spatial frequencies that the points cover, of 0.011 to 2.83 cycles/m asked for.
    pub range: [f64; 2],
}

/// Reference spatial frequency, cycles/m.
const REFERENCE: f64 = 0.1;
/// Range of the fit, cycles/m (ISO 8608, from memory).
const RANGE: [f64; 2] = [0.011, 2.83];

/// Fits the line to the density of a vertical profile; `to_metre` is the size of the samples' unit in metres.
///
/// Smoothed as ISO 8608 does (from memory): octaves about 2^-9 to 2^-5 cycles/m, then thirds up to 2^-2, then twelfths; a
/// band counts where it is at least one line wide. The line is fitted by least squares to logarithms, once with the slope
/// fixed at -2 and once free.
///
/// # Errors
/// `Unsupported` where fewer than 3 smoothed points lie in the range, or the profile is flat.
pub fn road(density: &Density, to_metre: f64) -> Result<Road> {
    let mut points = Vec::new();
    for (low, high) in smoothing_bands() {
        let centre = (low * high).sqrt();
        if !(RANGE[0]..=RANGE[1]).contains(&centre) || high > density.rate / 2.0 || low < density.spacing / 2.0 {
            continue;
        }
        let found = band(density, low, high);
        if found.lines >= 1.0 {
            points.push([centre, found.mean_square * to_metre * to_metre / (high - low)]);
        }
    }
    if points.len() < 3 || points.iter().any(|p| p[1].is_nan() || p[1] <= 0.0) {
        return Err(Error::unsupported(format!(
            "{} smoothed points between 0.011 and 2.83 cycles/m make no road class",
            points.len()
        ))
        .remedy("a class needs a profile of some hundred metres, sampled at least every 0.17 m, in a unit of length"));
    }
    let count = points.len() as f64;
    let logs: Vec<[f64; 2]> = points.iter().map(|[n, g]| [(n / REFERENCE).ln(), g.ln()]).collect();
    let mean = |pick: &dyn Fn(&[f64; 2]) -> f64| logs.iter().map(pick).sum::<f64>() / count;
    let level = mean(&|p| p[1] + 2.0 * p[0]);
    let scatter = mean(&|p| (p[1] + 2.0 * p[0] - level).powi(2)) * count / (count - 1.0);
    let (mx, my) = (mean(&|p| p[0]), mean(&|p| p[1]));
    let sxx = mean(&|p| (p[0] - mx).powi(2)) * count;
    let slope = mean(&|p| (p[0] - mx) * (p[1] - my)) * count / sxx;
    let rest = mean(&|p| (p[1] - my - slope * (p[0] - mx)).powi(2)) * count / (count - 2.0);
    let reference = level.exp();
    Ok(Road {
        class: RoadClass::of(reference),
        density_at_reference: reference,
        relative_error: (scatter / count).sqrt(),
        waviness: -slope,
        waviness_error: (rest / sxx).sqrt(),
        density_of_best_line: (my - slope * mx).exp(),
        range: [points[0][0], points[points.len() - 1][0]],
        points,
    })
}

/// Edges of the smoothing bands in cycles/m, each starting where the one before ends.
fn smoothing_bands() -> Vec<(f64, f64)> {
    let mut bands = Vec::new();
    let mut exponent: f64 = -9.5;
    while exponent < 1.5 - 1e-9 {
        let width = if exponent < -4.5 - 1e-9 {
            1.0
        } else if exponent < -2.0 + 1.0 / 6.0 - 1e-9 {
            1.0 / 3.0
        } else {
            1.0 / 12.0
        };
        bands.push((exponent.exp2(), (exponent + width).exp2()));
        exponent += width;
    }
    bands
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::spectrum::Correlation;

    /// A density G0 (n/n0)^-w of displacement in m.
    fn profile(reference: f64, waviness: f64) -> Density {
        let spacing = 0.002;
        let lines = 2501;
        let value = |k: usize| if k == 0 { 0.0 } else { reference * (k as f64 * spacing / 0.1).powf(-waviness) };
        Density {
            spacing,
            rate: 10.0,
            values: (0..lines).map(value).collect(),
            freedom: vec![20.0; lines],
            bandwidth: vec![spacing; lines],
            correlation: Correlation::ByDistance(vec![1.0]),
            weighted_mean_square: None,
            mean_square: 0.0,
        }
    }

    #[test]
    fn every_class_is_found_at_its_geometric_mean() {
        for class in RoadClass::ALL {
            let found = road(&profile(class.geometric_mean(), 2.0), 1.0).unwrap();
            assert_eq!(found.class, class);
            // Averages over bands of a falling density lie above its value at their middle, by 6 % over a whole octave.
            assert!((found.density_at_reference / class.geometric_mean() - 1.0).abs() < 0.02);
            assert!((found.waviness - 2.0).abs() < 0.03, "{}", found.waviness);
            // Octaves about 2^-6 and 2^-5, thirds from 2^(-13/3) to 2^-2, twelfths up to 2^1.5.
            assert_eq!(found.points.len(), 2 + 8 + 40);
        }
        // ISO 8608:2016, table C.1: A up to 32, B 32 to 128, C 128 to 512, D 512 to 2048, all 1e-6 m^3.
        let letters: String =
            [31.9, 32.1, 127.9, 128.1, 511.0, 513.0, 2049.0].iter().map(|g| RoadClass::of(g * 1e-6).letter()).collect();
        assert_eq!(letters, "ABBCCDE");
    }

    #[test]
    fn a_class_a_road_has_the_standard_s_other_figures() {
        // ISO 8608: G(Omega0 = 1 rad/m) = 1e-6 m^3 (1.005e-6 from 16e-6 at 0.1 cycles/m); RMS over 0.011..2.83 cycles/m
        // 3.806 mm. Millimetres are taken as such.
        let density = profile(16e-6, 2.0);
        let angular = 16e-6 * (0.1 * std::f64::consts::TAU).powi(2) / std::f64::consts::TAU;
        assert!((angular - 1.005e-6).abs() < 0.001e-6);
        let integral = 16e-6 * 0.01 * (1.0 / 0.011 - 1.0 / 2.83);
        assert!((f64::sqrt(integral) - 3.806e-3).abs() < 1e-6);
        let rms = band(&density, 0.011, 2.83).rms();
        // Lines of 0.002 cycles/m stand for a hyperbola by their middles: 1 % at the steep end.
        assert!((rms / 3.806e-3 - 1.0).abs() < 0.01, "{rms}");
        let mut thousandfold = density;
        thousandfold.values.iter_mut().for_each(|v| *v *= 1e6);
        assert_eq!(road(&thousandfold, 1e-3).unwrap().class, RoadClass::A);
    }

    #[test]
    fn a_short_or_flat_profile_has_no_class() {
        let mut flat = profile(1.0, 2.0);
        flat.values.iter_mut().for_each(|v| *v = 0.0);
        assert!(road(&flat, 1.0).is_err());
        let mut coarse = profile(1.0, 2.0);
        coarse.spacing = 3.0;
        assert!(road(&coarse, 1.0).is_err());
    }
}
