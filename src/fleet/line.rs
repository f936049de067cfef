//! One line of results: what became of one record. The same record gives the same line, whenever and wherever it runs.

use serde::Serialize;
use serde_json::{Map, Value};

use crate::audit::Audit;
use crate::error::{Error, Finding, Kind};
use crate::fleet::name::Shown;
use crate::fleet::plan::{Planned, hex};
use crate::fleet::shard::Shard;
use crate::operator::ChainDescription;
use crate::place::Place;
use crate::report::{
    ChannelReport, ExtensionReport, InOut, InputReport, Report, SCHEMA, Tool, TrustedReport, VerdictReport,
};
use crate::settings::Settings;
use crate::unit::Unit;

/// The first line of a file of results.
#[derive(Debug, Clone, Serialize)]
pub struct Head {
    /// Version of the layout.
    pub schema: u32,
    /// What made it.
    pub tool: Tool,
    /// `batch`.
    pub command: &'static str,
    /// Fingerprint of the plan.
    pub plan_sha256: String,
    /// `K/N`.
    pub shard: String,
    /// Records of the whole plan.
    pub records: u64,
}

impl Head {
    /// The head of a shard's file.
    pub fn new(plan_sha256: &str, shard: Shard, records: u64) -> Head {
        let (plan_sha256, shard) = (plan_sha256.to_owned(), shard.to_string());
        Head { schema: SCHEMA, tool: Tool::THIS, command: "batch", plan_sha256, shard, records }
    }
}

/// What became of a record.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Serialize, serde::Deserialize)]
#[serde(rename_all = "snake_case")]
pub enum Status {
    /// It was conditioned and written.
    Done,
    /// It was not; `failure` tells why.
    Failed,
    /// It is an earlier record under another name; `same_as` tells which.
    Repeated,
}

/// A line of results.
#[derive(Debug, Clone, Serialize)]
pub struct Line {
    /// Version of the layout.
    pub schema: u32,
    /// What made it.
    pub tool: Tool,
    /// `batch`.
    pub command: &'static str,
    /// Number in the list, from 0.
    pub record: u64,
    /// What became of it.
    pub status: Status,
    /// The input as given.
    #[serde(flatten)]
    pub name: Shown,
    /// SHA-256 of the input; null where it could not be read.
    pub input_sha256: Option<String>,
    /// Fingerprint of the settings and the version of the program.
    pub settings_sha256: String,
    /// Every setting as resolved: giving them again gives the same bytes.
    pub settings: Map<String, Value>,
    /// What was read.
    pub input: Option<InputReport>,
    /// What is in the record.
    pub audit: Option<Audit>,
    /// Remarks on the whole record.
    pub notes: Vec<Finding>,
    /// The resolved operators.
    pub chain: Option<ChainDescription>,
    /// One entry a channel.
    pub channels: Vec<ChannelLine>,
    /// False where `--require` was not met.
    pub requirement_met: Option<bool>,
    /// What was written.
    pub outputs: Vec<OutputLine>,
    /// Why it failed.
    pub failure: Option<Failure>,
    /// The record that it repeats.
    pub same_as: Option<u64>,
}

/// A channel's result in few words.
#[derive(Debug, Clone, Serialize)]
pub struct ChannelLine {
    /// Name.
    pub name: String,
    /// Unit of the output.
    pub unit: Unit,
    /// Unit of the input.
    pub unit_in: Unit,
    /// Remarks on this channel.
    pub notes: Vec<Finding>,
    /// What was split off first, as in the option.
    pub baseline: String,
    /// What was assumed past the ends.
    pub extension: ExtensionReport,
    /// Samples beyond which less than 0.1 % of the kernel's area lies.
    pub reach_samples: Option<f64>,
    /// The verdict with predicted edge error and bound.
    pub verdict: Option<VerdictReport>,
    /// The trusted span.
    pub trusted: Option<TrustedReport>,
    /// RMS before and after.
    pub rms: InOut<Option<f64>>,
}

