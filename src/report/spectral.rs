//! A spectrum as plain data: series with limits, lines, bands, levels, road class, and the sum check.

use serde::Serialize;
use serde_json::{Map, Value};

use crate::audit::level::Level;
use crate::error::Finding;
use crate::operator::ChainDescription;
use crate::report::{ExtensionReport, InputReport, OutputReport, Tool};
use crate::unit::Unit;

/// What results of this kind may and may not be used for.
pub const SPECTRUM_CAUTION: &str = "Spectra are estimates; their limits hold for stationary normal records. Band levels are \
those of ideal bands, not of the filters of IEC 61260-1. Decisions on machine protection, structural safety, road \
acceptance or human exposure follow the applicable standards and local codes under qualified practice; this program does not \
certify.";

/// The result of `spectrum`.
#[derive(Debug, Clone, Serialize)]
pub struct SpectrumReport {
    /// Version of the layout.
    pub schema: u32,
    /// What made it.
    pub tool: Tool,
    /// `spectrum`.
    pub command: &'static str,
    /// Every setting as resolved.
    pub settings: Map<String, Value>,
    /// What was read.
    pub input: InputReport,
    /// The second record, where there is one.
    pub second: Option<InputReport>,
    /// Remarks.
    pub notes: Vec<Finding>,
    /// The operators that ran before.
    pub chain: ChainDescription,
    /// One entry a channel.
    pub channels: Vec<ChannelSpectrum>,
    /// What was written.
    pub outputs: Vec<OutputReport>,
    /// What results of this kind may and may not be used for.
    pub caution: &'static str,
}

/// One channel: one spectrum, or several to lay over each other.
#[derive(Debug, Clone, Serialize)]
pub struct ChannelSpectrum {
    /// Name.
    pub name: String,
    /// The spectra.
    pub traces: Vec<Trace>,
    /// Gain of the operators at the frequencies of the first trace, without the powers of frequency of integrals and
    /// derivatives; null without operators.
    pub gain: Option<Vec<f64>>,
    /// The second record over the first, line by line; null where they cannot be compared.
    pub ratio: Option<Ratio>,
    /// Remarks on this channel.
    pub notes: Vec<Finding>,
}

/// One spectrum.
#[derive(Debug, Clone, Serialize)]
pub struct Trace {
    /// `record`, `before`, `after`, or the name of a file or an extension.
    pub label: String,
    /// Unit of the samples.
    pub unit: Unit,
    /// Assumption past the ends that operators or coefficients rest on; null where none was needed.
    pub extension: Option<ExtensionReport>,
    /// Baseline that went with it.
    pub baseline: Option<String>,
    /// Levels of the samples.
    pub level: Option<Level>,
    /// The density; null for coefficients.
    pub density: Option<DensityReport>,
    /// The coefficients; null for a density.
    pub coefficients: Option<CoefficientsReport>,
    /// Spectral lines, largest amplitude first.
    pub lines: Vec<LineReport>,
    /// Bands asked for.
    pub bands: Vec<BandReport>,
    /// Octave or one-third-octave bands.
    pub octaves: Vec<OctaveReport>,
    /// Road class.
    pub road: Option<RoadReport>,
}

/// A density.
#[derive(Debug, Clone, Serialize)]
pub struct DensityReport {
    /// `welch`, `sine` or `sine:COUNT`.
    pub method: String,
    /// What is shown.
    pub quantity: &'static str,
    /// Its unit: `g2/Hz`.
    pub unit: String,
    /// `Hz` or `1/m`.
    pub frequency_unit: &'static str,
    /// The formula of the scaling.
    pub formula: &'static str,
    /// The window, its coefficients and where they were published; null for sine tapers.
    pub window: Option<WindowReport>,
    /// How the record was cut; null for sine tapers.
    pub segments: Option<SegmentsReport>,
    /// Number of tapers, least and most; null for Welch.
    pub tapers: Option<[u32; 2]>,
    /// What was taken off first.
    pub detrend: String,
    /// Distance of two lines, in `frequency_unit`.
    pub spacing: f64,
    /// Effective noise bandwidth, least and most over the lines.
    pub noise_bandwidth: [f64; 2],
    /// Degrees of freedom, least and most over the lines.
    pub freedom: [f64; 2],
    /// Confidence of the limits, 0 to 1.
    pub confidence: f64,
    /// Factors from the estimate to its limits at the line of most degrees of freedom.
    pub limit_factors: [f64; 2],
    /// Whether the density holds the record's mean square.
    pub sum_check: SumCheck,
    /// The series; null where it stands in a file of its own.
    pub series: Option<DensitySeries>,
}

