//! Interpolates samples taken at uneven instants onto an even grid.

use crate::audit::fault::figure;
use crate::audit::stamps::StampReading;
use crate::error::{Error, Finding, Result};
use crate::numeric::fourier::energy_above;
use crate::numeric::quantile::median;
use crate::numeric::spline::cubic_spline;
use crate::numeric::sum::{mean, rms, standard_deviation};
use crate::numeric::uneven::on_grid;
use crate::place::Place;
use crate::record::{Axis, Spacing};

use super::band::edge_frequency;
use super::regular::Regular;
use super::table::Table;
use super::{Regrid, RowMap, fill};

/// Band edge in cycles per sample above which a cubic spline leaves more than a thousandth of the RMS.
const CUBIC_BAND: f64 = 0.2;
/// Part of the power in the last tenth of the band from which content beyond the band is likely.
const FOLDED: f64 = 0.01;

/// True for stamps that jitter or drift, or that deviate at all where the user asks for it; never against a given rate.
pub fn wanted(table: &Table, reading: &StampReading, regrid: Option<Regrid>) -> bool {
    let given = table.raw.stated_rate.as_ref().is_some_and(|rate| rate.given);
    let by_itself = matches!(reading.spacing, Spacing::Jittered | Spacing::Drifting);
    match regrid {
        Some(Regrid::Off) => false,
        Some(Regrid::Cubic | Regrid::LeastSquares) => !given && (by_itself || reading.spacing == Spacing::NearUniform),
        None => !given && by_itself,
    }
}

/// The record on the even grid of `axis`, its phase the median of the stamps'. Missing rows are filled afterwards. Where
/// nobody chose, a cubic spline serves content below a fifth of the rate, the least-squares series what lies above.
pub fn regrid(
    mut table: Table,
    reading: &StampReading,
    axis: Axis,
    how: Option<Regrid>,
    findings: &mut Vec<Finding>,
) -> Result<Regular> {
    let Some(stamps) = &table.raw.stamps else { return Err(Error::usage("there are no stamps to regrid from")) };
    if reading.missing > table.len() as u64 {
        let what = format!("{} of {} rows are missing", reading.missing, axis.len());
        return Err(Error::unsupported(what).remedy("--from and --to cut out a stretch that is there"));
    }
    let (step, len) = (axis.step(), axis.len());
    let positions = reading.positions(stamps);
    let indices: Vec<u64> = reading.indices().collect();
    let mut phases: Vec<f64> = positions.iter().zip(&indices).map(|(x, &n)| x - n as f64 * step).collect();
    let phase = median(&mut phases).unwrap_or(0.0);
    let x: Vec<f64> = positions.iter().map(|x| (x - phase) / step).collect();
    if x.windows(2).any(|pair| pair[1] <= pair[0]) {
        let remedy = "--regrid off takes the rows as evenly spaced";
        return Err(Error::unsupported("stamps coincide: no spline passes through them").remedy(remedy));
    }
    let mut there = vec![false; len];
    indices.iter().for_each(|&n| there[(n as usize).min(len - 1)] = true);
    let deviation = reading.scatter.map_or(0.0, |s| s.deviation_steps.max(s.drift_steps));
    let edges: Vec<f64> = table.raw.channels.iter().map(|channel| edge_frequency(&channel.values)).collect();
    let edge = edges.iter().fold(0.0, |most: f64, edge| most.max(*edge));
    let series = match how {
        Some(how) => how == Regrid::LeastSquares,
        None => edge > CUBIC_BAND,
    };
    let (mut worst, mut folded): (f64, f64) = (0.0, 0.0);
    for channel in &mut table.raw.channels {
        let finite: Vec<f64> = channel.values.iter().copied().filter(|v| v.is_finite()).collect();
        let spread = standard_deviation(&finite);
        let steps: Vec<f64> =
            channel.values.windows(2).map(|pair| pair[1] - pair[0]).filter(|d| d.is_finite()).collect();
        if spread > 0.0 {
            worst = worst.max(rms(&steps) / spread * deviation);
            let centre = mean(&finite);
            let about: Vec<f64> = finite.iter().map(|v| (v - centre) / spread).collect();
            folded = folded.max(energy_above(&about, 0.45));
        }
        let known: Vec<(f64, f64)> =
            x.iter().copied().zip(channel.values.iter().copied()).filter(|(_, y)| y.is_finite()).collect();
        let (at, y): (Vec<f64>, Vec<f64>) = known.into_iter().unzip();
        let fitted = if series { on_grid(&at, &y, len) } else { None };
        let mut values = fitted.unwrap_or_else(|| cubic_spline(&at, &y, (0..len).map(|n| n as f64)));
        for (n, value) in values.iter_mut().enumerate() {
            if !there[n] {
                *value = f64::NAN;
            }
        }
        for (row, &n) in indices.iter().enumerate() {
            if !channel.values[row].is_finite() {
                values[(n as usize).min(len - 1)] = f64::NAN;
            }
        }
        channel.values = values;
    }
    let file = Place::file(&table.raw.source.path);
    let by = if series { "the least-squares cosine series" } else { "a cubic spline" };
    let text = format!(
        "interpolated onto an even grid by {by}; taken as even the samples would be off by about {} % of their RMS; \
         --regrid off takes them so",
        figure((worst * 1000.0).round() / 10.0)
    );
    findings.push(Finding::new("regridded", text).at(file.clone()));
    if edge > CUBIC_BAND && !series {
        let text = format!(
            "content up to {} of the sampling rate: a cubic spline leaves errors of 0.1 % to 4 % of the RMS there; \
             --regrid least-squares leaves less",
            figure((edge * 100.0).round() / 100.0)
        );
        findings.push(Finding::new("regrid_band", text).at(file.clone()));
    }
    if folded > FOLDED {
        let text = format!(
            "{} % of the power lies in the last tenth of the band: what lies beyond has folded into it, and regridding does \
             not undo that",
            figure((folded * 1000.0).round() / 10.0)
        );
        findings.push(Finding::new("regrid_aliasing", text).at(file));
    }
    table.rows = RowMap::Regridded { count: len };
    let start = axis.start() + phase;
    fill::complete(table, axis.with_start(start), findings)
}
