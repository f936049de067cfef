//! What is read from a density: lines, bands, octave levels, road class; and the coefficients of a record.

use super::overlay::Subject;
use crate::basis::Planner;
use crate::error::{Error, Finding, Result};
use crate::report::{
    BandReport, CoefficientReport, CoefficientSeries, CoefficientsReport, LineReport, OctaveReport, RoadReport, Trace,
};
use crate::settings::Settings;
use crate::spectrum::{self, Coefficient, Coefficients, Density, FEWEST_LINES, Limits, RoadClass};
use crate::unit::Unit;

/// Fills in what the settings ask for.
pub fn read(
    subject: &Subject<'_>,
    density: &Density,
    settings: &Settings,
    planner: &Planner,
    trace: &mut Trace,
    notes: &mut Vec<Finding>,
) -> Result<()> {
    let options = &settings.spectrum;
    let mut limits = Limits::new(options.confidence)?;
    let mut record = options.detrend.of_record(&subject.samples)?;
    options.detrend.of_segment(&mut record)?;
    trace.lines =
        spectrum::lines(&record, density.rate, options.lines, planner)?.into_iter().map(line_report).collect();
    for range in &options.bands {
        for corner in [range.low(), range.high()] {
            if corner.measure().is_time() != subject.axis.is_time() {
                return Err(Error::usage(format!("--band {range}: the record's axis is in {}", subject.axis.unit()))
                    .remedy("give the band as in 2Hz..40Hz for time, 0.8mm..8mm for length"));
            }
        }
        let (low, high) = (range.low().frequency(), range.high().frequency());
        let nyquist = density.rate / 2.0;
        if high > nyquist * (1.0 + 1e-9) {
            let unit = subject.axis.frequency_label();
            return Err(Error::unsupported(format!(
                "--band {range}: reaches past the Nyquist frequency of {nyquist} {unit}"
            ))
            .remedy(format!("choose a band that ends at {nyquist} {unit} at most")));
        }
        let found = spectrum::band(density, low, high);
        if found.lines < FEWEST_LINES {
            let text = format!(
                "--band {range} is {:.1} lines wide: its edges are blurred; longer segments narrow the lines",
                found.lines
            );
            notes.push(Finding::new("narrow_band", text));
        }
        let (lower, upper) = found.rms_limits(&mut limits);
        trace.bands.push(BandReport {
            text: range.text().to_owned(),
            low: found.low,
            high: found.high,
            lines: found.lines,
            rms: found.rms(),
            lower,
            upper,
            freedom: found.freedom,
            share: if density.sum() > 0.0 { found.mean_square / density.sum() } else { 0.0 },
        });
    }
    octaves(subject, density, settings, &mut limits, trace, notes)?;
    if options.road {
        trace.road = Some(road(subject, density, &mut limits, notes)?);
    }
    Ok(())
}

fn line_report(line: spectrum::Line) -> LineReport {
    LineReport {
        frequency: line.frequency,
        frequency_error: line.frequency_error,
        amplitude: line.amplitude,
        amplitude_error: line.amplitude_error,
        rms: line.amplitude * std::f64::consts::FRAC_1_SQRT_2,
        above_noise_db: line.above_noise_db,
        steadiness: line.steadiness,
    }
}

fn octaves(
    subject: &Subject<'_>,
    density: &Density,
    settings: &Settings,
    limits: &mut Limits,
    trace: &mut Trace,
    notes: &mut Vec<Finding>,
) -> Result<()> {
    let Some(fraction) = settings.spectrum.octaves else { return Ok(()) };
    if !subject.axis.is_time() {
        return Err(Error::usage("--octaves: bands of IEC 61260-1 belong to frequencies in Hz")
            .remedy("use --band for profiles, as in 0.8mm..8mm"));
    }
    let reference = reference(&subject.unit);
    let bands = spectrum::octave_bands(density, fraction);
    let resolved = bands.iter().find(|band| band.level.is_some()).map(|band| band.nominal);
    if let Some(refused) = bands.iter().filter(|band| band.level.is_none()).max_by(|a, b| a.centre.total_cmp(&b.centre))
    {
        let from = resolved.map_or_else(|| "none is left".to_owned(), |f| format!("the first shown is {f} Hz"));
        // A band of that centre is five lines wide at this spacing.
        let longer = FEWEST_LINES / refused.lines / density.spacing;
        let text = format!(
            "bands of fewer than 5 lines are refused, up to {} Hz; {from}; segments of {longer:.2} s would show {} Hz too",
            refused.nominal, refused.nominal
        );
        notes.push(Finding::new("bands_refused", text));
    }
    for band in bands {
        let pair = band.level.as_ref().map(|level| level.rms_limits(limits));
        let rms = band.level.as_ref().map(|level| level.rms());
        trace.octaves.push(OctaveReport {
            nominal: band.nominal,
            centre: band.centre,
            lines: band.lines,
            rms,
            lower: pair.map(|p| p.0),
            upper: pair.map(|p| p.1),
            level_db: reference.zip(rms.filter(|rms| *rms > 0.0)).map(|((size, _), rms)| 20.0 * (rms / size).log10()),
            reference: reference.map(|(_, name)| name),
        });
    }
    Ok(())
}

