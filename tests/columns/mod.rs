//! Invented time columns whose truth is known, and what a reading of them got wrong.

use endgrain::audit::stamps::{Beside, StampReading};
use endgrain::record::{Spacing, Stamps};
use endgrain::unit::Unit;

use super::random::Random;

/// A column and its truth.
pub struct Column {
    pub stamps: Stamps,
    pub step: f64,
    pub resolution: f64,
    /// Standard deviation of the sampling instants, in steps.
    pub jitter: f64,
    pub missing: u64,
    pub truncated: bool,
}

/// Stamps of integer ticks in seconds, first data row on line 2.
pub fn stamps(tick: f64, resolution: f64, ticks: Vec<i64>) -> Stamps {
    let first = ticks.first().copied().unwrap_or(0);
    Stamps {
        name: "t".to_owned(),
        unit: Unit::parse("s"),
        tick,
        first: first as f64 * tick,
        ticks: ticks.into_iter().map(|t| t - first).collect(),
        resolution,
        civil: None,
        first_line: 2,
    }
}

impl Column {
    /// Step and print resolution (1e-4 to 0.48 of the step), length, jitter (none, or 0.012 to 0.1 steps), missing rows
    /// (0 to 2 %) and rounding or truncation all drawn at random.
    pub fn draw(random: &mut Random) -> Column {
        let resolution = 10f64.powi(-((random.uniform() * 7.0) as i32));
        let ratio = random.logarithmic(1e-4, 0.48);
        let step = resolution / ratio;
        let rows = random.logarithmic(150.0, 6000.0) as usize;
        let jitter = if random.uniform() < 0.5 { 0.0 } else { 0.012 + 0.088 * random.uniform() };
        let loss = if random.uniform() < 0.4 { 0.0 } else { 0.02 * random.uniform() };
        let truncated = random.uniform() < 0.5;
        let start = 1000.0 * step * random.uniform();
        let mut missing = 0;
        let mut skipped = 0;
        let mut ticks = Vec::with_capacity(rows);
        for n in 0..rows {
            let edge = n == 0 || n + 1 == rows;
            if !edge && random.uniform() < loss {
                skipped += 1;
                continue;
            }
            missing += std::mem::take(&mut skipped);
            let instant = (start + (n as f64 + jitter * random.normal()) * step) / resolution;
            ticks.push(if truncated { instant.floor() } else { instant.round() } as i64);
        }
        Column { stamps: stamps(resolution, resolution, ticks), step, resolution, jitter, missing, truncated }
    }

    /// What the reading got wrong; empty when nothing.
    pub fn faults(&self, reading: &StampReading) -> Vec<&'static str> {
        let mut faults = Vec::new();
        let (j, q) = (self.jitter, self.resolution / self.step);
        let kind_is_right = match reading.spacing {
            Spacing::Uniform => j == 0.0,
            // Jitter below the print resolution is no jitter that matters.
            Spacing::NearUniform => j > 0.0 && j <= 0.005 + q / 2.0,
            Spacing::Jittered => j > 0.0,
            _ => false,
        };
        if !kind_is_right {
            faults.push("kind");
        }
        if reading.missing != self.missing {
            faults.push("missing");
        }
        if reading.spacing == Spacing::Uniform {
            let inside = reading.interval.is_some_and(|[low, high]| (low..=high).contains(&self.step));
            if !inside && j == 0.0 {
                faults.push("interval");
            }
            if reading.missing > self.missing {
                faults.push("invented");
            }
        }
        faults
    }
}

/// The reading of a column without anything known beside it.
pub fn read(stamps: &Stamps) -> StampReading {
    StampReading::new(stamps, &Beside { step: None, same_row: &|_| true })
}
