//! The measured response of a sensor, by frequency: gain and phase from a table, joined without overshoot.

use realfft::num_complex::Complex;

use crate::error::{Error, Result};
use crate::numeric::monotone::Monotone;
use crate::place::{Place, escape};

/// How much the inverse may amplify: 20 dB.
pub(super) const BOOST: f64 = 10.0;
/// Neighbouring points farther apart than this do not resolve what lies between them.
const COARSE_DECIBELS: f64 = 3.0;
const COARSE_DEGREES: f64 = 45.0;

/// A response: ln gain and unwrapped phase over ln frequency, as monotone cubics.
#[derive(Debug, Clone, PartialEq)]
pub(super) struct Calibration {
    hz: Vec<f64>,
    /// Natural logarithm of the gain.
    size: Monotone,
    /// Phase in radians.
    phase: Option<Monotone>,
    coarsest: Option<Coarse>,
    limited_hz: Option<[f64; 2]>,
}

/// Neighbouring points that are far apart.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) struct Coarse {
    pub from_hz: f64,
    pub to_hz: f64,
    pub decibels: f64,
    pub degrees: f64,
}

impl Calibration {
    /// From the columns of a table, each (name, unit, values): frequency in Hz (or kHz), gain (a plain ratio, dB or %) and,
    /// where there is one, phase (degrees, or rad).
    ///
    /// # Errors
    /// `Malformed` for fewer than two points, frequencies that do not ascend, gains not above zero, and missing values;
    /// `Usage` for a gain in a physical unit, which would be a calibration and not a correction.
    pub fn from_columns(columns: &[(&str, &str, &[f64])]) -> Result<Calibration> {
        let [frequency, gain, rest @ ..] = columns else {
            return Err(Error::malformed("a response needs columns of frequency, gain and phase"));
        };
        let to_hz = match frequency.1 {
            "" | "Hz" => 1.0,
            "kHz" => 1e3,
            other => return Err(unit_fault(frequency.0, other, "Hz or kHz")),
        };
        let to_log: fn(f64) -> f64 = match gain.1 {
            "" | "1" => f64::ln,
            "dB" => |decibels| decibels * std::f64::consts::LN_10 / 20.0,
            "%" => |percent| (percent / 100.0).ln(),
            other => {
                return Err(unit_fault(gain.0, other, "a ratio, dB or %").remedy(
                    "divide by the sensitivity at the reference frequency; sensitivities belong to --calibrate",
                ));
            }
        };
        let phase = rest.first();
        let to_radians = match phase.map_or("", |column| column.1) {
            "" | "deg" | "°" | "degree" | "degrees" => std::f64::consts::PI / 180.0,
            "rad" => 1.0,
            other => return Err(unit_fault(phase.map_or("", |column| column.0), other, "deg or rad")),
        };
        let mut hz: Vec<f64> = frequency.2.iter().map(|f| f * to_hz).collect();
        let size: Vec<f64> = gain.2.iter().map(|&g| to_log(g)).collect();
        let phase: Option<Vec<f64>> = phase.map(|column| column.2.iter().map(|p| p * to_radians).collect());
        for row in 0..hz.len() {
            let at = |what: &str| {
                Error::malformed(what.to_owned()).at(Place { sample: Some(row as u64), ..Place::default() })
            };
            if !hz[row].is_finite() || hz[row] < 0.0 || (row > 0 && hz[row] <= hz[row - 1]) {
                return Err(at("frequencies must ascend from zero or above"));
            }
            if !size.get(row).is_some_and(|v| v.is_finite()) {
                return Err(at("no gain above zero"));
            }
            if phase.as_ref().is_some_and(|phase| !phase.get(row).is_some_and(|v| v.is_finite())) {
                return Err(at("no phase"));
            }
        }
        if hz.len() < 2 || (hz[0] == 0.0 && hz.len() < 3) {
            return Err(Error::malformed("a response needs two frequencies above zero"));
        }
        if hz[0] == 0.0 {
            // On a logarithmic scale zero stands a decade below the next point.
            hz[0] = hz[1] / 10.0;
        }
        let phase = phase.map(unwrapped);
        let coarsest = coarsest(&hz, &size, phase.as_deref());
        let limit = -BOOST.ln();
        let weak = || hz.iter().zip(&size).filter(|(_, v)| **v < limit).map(|(f, _)| *f);
        let limited_hz = weak().next().zip(weak().last()).map(|(from, to)| [from, to]);
        let axis: Vec<f64> = hz.iter().map(|f| f.ln()).collect();
        let curve = |y: Vec<f64>| {
            Monotone::through(axis.clone(), y).ok_or_else(|| Error::malformed("frequencies too close to be told apart"))
        };
        Ok(Calibration { size: curve(size)?, phase: phase.map(curve).transpose()?, hz, coarsest, limited_hz })
    }