/// A file that was written.
#[derive(Debug, Clone, Serialize)]
pub struct OutputLine {
    /// Its name inside the output folder.
    #[serde(flatten)]
    pub name: Shown,
    /// SHA-256 of its bytes.
    pub sha256: String,
}

/// Why a record failed.
#[derive(Debug, Clone, Serialize)]
pub struct Failure {
    /// The kind of fault, or `panic`.
    pub kind: String,
    /// Where.
    pub place: Place,
    /// What.
    pub text: String,
    /// What would settle it.
    pub remedy: Option<String>,
}

impl Failure {
    /// An error as a failure.
    pub fn of(error: &Error) -> Failure {
        let kind = match error.kind() {
            Kind::Usage => "usage",
            Kind::Malformed => "malformed",
            Kind::Unsupported => "unsupported",
            Kind::Io | Kind::Closed => "io",
            Kind::Interrupted => "interrupted",
        };
        Failure {
            kind: kind.to_owned(),
            place: error.place().clone(),
            text: error.what().to_owned(),
            remedy: error.advice().map(str::to_owned),
        }
    }

    /// A fault of the program itself.
    pub fn panic(text: &str) -> Failure {
        Failure {
            kind: "panic".to_owned(),
            place: Place::default(),
            text: format!("the program failed on this record: {text}"),
            remedy: Some("please report it with the record".to_owned()),
        }
    }
}

impl Line {
    fn blank(record: u64, planned: &Planned, status: Status) -> Line {
        Line {
            schema: SCHEMA,
            tool: Tool::THIS,
            command: "batch",
            record,
            status,
            name: Shown::of(&planned.path),
            input_sha256: None,
            settings_sha256: hex(&planned.settings_sha256),
            settings: Map::new(),
            input: None,
            audit: None,
            notes: Vec::new(),
            chain: None,
            channels: Vec::new(),
            requirement_met: None,
            outputs: Vec::new(),
            failure: None,
            same_as: None,
        }
    }

    /// A record that was conditioned.
    pub fn done(record: u64, planned: &Planned, report: Report, audit: Option<Audit>) -> Line {
        let name = Shown::of(&planned.output);
        Line {
            input_sha256: Some(report.input.sha256.clone()),
            settings: report.settings,
            input: Some(report.input),
            audit,
            notes: report.notes,
            chain: Some(report.chain),
            channels: report.channels.into_iter().map(ChannelLine::of).collect(),
            requirement_met: Some(report.requirement_met),
            outputs: report
                .outputs
                .into_iter()
                .map(|out| OutputLine { name: name.clone(), sha256: out.sha256 })
                .collect(),
            ..Line::blank(record, planned, Status::Done)
        }
    }

    /// A record that failed; its settings are shown where they could be read.
    pub fn failed(
        record: u64,
        planned: &Planned,
        settings: Option<&Settings>,
        input_sha256: Option<String>,
        failure: Failure,
    ) -> Line {
        Line {
            input_sha256,
            settings: settings.map(Settings::to_map).unwrap_or_default(),
            failure: Some(failure),
            ..Line::blank(record, planned, Status::Failed)
        }
    }

    /// A record that repeats another.
    pub fn repeated(record: u64, planned: &Planned, same_as: u64) -> Line {
        Line { same_as: Some(same_as), ..Line::blank(record, planned, Status::Repeated) }
    }

    /// The line with its end, as it is written.
    ///
    /// # Errors
    /// `Io` for what JSON cannot hold, which no line contains.
    pub fn bytes(&self) -> crate::error::Result<Vec<u8>> {
        let mut bytes = serde_json::to_vec(self).map_err(|error| Error::io(format!("no JSON: {error}")))?;
        bytes.push(b'\n');
        Ok(bytes)
    }
}

impl ChannelLine {
    fn of(channel: ChannelReport) -> ChannelLine {
        ChannelLine {
            name: channel.name,
            unit: channel.unit,
            unit_in: channel.unit_in,
            notes: channel.notes,
            baseline: channel.baseline.kind,
            extension: channel.extension,
            reach_samples: channel.reach.samples,
            verdict: channel.verdict,
            trusted: channel.trusted,
            rms: channel.rms,
        }
    }
}
