//! The density by sine tapers: the whole record at once, averaged over orthogonal windows instead of segments.

use rayon::prelude::*;

use super::density::{Correlation, Density};
use super::detrend::Detrend;
use crate::basis::Planner;
use crate::ends::Ends;
use crate::error::{Error, Result};
use crate::numeric::sum;

/// More tapers than this gain little (3 % random error) and cost time at every line.
pub const MOST_TAPERS: u32 = 1000;

/// The density of `samples` at `rate` per second or metre by `tapers` sine tapers at every line. Source and normalisation:
/// [`crate::spectrum`].
///
/// # Errors
/// `Unsupported` for no taper, more than [`MOST_TAPERS`], or more than the record has samples.
pub fn sine(samples: &[f64], rate: f64, tapers: u32, detrend: Detrend, planner: &Planner) -> Result<Density> {
    if tapers == 0 || tapers > MOST_TAPERS || tapers as usize > samples.len() {
        let most = (MOST_TAPERS as usize).min(samples.len());
        return Err(Error::unsupported(format!("{tapers} sine tapers for a record of {} samples", samples.len()))
            .remedy(format!("give a number from 1 to {most}")));
    }
    let record = prepared(samples, detrend)?;
    let phasors = Phasors::of(&record, planner)?;
    let mut density = phasors.density(rate, &vec![tapers; phasors.lines()]);
    density.weighted_mean_square = Some(weighted_mean_square(&record, tapers));
    density.mean_square = sum::rms(&record).powi(2);
    Ok(density)
}

/// The record without its trend; what would belong to a segment belongs to the one segment there is.
pub(super) fn prepared(samples: &[f64], detrend: Detrend) -> Result<Vec<f64>> {
    let mut record = detrend.of_record(samples)?;
    detrend.of_segment(&mut record)?;
    Ok(record)
}

/// (1/K) sum over tapers and samples of (v x)^2, by sum_j sin^2(j a) = K/2 - (sin((2K+1) a)/sin(a) - 1)/4.
fn weighted_mean_square(record: &[f64], tapers: u32) -> f64 {
    let (len, count) = (record.len() as f64 + 1.0, f64::from(tapers));
    let terms: Vec<f64> = record
        .iter()
        .enumerate()
        .map(|(n, x)| {
            let angle = std::f64::consts::PI * (n as f64 + 1.0) / len;
            let weight = count / 2.0 - (((2.0 * count + 1.0) * angle).sin() / angle.sin() - 1.0) / 4.0;
            x * x * weight
        })
        .collect();
    sum::sum(&terms) * 2.0 / (len * count)
}

/// The record on n = 1..N, transformed at twice N + 1 points: line q of taper j is Y(2q - j) - Y(2q + j) but for a factor.
pub(super) struct Phasors {
    /// Number of samples.
    len: usize,
    /// Real and imaginary parts of Y at 0..=N+1.
    parts: Vec<[f64; 2]>,
}

impl Phasors {
    pub(super) fn of(record: &[f64], planner: &Planner) -> Result<Phasors> {
        let len = record.len();
        let period = 2 * (len + 1);
        // The sample before the first is zero, so that the first stands at n = 1: the tapers' own phase.
        let mut work = vec![0.0; period];
        work[1..=len].copy_from_slice(record);
        let plan = planner.plan(Ends::Periodic, period)?;
        plan.forward(&mut work, &mut vec![0.0; plan.scratch_len()]);
        let (single, pair) = ((period as f64).sqrt(), (period as f64 / 2.0).sqrt());
        let part = |k: usize| match k {
            0 => [single * work[0], 0.0],
            k if 2 * k == period => [single * work[period - 1], 0.0],
            k => [pair * work[2 * k - 1], -pair * work[2 * k]],
        };
        Ok(Phasors { len, parts: (0..=len + 1).map(part).collect() })
    }

    /// Lines from zero to the Nyquist frequency.
    pub(super) fn lines(&self) -> usize {
        self.len.div_ceil(2) + 1
    }

    /// Y at any index of the period.
    fn at(&self, index: i64) -> [f64; 2] {
        let period = 2 * (self.len as i64 + 1);
        let inside = index.rem_euclid(period);
        if inside <= period / 2 {
            self.parts[inside as usize]
        } else {
            let [re, im] = self.parts[(period - inside) as usize];
            [re, -im]
        }
    }