    /// First and last frequency.
    pub fn span_hz(&self) -> [f64; 2] {
        [self.hz[0], self.hz[self.hz.len() - 1]]
    }

    /// True where the table has phases.
    pub fn has_phase(&self) -> bool {
        self.phase.is_some()
    }

    /// The neighbours that are farthest apart, where any are too far.
    pub fn coarsest(&self) -> Option<Coarse> {
        self.coarsest
    }

    /// First and last tabulated frequency at which the inverse is limited.
    pub fn limited_hz(&self) -> Option<[f64; 2]> {
        self.limited_hz
    }

    /// One over the response at a frequency, at most `BOOST`. Outside the table the gain is held; below it the phase goes to
    /// zero in proportion to frequency, since a record has no phase at zero frequency.
    pub fn inverse(&self, hz: f64) -> Complex<f64> {
        let low = self.hz[0];
        let at = hz.max(low).ln();
        let below = if hz < low { hz / low } else { 1.0 };
        let phase = self.phase.as_ref().map_or(0.0, |phase| phase.at(at) * below);
        Complex::from_polar((-self.size.at(at)).exp().min(BOOST), -phase)
    }

    /// Gain of the inverse at zero frequency, and its phase per Hz there, in radians.
    pub fn at_zero(&self) -> (f64, f64) {
        let at = self.hz[0].ln();
        let phase = self.phase.as_ref().map_or(0.0, |phase| phase.at(at));
        ((-self.size.at(at)).exp().min(BOOST), -phase / self.hz[0])
    }
}

fn unit_fault(name: &str, unit: &str, wanted: &str) -> Error {
    Error::usage(format!("the column \"{}\" is in {}, not in {wanted}", escape(name), escape(unit)))
        .remedy(format!("give it in {wanted}"))
}

/// Phases without jumps of whole turns, the first within half a turn of zero.
fn unwrapped(mut phases: Vec<f64>) -> Vec<f64> {
    let turn = std::f64::consts::TAU;
    let mut before = 0.0;
    for phase in &mut phases {
        *phase -= turn * ((*phase - before) / turn).round();
        before = *phase;
    }
    phases
}

/// The neighbours with the largest change, relative to what counts as coarse.
fn coarsest(hz: &[f64], size: &[f64], phase: Option<&[f64]>) -> Option<Coarse> {
    let found = (1..hz.len()).map(|n| Coarse {
        from_hz: hz[n - 1],
        to_hz: hz[n],
        decibels: (20.0 / std::f64::consts::LN_10 * (size[n] - size[n - 1])).abs(),
        degrees: phase.map_or(0.0, |p| (p[n] - p[n - 1]).abs().to_degrees()),
    });
    let excess = |c: &Coarse| (c.decibels / COARSE_DECIBELS).max(c.degrees / COARSE_DEGREES);
    found.max_by(|a, b| excess(a).total_cmp(&excess(b))).filter(|c| excess(c) > 1.0 + 1e-9)
}

#[cfg(test)]
mod tests {
    use super::*;

    /// A second-order sensor: 1/(1 - r^2 + 2 i zeta r).
    fn sensor(hz: f64, resonance_hz: f64, zeta: f64) -> Complex<f64> {
        let r = hz / resonance_hz;
        Complex::new(1.0 - r * r, 2.0 * zeta * r).inv()
    }

    fn table(per_decade: usize, zeta: f64) -> Calibration {
        let hz: Vec<f64> = (0..=3 * per_decade).map(|n| 10_f64.powf(n as f64 / per_decade as f64)).collect();
        let gain: Vec<f64> = hz.iter().map(|&f| sensor(f, 200.0, zeta).norm()).collect();
        let phase: Vec<f64> = hz.iter().map(|&f| sensor(f, 200.0, zeta).arg().to_degrees()).collect();
        let columns = [("f", "Hz", &hz[..]), ("gain", "", &gain[..]), ("phase", "deg", &phase[..])];
        Calibration::from_columns(&columns).expect("a table")
    }

