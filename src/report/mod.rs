//! Results as plain data: what the JSON and the summaries show. Holds no samples.

mod archive;
mod comparison;
mod examination;
mod integral;
mod json;
pub mod page;
mod plan;
mod plot;
mod spectral;
mod spectral_plot;
mod text;
mod treatment;

use serde::Serialize;
use serde_json::{Map, Value};

use crate::audit::level::Level;
use crate::baseline::EndEstimates;
use crate::compare::{EndStanding, How, Standing};
use crate::error::Finding;
use crate::metric::exposure::Exposure;
use crate::operator::{Chain, ChainDescription};
use crate::record::{Axis, RateSource, Repair, Source};
use crate::regularise::Segment;
use crate::unit::Unit;
use crate::verdict::{self, Adequacy, Edge, Structure, Unjudged};

pub use archive::{ARCHIVE_CAUTION, ArchiveListing, ArchiveReport, ArchivedReport, ListedChannel, RestoreReport};
pub use comparison::{ChannelComparison, Comparison, Jump, Row, Veto};
pub use examination::{AuditReport, RecordReport};
pub use integral::{Amount, CornerReport, IntegralReport, SigmaReport};
pub use json::to_json;
pub use plan::{Plan, PlannedChannel};
pub use plot::{Curve, Picture, svg};
pub use spectral::{
    BandReport, ChannelSpectrum, CoefficientReport, CoefficientSeries, CoefficientsReport, DensityReport,
    DensitySeries, LineReport, OctaveReport, Ratio, RoadReport, SPECTRUM_CAUTION, SegmentsReport, SpectrumReport,
    SumCheck, Trace, WindowReport,
};
pub use spectral_plot::spectrum_svg;
pub use text::{
    archive_text, audit_text, comparison_text, figure, listing_text, plan_text, restore_text, spectrum_text, summary,
};
pub use treatment::{DespikeReport, SmoothReport, StrengthSource};

/// Version of the JSON layout. Fields are added freely; a renamed or removed one raises it.
pub const SCHEMA: u32 = 1;

/// A whole result.
#[derive(Debug, Clone, Serialize)]
pub struct Report {
    /// `SCHEMA`.
    pub schema: u32,
    /// What made it.
    pub tool: Tool,
    /// The command that ran.
    pub command: &'static str,
    /// Every setting as resolved: giving them again gives the same bytes.
    pub settings: Map<String, Value>,
    /// What was read.
    pub input: InputReport,
    /// Remarks on the whole record.
    pub notes: Vec<Finding>,
    /// The resolved operators, in the order in which they run.
    pub chain: ChainDescription,
    /// One entry a channel.
    pub channels: Vec<ChannelReport>,
    /// False where `--require` was not met.
    pub requirement_met: bool,
    /// The channels that did not meet it, and why.
    pub unmet: Vec<Finding>,
    /// What was written.
    pub outputs: Vec<OutputReport>,
    /// What results of this kind may and may not be used for.
    pub caution: &'static str,
}

/// The program.
#[derive(Debug, Clone, Serialize)]
pub struct Tool {
    /// Name.
    pub name: &'static str,
    /// Version.
    pub version: &'static str,
}

impl Tool {
    /// This program.
    pub const THIS: Tool = Tool { name: env!("CARGO_PKG_NAME"), version: env!("CARGO_PKG_VERSION") };
}

/// The caution that goes with every conditioned record.
pub const CAUTION: &str = "Filtered, integrated or restored records are estimates under the stated assumption about the \
ends. Decisions on machine protection, structural safety or human exposure follow the applicable standards and local \
codes under qualified practice; this program does not certify.";

/// The caution that goes with a weighted record.
pub const WEIGHTED_CAUTION: &str = "Weighted accelerations and the figures formed from them are estimates from one record \
under the stated assumption about the ends: not the readings of a measuring instrument in the sense of ISO 8041-1. Decisions \
on human exposure follow local codes and qualified practice; this program does not certify.";

/// The caution that belongs to what a chain does.
pub fn caution(chain: &Chain) -> &'static str {
    if chain.treatments().weighting.is_some() { WEIGHTED_CAUTION } else { CAUTION }
}

