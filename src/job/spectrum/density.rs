//! The density of one subject as the settings ask for it, its limits and its sum check.

use super::overlay::Subject;
use crate::basis::Planner;
use crate::error::{Error, Finding, Result};
use crate::report::{DensityReport, DensitySeries, Ratio, SegmentsReport, SumCheck, Trace, WindowReport};
use crate::settings::{Method, Settings};
use crate::spectrum::{self, Correlation, Density, Limits, Segments, ratio_limits};
use crate::unit::Unit;

const WELCH: &str = "P_k = 2 |sum w_n x_n exp(-2 pi i k n/M)|^2 / (rate sum w^2), averaged over the segments; without the 2 at \
zero and the Nyquist frequency";
const SINE: &str = "P_k = 2/(rate K) sum over tapers |sum v_n x_n exp(-2 pi i k n/(N+1))|^2, v_n = sqrt(2/(N+1)) sin(pi j n/(N+1)), \
n = 1..N, j = 1..K; without the 2 at zero and the Nyquist frequency";

/// The density and its report.
pub fn density(
    subject: &Subject<'_>,
    settings: &Settings,
    planner: &Planner,
    notes: &mut Vec<Finding>,
) -> Result<(Density, DensityReport)> {
    let options = &settings.spectrum;
    let (samples, rate) = (subject.samples.as_ref(), subject.axis.rate_base());
    let mut window = None;
    let mut segments = None;
    let found = match options.method {
        Method::Sine(count) => spectrum::sine(samples, rate, count, options.detrend, planner)?,
        Method::Adaptive => spectrum::adaptive(samples, rate, options.detrend, planner)?,
        Method::Welch | Method::Basis => {
            let len = match &options.segment {
                Some(length) => length.resolve(subject.axis)?,
                None => default_segment(samples.len(), rate),
            };
            let overlap = options.overlap.unwrap_or(options.window.overlap);
            let cut = Segments::new(samples.len(), len, overlap)?;
            let left_over = cut.left_over(samples.len());
            if left_over * 20 > samples.len() {
                let text = format!("{left_over} of {} samples at the end lie in no segment", samples.len());
                notes.push(Finding::new("samples_left_over", text));
            }
            window = Some(WindowReport {
                name: options.window.name,
                coefficients: options.window.coefficients,
                source: options.window.source,
            });
            segments = Some(SegmentsReport {
                samples: cut.len,
                length: cut.len as f64 / rate,
                overlap: 1.0 - cut.hop as f64 / cut.len as f64,
                count: cut.count,
                left_over,
            });
            spectrum::welch(samples, rate, cut, options.window, options.detrend, planner)?
        }
    };
    if found.values.iter().any(|value| !value.is_finite()) {
        return Err(
            Error::unsupported("the density is too large for a double").remedy("scale the channel with --calibrate")
        );
    }
    let mut limits = Limits::new(options.confidence)?;
    let extent =
        |values: &[f64]| values.iter().fold([f64::INFINITY, f64::NEG_INFINITY], |[a, b], &v| [a.min(v), b.max(v)]);
    let freedom = extent(&found.freedom);
    let (low, high) = limits.factors(freedom[1]);
    let sum_check = sum_check(&found);
    remark(&sum_check, freedom[1], notes);
    let report = DensityReport {
        method: options.method.to_string(),
        quantity: "one-sided power spectral density",
        unit: density_unit(&subject.unit, subject.axis.frequency_label()),
        frequency_unit: subject.axis.frequency_label(),
        formula: if segments.is_some() { WELCH } else { SINE },
        window,
        segments,
        tapers: match &found.correlation {
            Correlation::Tapers(counts) => {
                Some([counts.iter().copied().min().unwrap_or(0), counts.iter().copied().max().unwrap_or(0)])
            }
            Correlation::ByDistance(_) => None,
        },
        detrend: options.detrend.sentence().to_owned(),
        spacing: found.spacing,
        noise_bandwidth: extent(&found.bandwidth),
        freedom,
        confidence: options.confidence,
        limit_factors: [low, high],
        sum_check,
        series: Some(series(&found, &mut limits)),
    };
    Ok((found, report))
}

fn series(found: &Density, limits: &mut Limits) -> DensitySeries {
    let factors: Vec<(f64, f64)> = found.freedom.iter().map(|&freedom| limits.factors(freedom)).collect();
    let scaled =
        |pick: &dyn Fn(&(f64, f64)) -> f64| found.values.iter().zip(&factors).map(|(v, f)| v * pick(f)).collect();
    DensitySeries {
        frequency: (0..found.len()).map(|line| found.frequency(line)).collect(),
        density: found.values.clone(),
        lower: scaled(&|f| f.0),
        upper: scaled(&|f| f.1),
        freedom: found.freedom.clone(),
    }
}

fn sum_check(found: &Density) -> SumCheck {
    let sum = found.sum();
    let against = |reference: f64| (reference > 0.0).then(|| sum / reference - 1.0);
    SumCheck {
        sum,
        weighted_mean_square: found.weighted_mean_square,
        rounding: found.weighted_mean_square.and_then(against).map(f64::abs),
        mean_square: found.mean_square,
        difference: against(found.mean_square),
    }
}

