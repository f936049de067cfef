//! Frequency weightings of human vibration as complex responses: magnitude and phase as an instrument's filter has them.

use std::f64::consts::{FRAC_1_SQRT_2, TAU};
use std::sync::Arc;

use realfft::num_complex::Complex;

use crate::error::{Error, Finding, Result};

use super::corner::{figure, quoted};
use super::gain::{Gain, Series};
use super::step::{CornerPoint, Effect, Frame, Part, Setting, Stage};
use super::treatment::Treatments;

/// A weighting: band limits, transition from acceleration to velocity, upward step, gain. Frequencies in Hz.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Weighting {
    /// `Wk`, `Wd` and so on.
    pub name: &'static str,
    /// What it is for.
    pub about: &'static str,
    /// Corners of the second-order Butterworth band limits.
    pub band: [f64; 2],
    /// Corner of the numerator, corner and Q of the denominator; an infinite numerator corner leaves it at 1.
    pub transition: Option<(f64, f64, f64)>,
    /// Corner and Q of the numerator, corner and Q of the denominator.
    pub step: Option<(f64, f64, f64, f64)>,
    /// Factor of the whole.
    pub factor: f64,
}

const fn weighting(
    name: &'static str,
    about: &'static str,
    band: [f64; 2],
    transition: Option<(f64, f64, f64)>,
    step: Option<(f64, f64, f64, f64)>,
) -> Weighting {
    Weighting { name, about, band, transition, step, factor: 1.0 }
}

/// All weightings. Wk, Wd, Wf: ISO 2631-1:1997, Annex A, Table A.1. Wm: ISO 2631-2:2003, Annex A. The others: ISO 8041-1,
/// parameters from memory: Wb after ISO 2631-4 and BS 6841 (1.024 times the step's (2.5/4)^2 is the 0.4 of the latter), Wc,
/// We, Wj after ISO 2631-1, Wh after ISO 5349-1.
pub static WEIGHTINGS: &[Weighting] = &[
    Weighting {
        factor: 1.024,
        ..weighting(
            "Wb",
            "vertical whole-body vibration in rail vehicles",
            [0.4, 100.0],
            Some((16.0, 16.0, 0.55)),
            Some((2.5, 0.9, 4.0, 0.95)),
        )
    },
    weighting("Wc", "seat back, fore and aft", [0.4, 100.0], Some((8.0, 8.0, 0.63)), None),
    weighting("Wd", "horizontal whole-body vibration", [0.4, 100.0], Some((2.0, 2.0, 0.63)), None),
    weighting("We", "rotational whole-body vibration", [0.4, 100.0], Some((1.0, 1.0, 0.63)), None),
    weighting("Wf", "motion sickness", [0.08, 0.63], Some((f64::INFINITY, 0.25, 0.86)), Some((0.0625, 0.8, 0.1, 0.8))),
    weighting(
        "Wh",
        "hand-arm vibration",
        // 10^(8/10) and 10^(31/10).
        [6.309_573_444_801_933, 1_258.925_411_794_167_3],
        Some((15.915_494_309_189_533, 15.915_494_309_189_533, 0.64)),
        None,
    ),
    weighting(
        "Wj",
        "vertical vibration of the head of a lying person",
        [0.4, 100.0],
        None,
        Some((3.75, 0.91, 5.32, 0.91)),
    ),
    weighting(
        "Wk",
        "vertical whole-body vibration",
        [0.4, 100.0],
        Some((12.5, 12.5, 0.63)),
        Some((2.37, 0.91, 3.35, 0.91)),
    ),
    weighting(
        "Wm",
        "vibration in buildings, any direction",
        // 10^-0.1; the transition is the single pole 1/(1 + 0.028 s).
        [0.794_328_234_724_281_5, 100.0],
        Some((5.684_105_110_424_833, 5.684_105_110_424_833, 0.5)),
        None,
    ),
];

/// Reads the argument of `--weighting`.
pub(super) fn read(text: &str) -> Result<Box<dyn Setting>> {
    let text = text.trim();
    let found = WEIGHTINGS.iter().find(|row| row.name.eq_ignore_ascii_case(text)).ok_or_else(|| {
        let names: Vec<&str> = WEIGHTINGS.iter().map(|row| row.name).collect();
        Error::usage(format!("{}: no weighting", quoted(text))).remedy(format!("choose one of {}", names.join(", ")))
    })?;
    Ok(Box::new(Weigh(found)))
}