/// The reference of levels in dB for a unit, in that unit: 1 um/s2, 1 nm/s, 1 pm (ISO 1683:2015, from memory).
fn reference(unit: &Unit) -> Option<(f64, &'static str)> {
    let meaning = unit.meaning()?;
    let (base, name) = match (meaning.length, meaning.time) {
        (1, -2) => (1e-6, "1 um/s2"),
        (1, -1) => (1e-9, "1 nm/s"),
        (1, 0) => (1e-12, "1 pm"),
        _ => return None,
    };
    Some((base / meaning.scale, name))
}

fn road(subject: &Subject<'_>, density: &Density, limits: &mut Limits, notes: &mut Vec<Finding>) -> Result<RoadReport> {
    let to_metre = subject.unit.meaning().filter(|_| subject.unit.is_length()).map(|meaning| meaning.scale);
    let Some(to_metre) = to_metre.filter(|_| !subject.axis.is_time()) else {
        return Err(Error::usage("--road: a road class needs heights in a unit of length along a length")
            .remedy("give the unit with --unit NAME=mm, and a position column or --rate in 1/m"));
    };
    let found = spectrum::road(density, to_metre)?;
    if found.range[0] > 0.02 || found.range[1] < 2.0 {
        let text = format!(
            "the fit rests on {:.3} to {:.3} cycles/m; ISO 8608 asks for 0.011 to 2.83",
            found.range[0], found.range[1]
        );
        notes.push(Finding::new("road_range", text));
    }
    let quantile = normal_quantile(limits.level());
    let spread = (quantile * found.relative_error).exp();
    let ends = [found.density_at_reference / spread, found.density_at_reference * spread];
    let classes: String = RoadClass::ALL
        .iter()
        .filter(|c| (RoadClass::of(ends[0])..=RoadClass::of(ends[1])).contains(c))
        .map(|c| c.letter())
        .collect();
    Ok(RoadReport {
        class: found.class.letter(),
        density_at_reference: found.density_at_reference,
        limits: ends,
        classes,
        waviness: found.waviness,
        waviness_error: found.waviness_error,
        density_of_best_line: found.density_of_best_line,
        range: found.range,
        points: found.points,
    })
}

/// The number of standard deviations that hold with probability `level`, both tails.
fn normal_quantile(level: f64) -> f64 {
    use statrs::distribution::{ContinuousCDF, Normal};
    Normal::standard().inverse_cdf(0.5 + level / 2.0)
}

/// Coefficients listed for people.
const LISTED: usize = 10;

const ORTHONORMAL: &str = "c_k = sum w_n x_n phi_k(x_n) with orthonormal phi_k = A_k cos or sin, so sum c^2 = sum w x^2 \
(w = 1/2 on an even whole-sample mirror); amplitude = A_k c_k";

/// The coefficients of a subject in the basis of its ends.
pub fn coefficients(subject: &Subject<'_>, planner: &Planner) -> Result<CoefficientsReport> {
    let (ends, baseline) = &subject.basis;
    let found = Coefficients::of(&subject.samples, *ends, baseline, planner)?;
    if !found.energy.is_finite() {
        return Err(
            Error::unsupported("the energy is too large for a double").remedy("scale the channel with --calibrate")
        );
    }
    let (len, rate) = (found.values.len(), subject.axis.rate_base());
    let report = |c: Coefficient| CoefficientReport {
        index: c.index,
        frequency: c.frequency * rate,
        half_cycles: c.half_cycles,
        wavelength: (c.frequency > 0.0).then(|| 1.0 / (c.frequency * rate)),
        cosine: c.cosine,
        value: c.value,
        amplitude: c.amplitude,
        share: found.share(c.index),
    };
    let mut squares: Vec<f64> = found.values.iter().map(|c| c * c).collect();
    squares.sort_by(|a, b| b.total_cmp(a));
    let mut held = 0.0;
    let for_99_percent = squares
        .iter()
        .take_while(|square| {
            let more = held < 0.99 * found.energy;
            held += **square;
            more
        })
        .count();
    let all: Vec<Coefficient> = (0..len).map(|k| found.at(k)).collect();
    Ok(CoefficientsReport {
        quantity: "coefficients of the record in the basis of its ends",
        unit: subject.unit.clone(),
        frequency_unit: subject.axis.frequency_label(),
        formula: ORTHONORMAL,
        spacing: if ends.length(len) > 0.0 { rate / (2.0 * ends.length(len)) } else { 0.0 },
        parseval: found.parseval(),
        for_99_percent,
        largest: found.largest(LISTED).into_iter().map(report).collect(),
        series: Some(CoefficientSeries {
            frequency: all.iter().map(|c| c.frequency * rate).collect(),
            half_cycles: all.iter().map(|c| c.half_cycles).collect(),
            value: all.iter().map(|c| c.value).collect(),
            amplitude: all.iter().map(|c| c.amplitude).collect(),
        }),
    })
}
