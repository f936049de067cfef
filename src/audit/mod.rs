//! What is in a record and whether it is fit for use: rate, gaps, clipping, spikes, noise, levels, end state.

pub mod clip;
pub mod endstate;
pub mod estimate;
pub mod fault;
pub mod level;
pub mod quantisation;
pub mod sparse;
pub mod spike;
pub mod stamps;

use serde::Serialize;

use crate::error::Finding;
use crate::numeric::noise;
use crate::place::Place;
use crate::record::{RawChannel, RawRecord};
use crate::unit::Unit;

use clip::{Certainty, Clipping};
use endstate::EndState;
use estimate::Estimate;
use level::Level;
use quantisation::Quantisation;
use sparse::Sparse;
use spike::Spikes;
use stamps::{Beside, StampReading};

/// What an audit found.
#[derive(Debug, Clone, Serialize)]
pub struct Audit {
    /// Rows of the record.
    pub rows: usize,
    /// What the time or position column says, where there is one.
    pub stamps: Option<StampReading>,
    /// A rate that the header or the user states, in Hz or samples per metre.
    pub stated_rate: Option<f64>,
    /// Every channel in file order.
    pub channels: Vec<ChannelAudit>,
    /// The memory that a run will take.
    pub estimate: Estimate,
    /// Remarks of the reader, then of the audit. Faults that would stop a run are among them.
    pub findings: Vec<Finding>,
}

/// What an audit found in one channel. Sample indices count rows of the file from 0.
#[derive(Debug, Clone, Serialize)]
pub struct ChannelAudit {
    /// Name.
    pub name: String,
    /// Unit.
    pub unit: Unit,
    /// Rows without a value.
    pub missing: usize,
    /// The first of them.
    pub first_missing: Option<usize>,
    /// The pattern of a channel recorded at a lower rate.
    pub sparse: Option<Sparse>,
    /// Offset, RMS, peak and shape; `None` without a value.
    pub level: Option<Level>,
    /// How finely it is stepped.
    pub quantisation: Quantisation,
    /// Clipping.
    pub clipping: Clipping,
    /// Spikes.
    pub spikes: Spikes,
    /// White noise sigma from third differences, in the channel's unit.
    pub noise: Option<f64>,
    /// Whether the ends are at rest.
    pub end: Option<EndState>,
}

/// A check of one channel.
pub struct Check {
    /// Name, as reports print it.
    pub name: &'static str,
    /// What it looks for, for help texts.
    pub about: &'static str,
    /// Fills its part of the audit and adds remarks.
    run: fn(&mut Sheet<'_>),
}

/// All checks of a channel, in order: later ones use what earlier ones found.
pub static CHECKS: &[Check] = &[
    Check {
        name: "missing values",
        about: "rows without a value, and channels recorded at a lower rate",
        run: missing,
    },
    Check { name: "level", about: "offset, RMS, peak, crest factor, kurtosis, constant channels", run: levels },
    Check { name: "quantisation", about: "least significant bit, bits in use, 32-bit floats", run: quantised },
    Check { name: "clipping", about: "samples at full scale and plateaus that look like it", run: clipped },
    Check { name: "spikes", about: "single samples that stand out", run: spiked },
    Check { name: "noise", about: "white noise sigma from third differences", run: noisy },
    Check { name: "end state", about: "whether the record starts and ends at rest", run: ended },
];

/// Audits a record. Cannot fail: whatever is wrong becomes a finding.
pub fn audit(raw: &RawRecord) -> Audit {
    let rows = raw.channels.iter().map(|c| c.values.len()).max().unwrap_or(0);
    let mut findings = raw.findings.clone();
    let stamps = read_stamps(raw);
    if let (Some(reading), Some(column)) = (&stamps, &raw.stamps) {
        let place_of = |row: usize| fault::row_place(raw, row);
        findings.extend(fault::stamp_fault(column, reading, &place_of).map(|fault| fault.finding()));
        findings.extend(fault::stamp_remarks(reading, &place_of));
    }
    let mut channels = Vec::new();
    for (index, channel) in raw.channels.iter().enumerate() {
        let mut sheet = Sheet::new(raw, index, channel);
        for check in CHECKS {
            (check.run)(&mut sheet);
        }
        findings.append(&mut sheet.findings);
        channels.push(sheet.audit);
    }
    let estimate = Estimate::of(raw.channels.len(), rows as u64, raw.source.bytes);
    Audit { rows, stamps, stated_rate: raw.stated_rate.as_ref().map(|r| r.rate_base), channels, estimate, findings }
}

/// The reading of a record's stamps, with a rate that the user gave and the repetition of whole rows beside them.
pub fn read_stamps(raw: &RawRecord) -> Option<StampReading> {
    let stamps = raw.stamps.as_ref()?;
    let scale = stamps.unit.meaning().map_or(1.0, |m| m.scale);
    let given = raw.stated_rate.as_ref().filter(|rate| rate.given && rate.unit.is_time() == stamps.unit.is_time());
    let same_row = |row: usize| raw.channels.iter().all(|channel| same_value(channel, row));
    let beside = Beside { step: given.map(|rate| 1.0 / (rate.rate_base * scale)), same_row: &same_row };
    Some(StampReading::new(stamps, &beside))
}

/// True when a channel holds the same value, or none, on a row and the row before it.
fn same_value(channel: &RawChannel, row: usize) -> bool {
    let at = |row: usize| channel.values.get(row).copied().unwrap_or(f64::NAN);
    let (before, now) = (at(row.wrapping_sub(1)), at(row));
    before == now || (before.is_nan() && now.is_nan())
}

/// A channel under audit.
struct Sheet<'a> {
    raw: &'a RawRecord,
    /// Its place in the record.
    index: usize,
    channel: &'a RawChannel,
    /// Samples at the channel's own rate, NaN where there is none.
    samples: std::borrow::Cow<'a, [f64]>,
    /// The finite ones in ascending order.
    sorted: Vec<f64>,
    audit: ChannelAudit,
    findings: Vec<Finding>,
}