#[derive(Debug)]
struct Weigh(&'static Weighting);

impl Setting for Weigh {
    fn resolve(&self, frame: &Frame<'_>) -> Result<Effect> {
        let (row, axis) = (self.0, frame.axis);
        if !axis.is_time() {
            return Err(Error::usage(format!(
                "{} {}: the record's axis is a length in {}",
                frame.option,
                row.name,
                axis.unit()
            ))
            .remedy("weight records in time"));
        }
        let (rate_hz, nyquist_hz) = (axis.rate_base(), 0.5 * axis.rate_base());
        let [low, high] = [row.band[0], row.roll_off_hz()];
        if low >= nyquist_hz {
            return Err(Error::unsupported(format!(
                "{} {}: its band begins at {} Hz, and the record ends at {} Hz",
                frame.option,
                row.name,
                figure(low),
                figure(nyquist_hz)
            ))
            .remedy("record at a higher rate"));
        }
        let mut findings = Vec::new();
        if row.band[1] >= nyquist_hz {
            findings.push(Finding::new(
                "weighting_cut",
                format!(
                    "{}: its band reaches to {} Hz, but a record at {} Hz holds nothing above {} Hz",
                    row.name,
                    figure(row.band[1]),
                    figure(rate_hz),
                    figure(nyquist_hz)
                ),
            ));
        }
        let corners = [low, high]
            .into_iter()
            .filter(|&hz| hz < nyquist_hz)
            .map(|hz| CornerPoint { text: format!("{} {} Hz", row.name, figure(hz)), cycles: hz / rate_hz });
        let part = Part {
            kind: "weighting",
            key: "weighting",
            value: row.name.to_owned(),
            stage: Stage::Response,
            corners: corners.collect(),
            gain: Arc::new(Weighed::new(row, rate_hz)),
        };
        let treatments = Treatments { weighting: Some(row), ..Treatments::default() };
        Ok(Effect { parts: vec![part], treatments, findings, ..Effect::default() })
    }
}

impl Weighting {
    /// The complex response at a frequency in Hz.
    pub fn response(&self, hz: f64) -> Complex<f64> {
        response(&self.sections(), self.factor, hz)
    }

    /// Where it begins to fall for good.
    fn roll_off_hz(&self) -> f64 {
        self.transition.map_or(self.band[1], |(_, corner, _)| corner)
    }

    /// ISO 8041-1, 5.6 (formulae from memory): high-pass, low-pass, transition, step.
    fn sections(&self) -> Vec<Section> {
        let [low, high] = self.band.map(|hz| TAU * hz);
        let butterworth = |w: f64| [1.0, 1.0 / (FRAC_1_SQRT_2 * w), 1.0 / (w * w)];
        let mut sections = vec![
            Section { numerator: [0.0, 0.0, 1.0 / (low * low)], denominator: butterworth(low) },
            Section { numerator: [1.0, 0.0, 0.0], denominator: butterworth(high) },
        ];
        let second = |hz: f64, q: f64| {
            let w = TAU * hz;
            [1.0, 1.0 / (q * w), 1.0 / (w * w)]
        };
        if let Some((zero, pole, q)) = self.transition {
            sections.push(Section { numerator: [1.0, 1.0 / (TAU * zero), 0.0], denominator: second(pole, q) });
        }
        if let Some((zero, zero_q, pole, pole_q)) = self.step {
            let size = (zero / pole).powi(2);
            sections
                .push(Section { numerator: second(zero, zero_q).map(|c| c * size), denominator: second(pole, pole_q) });
        }
        sections
    }
}

fn response(sections: &[Section], factor: f64, hz: f64) -> Complex<f64> {
    let s = Complex::new(0.0, TAU * hz);
    sections.iter().fold(Complex::new(factor, 0.0), |product, section| product * section.at(s))
}

/// A quotient of polynomials in s (rad/s), lowest power first.
#[derive(Debug, Clone, Copy)]
struct Section {
    numerator: [f64; 3],
    denominator: [f64; 3],
}

impl Section {
    fn at(&self, s: Complex<f64>) -> Complex<f64> {
        let value = |p: &[f64; 3]| (s * p[2] + p[1]) * s + p[0];
        value(&self.numerator) / value(&self.denominator)
    }

    /// The same in i w per sample.
    fn series(&self, rate_hz: f64) -> Series {
        let scaled = |p: &[f64; 3]| [p[0], p[1] * rate_hz, p[2] * rate_hz * rate_hz];
        Series::of_quotient(&scaled(&self.numerator), &scaled(&self.denominator))
    }
}

/// A weighting at a sampling rate.
#[derive(Debug)]
struct Weighed {
    row: &'static Weighting,
    sections: Vec<Section>,
    rate_hz: f64,
}

impl Weighed {
    fn new(row: &'static Weighting, rate_hz: f64) -> Weighed {
        Weighed { row, sections: row.sections(), rate_hz }
    }
}

impl Gain for Weighed {
    fn at(&self, f: f64) -> f64 {
        self.response(f).norm()
    }
    fn response(&self, f: f64) -> Complex<f64> {
        response(&self.sections, self.row.factor, f * self.rate_hz)
    }
    fn is_real(&self) -> bool {
        false
    }
    fn series(&self) -> Series {
        let start = Series { s0: self.row.factor, ..Series::ZERO };
        self.sections.iter().fold(start, |series, section| series.times(section.series(self.rate_hz)))
    }
    fn extent_samples(&self) -> f64 {
        // exp(-w t/sqrt 2), the decay of the lower band limit, falls to a thousandth in 1.55 cycles.
        2.0 * self.rate_hz / self.row.band[0]
    }
    fn highest(&self) -> f64 {
        self.row.band[1] / self.rate_hz
    }
}

#[cfg(test)]
mod tests;