    /// Largest relative error of the interpolated response up to a frequency where the inverse is not limited.
    fn error(per_decade: usize, zeta: f64) -> f64 {
        let table = table(per_decade, zeta);
        let at = |n: usize| 1.0 * 400_f64.powf(n as f64 / 2000.0);
        (0..=2000).map(|n| (table.inverse(at(n)) * sensor(at(n), 200.0, zeta) - 1.0).norm()).fold(0.0, f64::max)
    }

    #[test]
    fn a_damped_sensor_is_resolved_and_a_sharp_one_is_warned_about() {
        // Second-order sensor in closed form. Monotone cubics in ln f: a few thousandths at 10 points a decade, under one
        // thousandth at 20; linear interpolation would leave 1.8e-2 and 4.6e-3.
        let (ten, twenty) = (error(10, 0.6), error(20, 0.6));
        assert!(ten < 6e-3 && twenty < 1.5e-3, "{ten} {twenty}");
        assert!(table(20, 0.6).coarsest().is_none(), "{:?}", table(20, 0.6).coarsest());
        assert!(error(10, 0.05) > 0.1);
        let coarse = table(10, 0.05).coarsest().expect("coarse");
        assert!(coarse.from_hz < 201.0 && coarse.to_hz > 199.0, "{coarse:?}");
    }

    #[test]
    fn the_inverse_is_limited_and_held() {
        let table = table(20, 0.6);
        // (r^2 - 1)^2 + (1.2 r)^2 = 100 at r = 3.28: beyond 656 Hz the sensor is below -20 dB.
        let [from, to] = table.limited_hz().expect("limited");
        assert!((600.0..760.0).contains(&from) && to == 1000.0, "{from} {to}");
        assert!((table.inverse(900.0).norm() - BOOST).abs() < 1e-12);
        assert_eq!(table.inverse(5000.0), table.inverse(1000.0));
        assert_eq!(table.inverse(0.0), Complex::new(1.0 / sensor(1.0, 200.0, 0.6).norm(), 0.0));
    }

    #[test]
    fn units_are_followed_and_faults_told() {
        let f: &[f64] = &[0.001, 0.01, 0.1];
        let of = |gain: (&str, &[f64]), phase: (&str, &[f64])| {
            Calibration::from_columns(&[("f", "kHz", f), ("gain", gain.0, gain.1), ("phase", phase.0, phase.1)])
        };
        let table = of(("dB", &[0.0, 20.0, 0.0]), ("rad", &[0.0, 0.5, 6.4])).expect("a table");
        assert!((table.inverse(10.0) - Complex::from_polar(0.1, -0.5)).norm() < 1e-15);
        // 6.4 rad is a whole turn above 0.117.
        assert!((table.inverse(100.0).arg() + (6.4 - std::f64::consts::TAU)).abs() < 1e-12);
        let flat: (&str, &[f64]) = ("", &[1.0, 1.0, 1.0]);
        for (gain, phase) in [
            (("", &[1.0, 0.0, 1.0][..]), flat),
            (("", &[1.0, f64::NAN, 1.0][..]), flat),
            (("mV/g", &[1.0, 1.0, 1.0][..]), flat),
            (flat, ("grad", &[1.0, 1.0, 1.0][..])),
            (flat, ("", &[1.0, f64::NAN, 1.0][..])),
            (flat, ("", &[1.0][..])),
        ] {
            assert!(of(gain, phase).is_err(), "{gain:?} {phase:?}");
        }
        for f in [&[1.0, 1.0][..], &[2.0, 1.0], &[-1.0, 1.0], &[1.0], &[0.0, 1.0], &[]] {
            let ones = vec![1.0; f.len()];
            assert!(Calibration::from_columns(&[("f", "", f), ("gain", "", &ones)]).is_err(), "{f:?}");
        }
        let from_zero = Calibration::from_columns(&[("f", "", &[0.0, 1.0, 10.0]), ("gain", "", &[2.0, 1.0, 1.0])]);
        assert_eq!(from_zero.expect("a table").inverse(0.0), Complex::new(0.5, 0.0));
    }
}
