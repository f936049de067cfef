//! The result of an archive as plain data: what it took, what it lost, what is inside.

use serde::Serialize;
use serde_json::{Map, Value};

use crate::codec::{Fidelity, Mode};
use crate::error::Finding;
use crate::report::{OutputReport, Tool};
use crate::unit::Unit;

/// One archived record.
#[derive(Debug, Clone, Serialize)]
pub struct ArchiveReport {
    /// Version of the layout.
    pub schema: u32,
    /// What made it.
    pub tool: Tool,
    /// `compress`.
    pub command: &'static str,
    /// Every setting as resolved.
    pub settings: Map<String, Value>,
    /// The bound in words.
    pub asked: String,
    /// True where the bounds of the channels hold for the RMS error, false where they hold for every sample.
    pub bounds_rms: bool,
    /// The source as given.
    pub path: String,
    /// SHA-256 of its bytes.
    pub sha256: String,
    /// Its bytes.
    pub source_bytes: u64,
    /// Rows.
    pub rows: usize,
    /// The axis in words; null without one.
    pub axis: Option<String>,
    /// Its unit.
    pub axis_unit: Option<Unit>,
    /// Remarks.
    pub notes: Vec<Finding>,
    /// One entry a channel.
    pub channels: Vec<ArchivedReport>,
    /// Bytes of the archive.
    pub bytes: u64,
    /// 8 x bytes / samples of all channels.
    pub bits_per_sample: f64,
    /// Bytes of the source over those of the archive.
    pub ratio_to_source: f64,
    /// Bytes of the samples as doubles over those of the archive.
    pub ratio_to_doubles: f64,
    /// What was written.
    pub outputs: Vec<OutputReport>,
    /// What archives may and may not be used for.
    pub caution: &'static str,
}

/// The caution that goes with every archive.
pub const ARCHIVE_CAUTION: &str = "A bound on the error is kept in the restored numbers; it says nothing of the measurement. What \
an archive may lose is for those to decide who will judge the record: decisions on machine protection, structural safety or \
human exposure follow the applicable standards and local codes under qualified practice; this program does not certify.";

/// One archived channel.
#[derive(Debug, Clone, Serialize)]
pub struct ArchivedReport {
    /// Name.
    pub name: String,
    /// Unit.
    pub unit: Unit,
    /// The bound in the channel's unit; null where there is none.
    pub error: Option<f64>,
    /// Bytes of its blocks.
    pub bytes: u64,
    /// 8 x bytes / rows.
    pub bits_per_sample: f64,
    /// 8 x rows / bytes: 64-bit numbers take so many times more.
    pub ratio_to_doubles: f64,
    /// How most of it is coded; null where it holds no value.
    pub mode: Option<Mode>,
    /// Number of blocks.
    pub blocks: usize,
    /// The next best mode of its largest block.
    pub runner_up: Option<Mode>,
    /// Bytes which that would have taken.
    pub runner_up_bytes: Option<usize>,
    /// How near it comes, measured on what a reader gets.
    #[serde(flatten)]
    pub fidelity: Fidelity,
    /// Place of the largest error in the axis unit; null without an axis or an error.
    pub max_error_at: Option<f64>,
    /// RMSE by Parseval's theorem from the coefficients left out; null unless that is all that is lost.
    pub parseval_rmse: Option<f64>,
    /// Cosine coefficients that are kept; null without cosine series.
    pub kept: Option<usize>,
    /// The highest frequency kept, in Hz or 1/m; null without cosine series or an even axis.
    pub cut_off: Option<f64>,
    /// White noise sigma, from third differences.
    pub noise: Option<f64>,
    /// Bits a sample that keeping the noise takes at this bound.
    pub noise_bits: Option<f64>,
}

/// What is in an archive, told without decoding it.
#[derive(Debug, Clone, Serialize)]
pub struct ArchiveListing {
    /// Version of the layout.
    pub schema: u32,
    /// What made it.
    pub tool: Tool,
    /// `audit`.
    pub command: &'static str,
    /// Every setting as resolved.
    pub settings: Map<String, Value>,
    /// Path as given.
    pub path: String,
    /// SHA-256 of the bytes as stored.
    pub sha256: String,
    /// Bytes as stored.
    pub bytes: u64,
    /// `grain`.
    pub format: &'static str,
    /// Rows.
    pub rows: u64,
    /// The axis in words; null without one.
    pub axis: Option<String>,
    /// One entry a channel.
    pub channels: Vec<ListedChannel>,
    /// Lines of notes.
    pub notes: Vec<(String, String)>,
    /// Name of the source; null where it is not told.
    pub source: Option<String>,
    /// SHA-256 of the source.
    pub source_sha256: Option<String>,
    /// Bytes of the source.
    pub source_bytes: Option<u64>,
    /// The program that made it.
    pub made_by: Option<String>,
    /// Its settings.
    pub made_with: Option<String>,
}

/// One channel of an archive.
#[derive(Debug, Clone, Serialize)]
pub struct ListedChannel {
    /// Name.
    pub name: String,
    /// Unit.
    pub unit: Unit,
    /// The bound in words.
    pub bound: Option<String>,
    /// The bound in the channel's unit.
    pub error: Option<f64>,
    /// Blocks.
    pub blocks: usize,
    /// Their bytes.
    pub bytes: u64,
    /// The modes in use.
    pub modes: Vec<Mode>,
}

/// A restored record.
#[derive(Debug, Clone, Serialize)]
pub struct RestoreReport {
    /// Version of the layout.
    pub schema: u32,
    /// What made it.
    pub tool: Tool,
    /// `restore`.
    pub command: &'static str,
    /// Every setting as resolved.
    pub settings: Map<String, Value>,
    /// The archive as given.
    pub path: String,
    /// First row restored, from 0.
    pub first: u64,
    /// Rows restored.
    pub rows: u64,
    /// Remarks; with recovery, what is lost.
    pub notes: Vec<Finding>,
    /// What was written.
    pub outputs: Vec<OutputReport>,
}
