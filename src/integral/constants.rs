//! From end conditions to the constants of an integral: initial values, offset and drift of the sensor.

use crate::error::{Error, Result};
use crate::numeric::least_squares;
use crate::numeric::polynomial::Polynomial;
use crate::numeric::sum;

/// End conditions with every number in steps: displacements in the record's unit times steps squared, stretches as shares
/// of the record's length.
#[derive(Debug, Clone, PartialEq)]
pub enum Solver {
    /// Nothing to solve.
    StartRest,
    /// v(L) = 0.
    Rest,
    /// v(L) = 0 and d(L) given.
    RestTo(f64),
    /// d(L) given, solved by the offset.
    StartRestTo(f64),
    /// d(L) given, solved by the initial velocity.
    Pinned(f64),
    /// v(L) = v(0), d(L) = d(0), mean d = 0.
    ZeroMean,
    /// Least mean square of the result; with drift or without.
    Steady {
        /// Whether drift is solved.
        drift: bool,
    },
    /// Least mean square of the first integral over stretches, as shares of the length.
    Still(Vec<[f64; 2]>),
}

/// Where V and D arrive at u = L.
#[derive(Debug, Clone, Copy, PartialEq, Default)]
pub struct Arrival {
    /// V(L).
    pub first: f64,
    /// D(L); 0 for a single integral.
    pub second: f64,
}

/// The integral of a record that starts at rest, sampled.
#[derive(Debug, Clone, Copy)]
pub struct AtRest<'a> {
    /// -1 or -2.
    pub turns: i32,
    /// V (one integral) or D (two) at the samples.
    pub samples: &'a [f64],
    /// u of sample 0.
    pub position: f64,
    /// Distance of samples in u.
    pub spacing: f64,
    /// L.
    pub length: f64,
    /// At u = L.
    pub arrival: Arrival,
}

/// v0, d0, b and c of the formulas in [`crate::integral`], in the record's unit and steps.
#[derive(Debug, Clone, Copy, PartialEq, Default)]
pub struct Constants {
    /// Value of the first integral at u = 0.
    pub first: f64,
    /// Value of the second integral at u = 0.
    pub second: f64,
    /// Offset of the sensor that is taken off.
    pub offset: f64,
    /// Drift of the sensor that is taken off, per step about the middle.
    pub drift: f64,
}

impl Constants {
    /// What is added to an integral that starts at rest.
    pub fn at(&self, turns: i32, u: f64, length: f64) -> f64 {
        if turns == -1 {
            self.first + u * (self.drift * length / 2.0 - self.offset - self.drift * u / 2.0)
        } else {
            let square = self.drift * length / 4.0 - self.offset / 2.0 - self.drift * u / 6.0;
            self.second + u * (self.first + u * square)
        }
    }

    /// What is added to the record itself: minus offset and drift.
    pub fn of_record(&self, u: f64, length: f64) -> f64 {
        -self.offset - self.drift * (u - length / 2.0)
    }

    /// Where the integral arrives with these constants.
    pub fn arrival(&self, rest: Arrival, length: f64) -> Arrival {
        Arrival { first: rest.first + self.at(-1, length, length), second: rest.second + self.at(-2, length, length) }
    }
}

impl Solver {
    /// The same conditions with nothing displaced: what an error of the record, such as its noise, meets.
    #[must_use]
    pub fn homogeneous(&self) -> Solver {
        match self {
            Solver::RestTo(_) => Solver::RestTo(0.0),
            Solver::StartRestTo(_) => Solver::StartRestTo(0.0),
            Solver::Pinned(_) => Solver::Pinned(0.0),
            other => other.clone(),
        }
    }

    /// Solves the constants. `offset` is a given one, for the conditions that do not solve it; `velocity` forms the first
    /// integral at the samples, which only `Still` needs beside a second one.
    ///
    /// # Errors
    /// `Usage` when a stretch holds fewer than two samples; whatever `velocity` fails with.
    pub fn solve(
        &self,
        rest: &AtRest<'_>,
        offset: f64,
        velocity: impl FnOnce() -> Result<Vec<f64>>,
    ) -> Result<Constants> {
        let (l, first, second) = (rest.length, rest.arrival.first, rest.arrival.second);
        let none = Constants { offset, ..Constants::default() };
        if l <= 0.0 {
            return Ok(none);
        }
        Ok(match self {
            Solver::StartRest => none,
            Solver::Rest => Constants { offset: first / l, ..none },
            Solver::RestTo(d) => {
                let offset = first / l;
                Constants { offset, drift: 12.0 * (d - second + offset * l * l / 2.0) / (l * l * l), ..none }
            }
            Solver::StartRestTo(d) => Constants { offset: 2.0 * (second - d) / (l * l), ..none },
            Solver::Pinned(d) => Constants { first: (d - second + offset * l * l / 2.0) / l, ..none },
            Solver::ZeroMean => zero_mean(rest),
            Solver::Steady { drift } => steady(rest, *drift),
            Solver::Still(stretches) => {
                let formed;
                let samples = if rest.turns == -1 {
                    rest.samples
                } else {
                    formed = velocity()?;
                    &formed
                };
                still(rest, samples, stretches)?
            }
        })
    }
}

