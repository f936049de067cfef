//! How fast the coefficients of an extension fall: as k^-1 after a jump, k^-2 after a kink, faster when smoother.

use super::Subject;

/// Octaves count while their mean energy exceeds that of the top octave this many times.
const ABOVE_FLOOR: f64 = 10.0;
/// A slope needs so many octaves.
const FEWEST_OCTAVES: usize = 3;

/// The exponent p of |c(k)| ~ k^-p: half the slope of a straight line through the mean energies of the octaves above the
/// floor, both logarithmic. Absent when fewer than three octaves stand out. It tells a jump from none; under noise it
/// does not tell smoother extensions apart.
pub fn exponent(subject: &Subject) -> Option<f64> {
    if subject.is_spent {
        return None;
    }
    let octaves = octaves(subject);
    let floor = octaves.last()?.1 * ABOVE_FLOOR;
    let points: Vec<(f64, f64)> =
        octaves.iter().take_while(|(_, energy)| *energy > floor).map(|(k, e)| (k.ln(), e.ln())).collect();
    if points.len() < FEWEST_OCTAVES {
        return None;
    }
    let count = points.len() as f64;
    let (x, y) = points.iter().fold((0.0, 0.0), |(a, b), (x, y)| (a + x / count, b + y / count));
    let cross: f64 = points.iter().map(|p| (p.0 - x) * (p.1 - y)).sum();
    let spread: f64 = points.iter().map(|p| (p.0 - x) * (p.0 - x)).sum();
    Some(-0.5 * cross / spread)
}

/// Mean half cycles and mean energy of each octave from one cycle of the lowest function upwards.
fn octaves(subject: &Subject) -> Vec<(f64, f64)> {
    // The lowest function that is not constant: one whole cycle (periodic), one half, or a quarter cycle (mixed ends).
    let lowest = (0..subject.coefficients.len()).map(|k| subject.half_cycles(k)).find(|h| *h > 0.0).unwrap_or(1.0);
    let mut octaves: Vec<(f64, f64, f64)> = Vec::new();
    for (k, c) in subject.coefficients.iter().enumerate() {
        let half_cycles = subject.half_cycles(k);
        if half_cycles <= 0.0 {
            continue;
        }
        // A hair above, so that exact powers of two do not fall below their octave by rounding.
        let octave = (half_cycles / lowest * (1.0 + 1e-12)).log2().floor() as usize;
        if octaves.len() <= octave {
            octaves.resize(octave + 1, (0.0, 0.0, 0.0));
        }
        let (count, places, energy) = &mut octaves[octave];
        *count += 1.0;
        *places += half_cycles;
        *energy += c * c;
    }
    // A top octave cut short by the end of the basis would be an unsteady floor.
    if let [.., below, top] = octaves[..]
        && top.0 < below.0
    {
        octaves.pop();
    }
    octaves.into_iter().filter(|o| o.0 > 0.0).map(|(count, places, energy)| (places / count, energy / count)).collect()
}