    /// The density with so many tapers at every line; mean squares are the caller's.
    pub(super) fn density(&self, rate: f64, counts: &[u32]) -> Density {
        let points = self.len + 1;
        let values: Vec<f64> = (0..counts.len())
            .into_par_iter()
            .map(|q| {
                let count = i64::from(counts[q]);
                let centre = 2 * q as i64;
                let mut total = 0.0;
                for j in 1..=count {
                    let ([a, b], [c, d]) = (self.at(centre - j), self.at(centre + j));
                    total += (a - c) * (a - c) + (b - d) * (b - d);
                }
                let at_end = q == 0 || 2 * q == points;
                let sides = if at_end { 1.0 } else { 2.0 };
                sides * total / (2.0 * points as f64 * rate * count as f64)
            })
            .collect();
        let most = counts.iter().copied().max().unwrap_or(1);
        let bandwidths = bandwidths(points, most);
        Density {
            spacing: rate / points as f64,
            rate,
            values,
            freedom: counts.iter().enumerate().map(|(q, &count)| freedom(points, q, count)).collect(),
            bandwidth: counts.iter().map(|&count| rate * bandwidths[count as usize]).collect(),
            correlation: Correlation::Tapers(counts.to_vec()),
            weighted_mean_square: None,
            mean_square: 0.0,
        }
    }
}

/// Effective noise bandwidth in cycles per sample by number of tapers: the inverse of the estimate's response to a tone on
/// the line, (1/K) sum_j |sum_n v_j|^2, where sum_n v_j = sqrt(2/(N+1)) cot(pi j/(2(N+1))) for odd j and 0 for even.
fn bandwidths(points: usize, most: u32) -> Vec<f64> {
    let mut response = 0.0;
    let mut found = vec![f64::NAN; 1];
    for j in 1..=most {
        if j % 2 == 1 {
            let cotangent = (std::f64::consts::PI * f64::from(j) / (2.0 * points as f64)).tan().recip();
            response += 2.0 / points as f64 * cotangent * cotangent;
        }
        found.push(f64::from(j) / response);
    }
    found
}

/// Degrees of freedom of `count` tapers at line `q` of a flat density: 2K, fewer near zero and near the Nyquist frequency.
///
/// Tapers j and l at line q also see the mirror image of the line: p = sum_n v_j v_l exp(-2 i a n), a the line's angle from the
/// end. Its real part is 1/2 where |j - l| or j + l is four times the line's distance from the end, 1 for j = l at the end
/// itself; its imaginary part is a sum of cotangents where j - l is odd. The variance of the estimate is that of independent
/// coefficients times 1 + (sum of |p|^2)/K.
fn freedom(points: usize, q: usize, count: u32) -> f64 {
    let tapers = i64::from(count);
    let to_end = (4 * q as i64).min(2 * points as i64 - 4 * q as i64).abs();
    let squares = if to_end == 0 {
        tapers as f64
    } else {
        let differing = 2 * (tapers - to_end).max(0);
        let adding = (to_end - 1).min(2 * tapers + 1 - to_end).max(0);
        (differing + adding) as f64 / 4.0 + imaginary_squares(points, to_end, tapers)
    };
    2.0 * tapers as f64 / (1.0 + squares / tapers as f64)
}

/// Sum over all pairs of tapers of the squared imaginary part of p: with d = |j - l| and s = j + l, both odd, p is A(d) - A(s),
/// A(m) = (cot(b (e + m)) + cot(b (e - m)))/(2(N+1)), b = pi/(2(N+1)), e four times the distance from the end.
fn imaginary_squares(points: usize, to_end: i64, tapers: i64) -> f64 {
    if to_end > 4 * tapers {
        return 0.0; // below a thousandth of the tapers
    }
    let unit = std::f64::consts::PI / (2.0 * points as f64);
    let cotangent = |m: i64| (unit * m as f64).tan().recip();
    let part = |m: i64| (cotangent(to_end + m) + cotangent(to_end - m)) / (2.0 * points as f64);
    // Sums over odd s below each: entry i covers s = 1, 3, ..., 2i - 1.
    let (mut sums, mut squares) = (vec![0.0], vec![0.0]);
    for i in 0..tapers {
        let value = part(2 * i + 1);
        sums.push(sums[i as usize] + value);
        squares.push(squares[i as usize] + value * value);
    }
    let mut total = 0.0;
    for d in (1..tapers).step_by(2) {
        // s runs over d + 2, d + 4, ..., 2K - d.
        let (from, to) = ((d + 1) as usize / 2, (2 * tapers - d + 1) as usize / 2);
        let value = part(d);
        let pairs = (to - from) as f64;
        total += pairs * value * value - 2.0 * value * (sums[to] - sums[from]) + squares[to] - squares[from];
    }
    2.0 * total
}

#[cfg(test)]
mod tests {
    use super::*;