fn place(rest: &AtRest<'_>, n: usize) -> f64 {
    rest.position + n as f64 * rest.spacing
}

/// Over whole cycles the harmonics have no mean: what is left of the samples' mean belongs to the polynomial.
fn zero_mean(rest: &AtRest<'_>) -> Constants {
    let l = rest.length;
    let offset = rest.arrival.first / l;
    if rest.turns == -1 {
        let level = Constants { offset, ..Constants::default() };
        return Constants { first: -mean_with(rest, &level), ..level };
    }
    let first = -(rest.arrival.second - offset * l * l / 2.0) / l;
    let sloped = Constants { first, offset, ..Constants::default() };
    Constants { second: -mean_with(rest, &sloped), ..sloped }
}

fn mean_with(rest: &AtRest<'_>, constants: &Constants) -> f64 {
    let corrected: Vec<f64> = (0..rest.samples.len())
        .map(|n| rest.samples[n] + constants.at(rest.turns, place(rest, n), rest.length))
        .collect();
    sum::mean(&corrected)
}

/// Takes the least-squares polynomial off: of degree 2 or 3 from a second integral, 1 or 2 from a first.
fn steady(rest: &AtRest<'_>, drift: bool) -> Constants {
    let degree = if rest.turns == -1 { 1 } else { 2 } + u8::from(drift);
    let points = (0..rest.samples.len()).map(|n| (place(rest, n), rest.samples[n]));
    let half = rest.spacing / 2.0;
    let last = place(rest, rest.samples.len().saturating_sub(1));
    let fitted = least_squares::polynomial(points, rest.position - half, last + half, degree);
    from_fit(&fitted, rest.turns, rest.length)
}

fn still(rest: &AtRest<'_>, velocity: &[f64], stretches: &[[f64; 2]]) -> Result<Constants> {
    // Rounding of a bound by a hundredth of a step does not matter.
    let slack = 0.01 * rest.spacing / rest.length;
    let inside = |u: f64, s: &[f64; 2]| u / rest.length >= s[0] - slack && u / rest.length <= s[1] + slack;
    for stretch in stretches {
        let count = (0..velocity.len()).filter(|&n| inside(place(rest, n), stretch)).take(2).count();
        if count < 2 {
            return Err(Error::usage("a stretch of --conditions still holds fewer than two samples")
                .remedy("name stretches inside the record, from its first stamp to its last"));
        }
    }
    let points = (0..velocity.len())
        .map(|n| (place(rest, n), velocity[n]))
        .filter(|(u, _)| stretches.iter().any(|stretch| inside(*u, stretch)));
    // One stretch tells offset and drift apart too poorly to carry them through the rest of the record.
    let degree = if stretches.len() > 1 { 2 } else { 1 };
    let fitted = least_squares::polynomial(points, 0.0, rest.length, degree);
    Ok(Constants { second: 0.0, ..from_fit(&fitted, -1, rest.length) })
}

/// The constants whose polynomial is minus the fitted one.
fn from_fit(fitted: &Polynomial, turns: i32, length: f64) -> Constants {
    let slope = fitted.derivative();
    let bend = slope.derivative();
    if turns == -1 {
        let drift = bend.at(0.0);
        let offset = slope.at(0.0) + drift * length / 2.0;
        return Constants { first: -fitted.at(0.0), second: 0.0, offset, drift };
    }
    let drift = bend.derivative().at(0.0);
    let offset = bend.at(0.0) + drift * length / 2.0;
    Constants { first: -slope.at(0.0), second: -fitted.at(0.0), offset, drift }
}

#[cfg(test)]
mod tests {
    use super::*;

    const L: f64 = 10.0;

    /// D and V of a = 1 + 0.3 u - 0.05 u^2 that start at rest, on `count` midpoints.
    fn motion(turns: i32, count: usize) -> (Vec<f64>, Vec<f64>, Arrival) {
        let v = |u: f64| u + 0.15 * u * u - 0.05 / 3.0 * u.powi(3);
        let d = |u: f64| u * u / 2.0 + 0.05 * u.powi(3) - 0.05 / 12.0 * u.powi(4);
        let places = (0..count).map(|n| (n as f64 + 0.5) * L / count as f64);
        let velocity: Vec<f64> = places.clone().map(v).collect();
        let samples = if turns == -1 { velocity.clone() } else { places.map(d).collect() };
        (samples, velocity, Arrival { first: v(L), second: if turns == -1 { 0.0 } else { d(L) } })
    }