impl<'a> Sheet<'a> {
    fn new(raw: &'a RawRecord, index: usize, channel: &'a RawChannel) -> Sheet<'a> {
        let sparse = Sparse::of(channel);
        let samples = match sparse {
            Some(s) => channel.values.iter().skip(s.first).step_by(s.every).copied().collect::<Vec<_>>().into(),
            None => std::borrow::Cow::Borrowed(&channel.values[..]),
        };
        let mut sorted: Vec<f64> = samples.iter().copied().filter(|v| v.is_finite()).collect();
        sorted.sort_unstable_by(f64::total_cmp);
        let audit = ChannelAudit {
            name: channel.name.clone(),
            unit: channel.unit.clone(),
            missing: channel.missing.len(),
            first_missing: channel.missing.first().copied(),
            sparse,
            level: None,
            quantisation: Quantisation::default(),
            clipping: Clipping::default(),
            spikes: Spikes::default(),
            noise: None,
            end: None,
        };
        Sheet { raw, index, channel, samples, sorted, audit, findings: Vec::new() }
    }

    /// Row of the file that holds a sample.
    fn row(&self, sample: usize) -> usize {
        self.audit.sparse.map_or(sample, |s| s.first + sample * s.every)
    }

    fn say(&mut self, code: &'static str, text: String, row: Option<usize>) {
        let place = match row {
            Some(row) => self.raw.place(self.index, row),
            None => Place::channel(&self.channel.name).within(&Place::file(&self.raw.source.path)),
        };
        self.findings.push(Finding::new(code, text).at(place));
    }

    /// The finite samples in time order.
    fn finite(&self) -> std::borrow::Cow<'_, [f64]> {
        if self.sorted.len() == self.samples.len() {
            return std::borrow::Cow::Borrowed(&self.samples);
        }
        self.samples.iter().copied().filter(|v| v.is_finite()).collect::<Vec<_>>().into()
    }
}

fn missing(sheet: &mut Sheet<'_>) {
    match (sheet.audit.sparse, sheet.audit.first_missing) {
        (Some(sparse), _) => {
            // The reader may have said so already, of the same column.
            let column = sheet.raw.place(sheet.index, 0).column;
            let said = |f: &Finding| f.code == "sparse_channel" && f.place.column == column;
            if !sheet.raw.findings.iter().any(said) {
                sheet.say(
                    "sparse_channel",
                    format!("a value on every {} rows: a channel at its own rate", sparse.every),
                    None,
                );
            }
        }
        (None, Some(first)) => {
            let spelling = sheet.channel.missing_spelling.as_deref().unwrap_or_default();
            let text = format!("no value ({spelling:?}), the first of {}", sheet.audit.missing);
            sheet.say("missing_values", text, Some(first));
        }
        (None, None) => {}
    }
}

fn levels(sheet: &mut Sheet<'_>) {
    sheet.audit.level = Level::of(&sheet.finite());
    if let Some(level) = sheet.audit.level
        && level.low == level.high
        && sheet.sorted.len() > 1
    {
        sheet.say("constant_channel", format!("every sample is {}", fault::figure(level.low)), None);
    }
}

fn quantised(sheet: &mut Sheet<'_>) {
    sheet.audit.quantisation = Quantisation::of(&sheet.sorted);
    let levels = sheet.audit.quantisation.levels;
    if (2..=3).contains(&levels) && sheet.sorted.len() > 50 {
        sheet.say("few_levels", format!("only {levels} distinct values: a dead or a digital channel"), None);
    }
}

fn clipped(sheet: &mut Sheet<'_>) {
    let steps = &sheet.audit.quantisation;
    sheet.audit.clipping = Clipping::of(&sheet.samples, &sheet.sorted, steps, sheet.channel.full_scale);
    let Clipping { high, low } = sheet.audit.clipping.clone();
    for clip in [high, low].into_iter().flatten() {
        let how = if clip.certainty == Certainty::Certain { "clipped" } else { "looks clipped" };
        let text =
            format!("{how} at {}: {} samples, longest run {}", fault::figure(clip.level), clip.count, clip.longest_run);
        sheet.say("clipping", text, Some(sheet.row(clip.first)));
    }
}

fn spiked(sheet: &mut Sheet<'_>) {
    sheet.audit.spikes = Spikes::of(&sheet.samples, sheet.audit.quantisation.floor());
    let spikes = &mut sheet.audit.spikes;
    if let Some(sparse) = sheet.audit.sparse {
        spikes.samples.iter_mut().for_each(|n| *n = sparse.first + *n * sparse.every);
    }
    let (first, count) = (spikes.samples.first().copied(), spikes.count);
    if let Some(first) = first {
        let text = if count == 1 { "one spike".to_owned() } else { format!("{count} spikes, the first of them here") };
        sheet.say("spikes", text, Some(first));
    }
}

fn noisy(sheet: &mut Sheet<'_>) {
    let sigma = if sheet.samples.len() < 8 { None } else { Some(noise::sigma(&sheet.finite())) };
    sheet.audit.noise = sigma.filter(|s| s.is_finite());
}

fn ended(sheet: &mut Sheet<'_>) {
    sheet.audit.end = EndState::of(&sheet.finite());
}