/// A window.
#[derive(Debug, Clone, Serialize)]
pub struct WindowReport {
    /// Name.
    pub name: &'static str,
    /// w_n = a_0 - a_1 cos(2 pi n/M) + a_2 cos(4 pi n/M) - ...
    pub coefficients: &'static [f64],
    /// Where they were published.
    pub source: &'static str,
}

/// Segments of a record.
#[derive(Debug, Clone, Copy, Serialize)]
pub struct SegmentsReport {
    /// Samples of a segment.
    pub samples: usize,
    /// The same along the axis, in s or m.
    pub length: f64,
    /// Share by which they overlap.
    pub overlap: f64,
    /// How many.
    pub count: usize,
    /// Samples at the end that none reaches.
    pub left_over: usize,
}

/// Sum of the density times the spacing against the mean square of the samples without their trend.
#[derive(Debug, Clone, Copy, Serialize)]
pub struct SumCheck {
    /// The sum, in unit^2.
    pub sum: f64,
    /// Mean square of the samples as window or tapers weight them: equal but for rounding. Null where no such identity
    /// exists.
    pub weighted_mean_square: Option<f64>,
    /// Relative difference of sum and weighted mean square: rounding only.
    pub rounding: Option<f64>,
    /// Mean square of the samples, all alike.
    pub mean_square: f64,
    /// Relative difference of the sum from it: what the weighting of the samples makes of a record that is not the same
    /// throughout. Null for a silent record.
    pub difference: Option<f64>,
}

/// A density, line by line.
#[derive(Debug, Clone, Serialize)]
pub struct DensitySeries {
    /// Frequencies.
    pub frequency: Vec<f64>,
    /// Density.
    pub density: Vec<f64>,
    /// Lower limit.
    pub lower: Vec<f64>,
    /// Upper limit.
    pub upper: Vec<f64>,
    /// Degrees of freedom.
    pub freedom: Vec<f64>,
}

/// The ratio of two densities, line by line.
#[derive(Debug, Clone, Serialize)]
pub struct Ratio {
    /// Labels of the trace above and the trace below.
    pub of: [String; 2],
    /// Frequencies.
    pub frequency: Vec<f64>,
    /// Density of the one over that of the other; null where the latter is zero.
    pub ratio: Vec<Option<f64>>,
    /// Lower limit by the F distribution, for independent records.
    pub lower: Vec<Option<f64>>,
    /// Upper limit.
    pub upper: Vec<Option<f64>>,
    /// Lines whose limits leave 1 out.
    pub differing: usize,
    /// As many as chance alone would make of two equal densities.
    pub by_chance: f64,
}

/// A record in the basis of its ends.
#[derive(Debug, Clone, Serialize)]
pub struct CoefficientsReport {
    /// What is shown.
    pub quantity: &'static str,
    /// Unit of the coefficients.
    pub unit: Unit,
    /// `Hz` or `1/m`.
    pub frequency_unit: &'static str,
    /// The formula of the scaling.
    pub formula: &'static str,
    /// Spacing of the frequencies: half the inverse length, which is finer than what the record resolves.
    pub spacing: f64,
    /// Relative difference of energy between samples and coefficients: rounding only.
    pub parseval: f64,
    /// Coefficients that together hold 99 % of the energy, counted from the largest.
    pub for_99_percent: usize,
    /// The coefficients of most energy.
    pub largest: Vec<CoefficientReport>,
    /// All of them; null where they stand in a file of their own.
    pub series: Option<CoefficientSeries>,
}