/// Relative difference of sum and mean square above which the record is said to be uneven.
const UNEVEN: f64 = 0.1;

fn remark(check: &SumCheck, freedom: f64, notes: &mut Vec<Finding>) {
    if let Some(difference) = check.difference.filter(|d| d.abs() > UNEVEN) {
        let text = format!(
            "the lines sum to {:+.0} % of the mean square: the record is not the same throughout, or slower than the lines show",
            100.0 * difference
        );
        notes.push(Finding::new("sum_differs", text));
    }
    if freedom < 6.0 {
        let text = format!(
            "{freedom:.1} degrees of freedom: averages are few and the limits wide; shorter segments give more"
        );
        notes.push(Finding::new("few_averages", text));
    }
}

/// About an eighth of the record, with lines 1, 2 or 5 times a power of ten apart where the rate gives a whole number of
/// samples for that.
fn default_segment(samples: usize, rate: f64) -> usize {
    let wanted = (samples / 8).max(samples.min(64)).max(2);
    let spacing = rate / wanted as f64;
    let decade = spacing.log10().floor() as i32;
    let steps = (decade - 1..=decade + 1).flat_map(|d| [1.0, 2.0, 5.0].map(|figure| figure * 10_f64.powi(d)));
    steps
        .map(|step| rate / step)
        .filter(|len| (len - len.round()).abs() < 1e-6 * len && len.round() as usize <= samples)
        .map(|len| (len.round() as usize, (len / wanted as f64).ln().abs()))
        .filter(|(len, distance)| *len >= 2 && *distance < 2_f64.ln())
        .min_by(|a, b| a.1.total_cmp(&b.1))
        .map_or(wanted.min(samples), |(len, _)| len)
}

/// `g2/Hz`, `(m/s2)2/Hz`.
fn density_unit(unit: &Unit, frequency: &str) -> String {
    let below = if frequency == "Hz" { "/Hz" } else { " m" };
    let label = unit.to_string();
    match label.as_str() {
        "" if frequency == "Hz" => "1/Hz".to_owned(),
        "" => "m".to_owned(),
        plain if plain.chars().all(char::is_alphabetic) => format!("{plain}2{below}"),
        _ => format!("({label})2{below}"),
    }
}

/// The ratio of two densities of one unit and spacing; the records count as independent.
pub fn ratio(above: &Trace, below: &Trace, confidence: f64) -> Option<Ratio> {
    let (a, b) = (above.density.as_ref()?, below.density.as_ref()?);
    let (x, y) = (a.series.as_ref()?, b.series.as_ref()?);
    let same = a.unit == b.unit && x.frequency.len() == y.frequency.len() && (a.spacing / b.spacing - 1.0).abs() < 1e-9;
    if !same {
        return None;
    }
    let mut known: Option<([f64; 2], (f64, f64))> = None;
    let mut result = Ratio {
        of: [above.label.clone(), below.label.clone()],
        frequency: x.frequency.clone(),
        ratio: Vec::new(),
        lower: Vec::new(),
        upper: Vec::new(),
        differing: 0,
        by_chance: (1.0 - confidence) * x.frequency.len() as f64,
    };
    for k in 0..x.frequency.len() {
        let ratio = (y.density[k] > 0.0).then(|| x.density[k] / y.density[k]);
        let freedom = [x.freedom[k], y.freedom[k]];
        // Neighbouring lines share their degrees of freedom nearly everywhere.
        let factors = match known {
            Some((of, factors)) if of == freedom => factors,
            _ => ratio_limits(confidence, freedom[0], freedom[1]),
        };
        known = Some((freedom, factors));
        let (low, high) = (ratio.map(|r| r * factors.0), ratio.map(|r| r * factors.1));
        result.differing += usize::from(low.is_some_and(|v| v > 1.0) || high.is_some_and(|v| v < 1.0));
        result.ratio.push(ratio);
        result.lower.push(low);
        result.upper.push(high);
    }
    Some(result)
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn lines_stand_on_round_frequencies_where_the_rate_allows() {
        for (samples, rate, segment) in [
            (2400, 200.0, 200),        // 1 Hz; 0.667 Hz would be exact
            (100_000, 1000.0, 10_000), // 0.1 Hz
            (48_000, 48_000.0, 4800),  // 10 Hz
            (800, 2000.0, 100),        // 20 / m
            (50, 10.0, 50),
            (2, 1.0, 2),
        ] {
            assert_eq!(default_segment(samples, rate), segment, "{samples} {rate}");
        }
        // An odd rate has no round spacing: an eighth.
        assert_eq!(default_segment(8000, std::f64::consts::E * 100.0), 1000);
    }

    #[test]
    fn units_of_a_density_are_readable() {
        for (unit, along, density) in [
            ("g", "Hz", "g2/Hz"),
            ("m/s2", "Hz", "(m/s2)2/Hz"),
            ("um", "1/m", "um2 m"),
            ("", "Hz", "1/Hz"),
            ("FS", "Hz", "FS2/Hz"),
        ] {
            assert_eq!(density_unit(&Unit::parse(unit), along), density);
        }
    }
}