/// What was read.
#[derive(Debug, Clone, Serialize)]
pub struct InputReport {
    /// Path as given, `-` for standard input.
    pub path: String,
    /// SHA-256 of the bytes as stored.
    pub sha256: String,
    /// Bytes as stored.
    pub bytes: u64,
    /// `csv` or `wav`.
    pub format: crate::record::Format,
    /// Samples a channel after cutting and repair.
    pub samples: usize,
    /// Which part of the file it is, where gaps split that.
    pub part: Option<PartReport>,
    /// The axis.
    pub axis: AxisReport,
}

impl InputReport {
    /// The report of a source and the axis made from it.
    pub fn new(source: &Source, axis: &Axis) -> InputReport {
        InputReport {
            path: source.path.clone(),
            sha256: source.sha256.clone(),
            bytes: source.bytes,
            format: source.format,
            samples: axis.len(),
            part: None,
            axis: AxisReport::new(axis),
        }
    }

    /// The same, of a part of the file.
    #[must_use]
    pub fn with_part(self, segment: Option<Segment>) -> InputReport {
        let part = segment.map(|segment| PartReport { number: segment.number, count: segment.count });
        InputReport { part, ..self }
    }
}

/// A part of a file between gaps.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Serialize)]
pub struct PartReport {
    /// Number of the part, from 1.
    pub number: usize,
    /// Number of parts.
    pub count: usize,
}

/// The axis of a record.
#[derive(Debug, Clone, Serialize)]
pub struct AxisReport {
    /// `time` or `length`.
    pub kind: &'static str,
    /// Unit of start, step and interval.
    pub unit: Unit,
    /// First stamp.
    pub start: f64,
    /// Step.
    pub step: f64,
    /// Samples per second, or per metre.
    pub rate: f64,
    /// Hard interval of the rate from the stamps.
    pub rate_interval: Option<[f64; 2]>,
    /// Where the rate came from.
    pub how: RateSource,
    /// Civil time of stamp 0.
    pub epoch: Option<String>,
}

impl AxisReport {
    /// The report of an axis.
    pub fn new(axis: &Axis) -> AxisReport {
        let base = axis.step_base() / axis.step();
        AxisReport {
            kind: if axis.is_time() { "time" } else { "length" },
            unit: axis.unit().clone(),
            start: axis.start(),
            step: axis.step(),
            rate: axis.rate_base(),
            rate_interval: axis.interval().map(|[low, high]| [1.0 / (high * base), 1.0 / (low * base)]),
            how: axis.source(),
            epoch: axis.epoch().map(str::to_owned),
        }
    }
}

/// One channel's result.
#[derive(Debug, Clone, Serialize)]
pub struct ChannelReport {
    /// Name.
    pub name: String,
    /// Unit of the output.
    pub unit: Unit,
    /// Unit of the input.
    pub unit_in: Unit,
    /// Remarks on this channel.
    pub notes: Vec<Finding>,
    /// What was split off first.
    pub baseline: BaselineReport,
    /// What was assumed past the ends.
    pub extension: ExtensionReport,
    /// How far the ends reach into the output.
    pub reach: ReachReport,
    /// What the record's ends support, and at what cost; null where the chain has nothing to judge.
    pub verdict: Option<VerdictReport>,
    /// Why nothing is known about the edges; null where they were judged, and where nothing asked for it.
    pub not_judged: Option<Unjudged>,
    /// How each assertion stands against the record, end by end.
    pub assertions: Vec<EndStanding>,
    /// Every candidate at the edges: predicted error, bound, adequacy, trusted span.
    pub candidates: Vec<Edge>,
    /// Values, slopes and levels at the half-sample mirrors (slopes per step), with standard errors and the noise sigma.
    pub edge: Option<EndEstimates>,
    /// First and last trusted sample of the output; null where nothing was judged or nothing is trusted.
    pub trusted: Option<TrustedReport>,
    /// Spikes that were replaced; null where that was not asked for.
    pub despike: Option<DespikeReport>,
    /// Smoothing; null without it.
    pub smoothing: Option<SmoothReport>,
    /// Exposure figures; null without a weighting.
    pub exposure: Option<Exposure>,
    /// RMS before and after.
    pub rms: InOut<Option<f64>>,
    /// Mean, RMS, peak, crest factor, kurtosis before and after.
    pub level: InOut<Option<Level>>,
    /// Both parts of a split; null without one.
    pub split: Option<SplitReport>,
    /// Constants and uncertainty of an integral; null without one.
    pub integral: Option<IntegralReport>,
    /// Samples of the input that are not as they were read.
    pub repaired: usize,
    /// Which they are, and what they were made from.
    pub repairs: Vec<Repair>,
    /// Relative difference of energy between remainder and coefficients: rounding only.
    pub parseval: f64,
}