/// One coefficient.
#[derive(Debug, Clone, Copy, Serialize)]
pub struct CoefficientReport {
    /// Index from 0.
    pub index: usize,
    /// Frequency.
    pub frequency: f64,
    /// Half-cycles over the record.
    pub half_cycles: f64,
    /// Period or wavelength in s or m; null at zero frequency.
    pub wavelength: Option<f64>,
    /// True for a cosine about the left mirror, false for a sine.
    pub cosine: bool,
    /// The orthonormal coefficient.
    pub value: f64,
    /// Amplitude of its cosine or sine.
    pub amplitude: f64,
    /// Share of the energy.
    pub share: f64,
}

/// All coefficients.
#[derive(Debug, Clone, Serialize)]
pub struct CoefficientSeries {
    /// Frequencies.
    pub frequency: Vec<f64>,
    /// Half-cycles over the record.
    pub half_cycles: Vec<f64>,
    /// Orthonormal coefficients.
    pub value: Vec<f64>,
    /// Amplitudes.
    pub amplitude: Vec<f64>,
}

/// A spectral line.
#[derive(Debug, Clone, Copy, Serialize)]
pub struct LineReport {
    /// Interpolated frequency.
    pub frequency: f64,
    /// Its standard error.
    pub frequency_error: f64,
    /// Amplitude (peak value).
    pub amplitude: f64,
    /// Its standard error.
    pub amplitude_error: f64,
    /// RMS.
    pub rms: f64,
    /// Power over the noise in the same bin, in dB.
    pub above_noise_db: f64,
    /// Share of the energy about it that one steady tone explains.
    pub steadiness: f64,
}

/// A band.
#[derive(Debug, Clone, Serialize)]
pub struct BandReport {
    /// As asked for.
    pub text: String,
    /// Lower edge.
    pub low: f64,
    /// Upper edge.
    pub high: f64,
    /// Width in lines.
    pub lines: f64,
    /// RMS, in the unit of the samples.
    pub rms: f64,
    /// Its lower limit.
    pub lower: f64,
    /// Its upper limit.
    pub upper: f64,
    /// Degrees of freedom of its square.
    pub freedom: f64,
    /// Share of the whole mean square.
    pub share: f64,
}

/// An octave or one-third-octave band.
#[derive(Debug, Clone, Serialize)]
pub struct OctaveReport {
    /// Nominal mid-frequency, Hz.
    pub nominal: f64,
    /// Exact mid-frequency, Hz.
    pub centre: f64,
    /// Width in lines.
    pub lines: f64,
    /// RMS; null where the band is not resolved.
    pub rms: Option<f64>,
    /// Its lower limit.
    pub lower: Option<f64>,
    /// Its upper limit.
    pub upper: Option<f64>,
    /// Level in dB above the reference; null where the unit has no reference, or the band no level.
    pub level_db: Option<f64>,
    /// The reference: 1 um/s2, 1 nm/s or 1 pm (ISO 1683, from memory).
    pub reference: Option<&'static str>,
}

/// A road class.
#[derive(Debug, Clone, Serialize)]
pub struct RoadReport {
    /// A to H.
    pub class: char,
    /// Displacement density at 0.1 cycles/m in m^3, of the line of slope -2.
    pub density_at_reference: f64,
    /// Its limits.
    pub limits: [f64; 2],
    /// Classes within the limits.
    pub classes: String,
    /// Exponent w of the best line.
    pub waviness: f64,
    /// Its standard error.
    pub waviness_error: f64,
    /// Density at 0.1 cycles/m of the best line.
    pub density_of_best_line: f64,
    /// Range of spatial frequencies that the fit rests on, cycles/m.
    pub range: [f64; 2],
    /// Smoothed points: cycles/m, m^3.
    pub points: Vec<[f64; 2]>,
}

impl SpectrumReport {
    /// The report without its series, which stand in a file beside it.
    #[must_use]
    pub fn without_series(mut self) -> SpectrumReport {
        for trace in self.channels.iter_mut().flat_map(|channel| &mut channel.traces) {
            if let Some(density) = &mut trace.density {
                density.series = None;
            }
            if let Some(coefficients) = &mut trace.coefficients {
                coefficients.series = None;
            }
        }
        self
    }
}
