//! The overview of a merged batch: what is whole, what failed and why, how the edges came out, what is to be done again.

use std::collections::BTreeMap;
use std::fmt::Write;

use serde_json::Value;

use crate::fleet::agreement::Agreement;
use crate::fleet::gathering::{Gathering, Standing};
use crate::fleet::merge::{Stale, reason};
use crate::fleet::ranking::Ranking;
use crate::fleet::summary::{EdgeErrors, FailureGroup, Summary};
use crate::fleet::table;
use crate::place::escape;
use crate::report::{CAUTION, SCHEMA, Tool, WEIGHTED_CAUTION};

/// Counts over all records of a batch.
#[derive(Debug, Clone, Default)]
pub struct Overview {
    /// Records of the list.
    pub records: u64,
    /// Conditioned, their outputs as told.
    pub done: u64,
    /// Earlier records under another name.
    pub repeated: u64,
    /// Failed in every attempt.
    pub failed: u64,
    /// Conditioned, but below `--require`.
    pub below: u64,
    /// Without a result, with an output that is gone or is another than told: number, name and reason of the first few.
    pub redo: Vec<(u64, String, &'static str)>,
    /// All of these.
    pub open: u64,
    /// Lines that no record of the plan answers to.
    pub extra: u64,
    superseded: u64,
    torn: u64,
    other_plans: u64,
    temporaries: u64,
    removed: bool,
    stale: Vec<String>,
    failures: BTreeMap<String, FailureGroup>,
    extensions: BTreeMap<String, u64>,
    adequacies: BTreeMap<String, u64>,
    notes: BTreeMap<String, u64>,
    ranking: Ranking,
    agreement: Agreement,
    contents: BTreeMap<String, u32>,
}

/// Names shown of many at most.
const SHOWN: usize = 20;

impl Overview {
    pub(super) fn new(gathering: &Gathering, stale: Stale) -> Overview {
        let open = gathering.plan.iter().zip(&gathering.standings);
        let redo = open.clone().filter_map(|(planned, standing)| {
            reason(standing).map(|reason| (planned.record, escape(&planned.input.path), reason))
        });
        let stale_outputs = open
            .filter(|(_, standing)| matches!(standing, Standing::Failed { stale: true, .. }))
            .map(|(planned, _)| escape(&planned.output.path));
        Overview {
            records: gathering.plan.len() as u64,
            open: gathering.standings.iter().filter(|standing| reason(standing).is_some()).count() as u64,
            redo: redo.take(SHOWN).collect(),
            extra: gathering.extra,
            superseded: gathering.superseded,
            torn: gathering.torn,
            other_plans: gathering.other_plans,
            temporaries: gathering.temporaries.len() as u64,
            removed: stale == Stale::Remove,
            stale: stale_outputs.collect(),
            ..Overview::default()
        }
    }

    /// True where every record has its result and every result its output.
    pub fn is_complete(&self) -> bool {
        self.open == 0 && self.extra == 0
    }

    /// Counts a line of results.
    pub(super) fn count(&mut self, line: &Value) {
        match line["status"].as_str() {
            Some("failed") => {
                self.failed += 1;
                let failure = &line["failure"];
                let text = |key: &str| failure[key].as_str().map(str::to_owned);
                let kind = text("kind").unwrap_or_else(|| "unknown".to_owned());
                let example = || FailureGroup {
                    kind: kind.clone(),
                    count: 0,
                    path: line["path"].as_str().unwrap_or_default().to_owned(),
                    place: table::failure_place(line),
                    text: text("text").unwrap_or_default(),
                    remedy: text("remedy"),
                };
                self.failures.entry(kind.clone()).or_insert_with(example).count += 1;
            }
            Some("repeated") => self.repeated += 1,
            _ => self.done += 1,
        }
        self.below += u64::from(line["requirement_met"] == false);
        for channel in line["channels"].as_array().into_iter().flatten() {
            let extension = &channel["extension"];
            let (kind, how) = (extension["kind"].as_str().unwrap_or("-"), extension["how"].as_str().unwrap_or("-"));
            *self.extensions.entry(format!("{} ({how})", escape(kind))).or_default() += 1;
            let verdict = &channel["verdict"];
            let adequacy = verdict["adequacy"].as_str().unwrap_or("not judged").to_owned();
            *self.adequacies.entry(adequacy).or_default() += 1;
        }
        self.ranking.count(line);
        self.agreement.count(line);
        let findings = [&line["notes"], &line["audit"]["findings"]];
        let mut codes: Vec<&str> = findings
            .into_iter()
            .filter_map(Value::as_array)
            .flatten()
            .filter_map(|finding| finding["code"].as_str())
            .collect();
        codes.sort_unstable();
        codes.dedup();
        codes.into_iter().for_each(|code| *self.notes.entry(code.to_owned()).or_default() += 1);
        if let Some(sha256) = line["input_sha256"].as_str().filter(|_| line["status"] != "repeated") {
            // A quarter of the fingerprint tells contents apart well enough for a remark.
            *self.contents.entry(sha256.chars().take(16).collect()).or_default() += 1;
        }
    }