    /// The definition: every taper written out, every line by its own sum.
    fn definition(record: &[f64], rate: f64, tapers: u32) -> Vec<f64> {
        let points = record.len() + 1;
        (0..=points / 2)
            .map(|q| {
                let mut total = 0.0;
                for j in 1..=tapers {
                    let (mut re, mut im) = (0.0, 0.0);
                    for (n, x) in record.iter().enumerate() {
                        let n = n as f64 + 1.0;
                        let taper = (2.0 / points as f64).sqrt()
                            * (std::f64::consts::PI * f64::from(j) * n / points as f64).sin();
                        let angle = std::f64::consts::TAU * q as f64 * n / points as f64;
                        re += taper * x * angle.cos();
                        im += taper * x * angle.sin();
                    }
                    total += re * re + im * im;
                }
                let sides = if q == 0 || 2 * q == points { 1.0 } else { 2.0 };
                sides * total / (rate * f64::from(tapers))
            })
            .collect()
    }

    #[test]
    fn fast_and_written_out_agree_for_even_and_odd_lengths() {
        for len in [1_usize, 2, 7, 16, 33, 64] {
            let record: Vec<f64> = (0..len).map(|n| (0.3 + 1.7 * n as f64).sin() + 0.2 * (n % 5) as f64).collect();
            for tapers in [1_u32, 2, 5, 16] {
                if tapers as usize > len {
                    assert!(sine(&record, 2.5, tapers, Detrend::None, &Planner::new()).is_err());
                    continue;
                }
                let fast = sine(&record, 2.5, tapers, Detrend::None, &Planner::new()).unwrap();
                let slow = definition(&record, 2.5, tapers);
                assert_eq!(fast.len(), slow.len());
                let largest = slow.iter().copied().fold(0.0, f64::max);
                for (q, (a, b)) in fast.values.iter().zip(&slow).enumerate() {
                    assert!((a - b).abs() < 1e-13 * largest, "{len} {tapers} {q}: {a} {b}");
                }
                // The sum over the lines is the mean square under the tapers' weights, exactly.
                let weighted = fast.weighted_mean_square.unwrap();
                assert!((fast.sum() - weighted).abs() < 1e-12 * weighted, "{len} {tapers}");
            }
        }
    }

    #[test]
    fn tapers_are_the_published_ones() {
        // Riedel and Sidorenko 1995: v_1(1), v_1(2) for N = 16; orthonormal. An impulse shows a taper's square at zero.
        for (at, value) in [(0, 0.06302556), (1, 0.12390487)] {
            let mut impulse = vec![0.0; 16];
            impulse[at] = 1.0;
            let density = sine(&impulse, 1.0, 1, Detrend::None, &Planner::new()).unwrap();
            let found: f64 = density.values[0];
            assert!((found.sqrt() - value).abs() < 1e-8, "{found}");
        }
    }

    #[test]
    fn a_tone_shows_its_power_through_the_bandwidth() {
        // On a line, far from both ends: density times bandwidth is the tone's mean square.
        let len = 2047;
        for tapers in [1, 4, 9] {
            let tone: Vec<f64> =
                (0..len).map(|n| (std::f64::consts::TAU * 300.0 * n as f64 / (len as f64 + 1.0)).cos()).collect();
            let density = sine(&tone, 50.0, tapers, Detrend::None, &Planner::new()).unwrap();
            let power = density.values[300] * density.bandwidth[300];
            // The image at -300 leaks in by about (K/600)^2.
            assert!((power - 0.5).abs() < 1e-3, "{tapers}: {power}");
        }
    }

    #[test]
    fn degrees_of_freedom_near_the_ends_are_those_of_the_covariances_written_out() {
        let tau = std::f64::consts::TAU;
        for (len, tapers) in [(199_usize, 8_usize), (200, 5), (64, 7), (30, 1)] {
            let points = len + 1;
            let taper =
                |j: usize, n: usize| (2.0 / points as f64).sqrt() * (tau / 2.0 * (j * n) as f64 / points as f64).sin();
            for q in 0..=points / 2 {
                let mut squares = 0.0;
                for j in 1..=tapers {
                    for l in 1..=tapers {
                        let (mut re, mut im) = (0.0, 0.0);
                        for n in 1..=len {
                            let angle = 2.0 * tau * q as f64 * n as f64 / points as f64;
                            re += taper(j, n) * taper(l, n) * angle.cos();
                            im += taper(j, n) * taper(l, n) * angle.sin();
                        }
                        squares += re * re + im * im;
                    }
                }
                let count = tapers as f64;
                let expected = 2.0 * count * count / (count + squares);
                let found = freedom(points, q, tapers as u32);
                // Beyond four times as many lines as tapers the imaginary parts are left out.
                assert!((found / expected - 1.0).abs() < 1e-3, "{len} {tapers} {q}: {found} {expected}");
            }
        }
    }
}