/// The verdict on one channel.
#[derive(Debug, Clone, Serialize)]
pub struct VerdictReport {
    /// The best of the symmetric candidates.
    pub pick: &'static str,
    /// How clearly it stands out.
    pub level: verdict::Level,
    /// Predicted error of the runner-up over that of the pick.
    pub margin: Option<f64>,
    /// All candidates within a quarter of the best.
    pub ties: Vec<&'static str>,
    /// True where the record does not tell the ties apart and all of them are within tolerance.
    pub choice_immaterial: bool,
    /// Of the extension that is used, against the tolerance.
    pub adequacy: Option<Adequacy>,
    /// Predicted edge error of the extension that is used, in the unit of the output.
    pub predicted_error: Option<f64>,
    /// The bound on it.
    pub bound: Option<f64>,
    /// The tolerance, in the unit of the output.
    pub tolerance: f64,
    /// Standard deviation of the output.
    pub output_deviation: f64,
    /// The edge zone at each end, in samples.
    pub zone: usize,
    /// How smoothly the ends join.
    pub joins: Structure,
    /// How the assertions stand against the record: the worst of the ends.
    pub assertion: Option<Standing>,
    /// In words.
    pub sentence: String,
}

/// A trusted span.
#[derive(Debug, Clone, Copy, PartialEq, Serialize)]
pub struct TrustedReport {
    /// First trusted sample, from 0.
    pub first: usize,
    /// Last trusted sample.
    pub last: usize,
    /// Its stamp, in the axis unit.
    pub from: f64,
    /// The last one's stamp.
    pub to: f64,
}

/// A figure before and after.
#[derive(Debug, Clone, Serialize)]
pub struct InOut<T> {
    /// Of the input.
    #[serde(rename = "in")]
    pub before: T,
    /// Of the output.
    #[serde(rename = "out")]
    pub after: T,
}

/// The baseline of a channel.
#[derive(Debug, Clone, Serialize)]
pub struct BaselineReport {
    /// Spelling as in the option.
    pub kind: String,
    /// Who chose it.
    pub how: How,
    /// Coefficients p_j of sum p_j u^j with u = (x - centre) / half_width, x in steps from the left mirror.
    pub coefficients: Vec<f64>,
    /// Centre of u in steps.
    pub centre: f64,
    /// Half width of u in steps.
    pub half_width: f64,
    /// Width in samples that end values and slopes are fitted to at most; null where the baseline needs none.
    pub fit_width: Option<f64>,
    /// True where no corner gives that width and an eighth of the record is assumed.
    pub fit_width_assumed: bool,
}

/// The extension of a channel.
#[derive(Debug, Clone, Serialize)]
pub struct ExtensionReport {
    /// `even`, `periodic` and so on.
    pub kind: String,
    /// `half-sample` or `whole-sample`.
    pub seat: &'static str,
    /// The forward transform that follows.
    pub transform: String,
    /// The same in the terms of profile filtering (ISO 16610-28).
    pub end_treatment: String,
    /// Who chose it.
    pub how: How,
}

/// Both parts of a split, which stand in columns beside the record and add up to it.
#[derive(Debug, Clone, Serialize)]
pub struct SplitReport {
    /// The corner as written.
    pub corner: String,
    /// What is longer than the corner.
    pub waviness: Option<Level>,
    /// What is left.
    pub roughness: Option<Level>,
    /// Decimals that both parts are rounded to, so that they add up to the record digit by digit.
    pub decimals: i32,
}

/// How far the ends reach in.
#[derive(Debug, Clone, Copy, Serialize)]
pub struct ReachReport {
    /// Samples beyond which less than 0.1 % of the kernel's area lies; null where it is unbounded.
    pub samples: Option<f64>,
    /// The same along the axis, in the axis unit.
    pub axis: Option<f64>,
    /// Samples beyond which less than 1e-13 of the kernel's area lies; null where none is.
    pub numeric_samples: Option<f64>,
}

/// A file that was written.
#[derive(Debug, Clone, Serialize)]
pub struct OutputReport {
    /// Path as given.
    pub path: String,
    /// SHA-256 of its bytes.
    pub sha256: String,
}