    /// For people.
    pub fn text(&self) -> String {
        let mut text = String::new();
        let mut parts = vec![format!("{} done", self.done)];
        for (count, what) in [
            (self.repeated, "repeated names"),
            (self.failed, "failed"),
            (self.below, "below --require"),
            (self.open, "to be done again"),
        ] {
            if count > 0 {
                parts.push(format!("{count} {what}"));
            }
        }
        // Writing to a string cannot fail.
        let _ = writeln!(text, "{} records: {}", self.records, parts.join(", "));
        for FailureGroup { kind, count, path, text: what, .. } in self.failures.values() {
            let _ = writeln!(text, "  failed, {kind}: {count}, such as {}: {}", escape(path), escape(what));
        }
        self.edges(&mut text);
        let listed = |counts: &BTreeMap<String, u64>| {
            counts.iter().map(|(name, count)| format!("{name} {count}")).collect::<Vec<_>>().join(", ")
        };
        if !self.extensions.is_empty() {
            let _ = writeln!(text, "  ends, by channels: {}", listed(&self.extensions));
        }
        if !self.notes.is_empty() {
            let _ = writeln!(text, "  notes, by records: {}", listed(&self.notes));
        }
        for (count, what) in self.remarks() {
            let _ = writeln!(text, "  {count} {what}");
        }
        if let Some(first) = self.stale.first() {
            let count = self.stale.len();
            let _ = writeln!(text, "  {count} outputs of an earlier run beside a failure of this one, such as {first}");
        }
        for (record, path, reason) in &self.redo {
            let _ = writeln!(text, "  to be done again: record {record}, {path}: {}", reason.replace('_', " "));
        }
        if self.open > self.redo.len() as u64 {
            let _ = writeln!(text, "  and {} more in results/redo.jsonl", self.open - self.redo.len() as u64);
        }
        if !self.is_complete() {
            text.push_str("incomplete: run the batch again, then merge\n");
        }
        text
    }

    fn edges(&self, text: &mut String) {
        let adequacy = |name: &str| self.adequacies.get(name).copied().unwrap_or(0);
        let channels: u64 = self.adequacies.values().sum();
        if channels == 0 {
            return;
        }
        let words = ["within", "borderline", "outside", "not judged"];
        let counts: Vec<String> =
            words.iter().filter(|word| adequacy(word) > 0).map(|word| format!("{} {word}", adequacy(word))).collect();
        let _ = writeln!(text, "  edges of {channels} channels: {}", counts.join(", "));
        let ranked = self.ranking.worst();
        let Some((worst, edges)) = ranked.first().zip(self.edge_errors()) else { return };
        let EdgeErrors { median, high, worst: share } = edges;
        let name = format!("{} of {}", escape(&worst.channel), escape(&worst.path));
        let _ = writeln!(
            text,
            "  edge error in % of its tolerance: median {median:.3}, 95 of 100 below {high:.3}, worst {share:.3} ({name})"
        );
    }

    /// Edge errors over all judged channels; `None` without any.
    fn edge_errors(&self) -> Option<EdgeErrors> {
        let shares = self.ranking.of_tolerance();
        // Nearest rank: a value that some channel has.
        let at = |share: f64| shares.get(((share * shares.len() as f64).ceil() as usize).max(1) - 1).copied();
        Some(EdgeErrors { median: at(0.5)?, high: at(0.95)?, worst: at(1.0)? })
    }

    /// What else is worth a remark, with its count.
    fn remarks(&self) -> Vec<(u64, &'static str)> {
        let alike: u64 = self.contents.values().filter(|count| **count > 1).map(|count| u64::from(*count)).sum();
        let mut remarks = vec![
            (alike, "records share their content with another"),
            (self.superseded, "results superseded by others of the same record"),
            (self.torn, "results cut short by a kill or a full disk, not counted"),
            (self.other_plans, "files of results belong to another list or other options, not counted"),
            (self.extra, "results of this list that no record of it answers to"),
            (self.temporaries, if self.removed { "stale temporary files removed" } else { STALE }),
        ];
        remarks.retain(|(count, _)| *count > 0);
        remarks
    }

    /// The overview as plain data, for JSON and for a page.
    pub fn summary(&self) -> Summary {
        Summary {
            schema: SCHEMA,
            tool: Tool::THIS,
            command: "merge",
            records: self.records,
            done: self.done,
            repeated: self.repeated,
            failed: self.failed,
            below_requirement: self.below,
            missing: self.open,
            doubled: self.superseded,
            extra: self.extra,
            failures: self.failures.values().cloned().collect(),
            redo: self.redo.clone(),
            adequacies: self.adequacies.clone(),
            extensions: self.extensions.clone(),
            notes: self.notes.clone(),
            remarks: self.remarks().into_iter().map(|(count, what)| format!("{count} {what}")).collect(),
            edge_error_percent_of_tolerance: self.edge_errors(),
            worst: self.ranking.worst(),
            settings: self.agreement.shared(),
            differing_settings: self.agreement.differing(),
            caution: if self.agreement.uses("weighting") { WEIGHTED_CAUTION } else { CAUTION },
        }
    }

    /// All channels by edge error.
    pub(super) fn ranking(&self) -> &Ranking {
        &self.ranking
    }
}

const STALE: &str = "stale temporary files of killed attempts; --clear-stale removes them when no attempt is running";