    fn solved(solver: &Solver, turns: i32, offset: f64) -> (Constants, Vec<f64>, Arrival) {
        let count = 400;
        let (samples, velocity, arrival) = motion(turns, count);
        let spacing = L / count as f64;
        let rest = AtRest { turns, samples: &samples, position: spacing / 2.0, spacing, length: L, arrival };
        let constants = solver.solve(&rest, offset, || Ok(velocity)).expect("constants");
        let output = (0..count).map(|n| samples[n] + constants.at(turns, place(&rest, n), L)).collect();
        (constants, output, constants.arrival(arrival, L))
    }

    #[test]
    fn every_condition_is_met() {
        // Values up to some hundreds, a few roundings each.
        let near = |a: f64, b: f64| (a - b).abs() < 1e-11;
        let (c, _, end) = solved(&Solver::Rest, -2, 0.0);
        assert!(near(end.first, 0.0) && c.first == 0.0 && c.second == 0.0 && c.drift == 0.0);
        let (c, _, end) = solved(&Solver::RestTo(2.5), -2, 0.0);
        assert!(near(end.first, 0.0) && near(end.second, 2.5) && c.first == 0.0);
        let (c, _, end) = solved(&Solver::StartRestTo(2.5), -2, 0.0);
        assert!(near(end.second, 2.5) && c.first == 0.0 && c.drift == 0.0);
        let (c, _, end) = solved(&Solver::Pinned(-1.0), -2, 0.25);
        assert!(near(end.second, -1.0) && c.offset == 0.25 && c.second == 0.0);
        let (c, _, _) = solved(&Solver::StartRest, -2, 0.25);
        assert!(near(c.at(-2, L, L), -12.5)); // b L^2 / 2
        let (_, output, end) = solved(&Solver::ZeroMean, -2, 0.0);
        assert!(near(sum::mean(&output), 0.0) && near(end.first, solved(&Solver::ZeroMean, -2, 0.0).0.first));
        assert!(near(end.second, solved(&Solver::ZeroMean, -2, 0.0).0.second));
    }

    #[test]
    fn a_steady_result_is_orthogonal_to_its_polynomials() {
        for (turns, drift, degree) in [(-2, true, 3), (-2, false, 2), (-1, true, 2), (-1, false, 1)] {
            let (_, output, _) = solved(&Solver::Steady { drift }, turns, 0.0);
            for power in 0..=degree {
                let moment: f64 =
                    output.iter().enumerate().map(|(n, v)| v * ((n as f64 + 0.5) / 200.0 - 1.0).powi(power)).sum();
                // 400 values up to 100, cancelling.
                assert!(moment.abs() < 1e-9, "{turns} {drift} {power}: {moment}");
            }
        }
    }

    #[test]
    fn a_record_of_offset_and_drift_alone_is_solved_to_nothing() {
        // a = b + c (u - L/2): every condition that solves both must find them again.
        let (b, c) = (0.4, -0.03);
        let v = |u: f64| b * u + c * (u * u - L * u) / 2.0;
        let d = |u: f64| b * u * u / 2.0 + c * (u.powi(3) / 6.0 - L * u * u / 4.0);
        let places: Vec<f64> = (0..100).map(|n| (f64::from(n) + 0.5) * L / 100.0).collect();
        let second: Vec<f64> = places.iter().map(|&u| d(u)).collect();
        let first: Vec<f64> = places.iter().map(|&u| v(u)).collect();
        let rest = AtRest {
            turns: -2,
            samples: &second,
            position: 0.05,
            spacing: 0.1,
            length: L,
            arrival: Arrival { first: v(L), second: d(L) },
        };
        let windows = Solver::Still(vec![[0.0, 0.2], [0.8, 1.0]]);
        for solver in [Solver::RestTo(0.0), Solver::Steady { drift: true }, windows] {
            let found = solver.solve(&rest, 0.0, || Ok(first.clone())).expect("constants");
            assert!((found.offset - b).abs() < 1e-12 && (found.drift - c).abs() < 1e-12, "{solver:?} {found:?}");
            assert!(found.first.abs() < 1e-11 && found.second.abs() < 1e-11, "{solver:?} {found:?}");
        }
        let outside = Solver::Still(vec![[1.5, 2.0]]);
        assert!(outside.solve(&rest, 0.0, || Ok(first)).is_err());
    }
}
