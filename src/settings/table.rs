//! The options of the program, one row each: parser, help, recipe keys and JSON settings all follow from this table.

/// Which commands take an option.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Group {
    /// How the file is read: every command that reads a record.
    Input,
    /// Which part of the record is used: every command that reads a record.
    Cut,
    /// Repair of the record: every command that reads a record.
    Repair,
    /// What is assumed past the ends.
    Stage,
    /// What is done to the record.
    Operators,
    /// How the result is judged.
    Judgement,
    /// How the result is written.
    Output,
}

impl Group {
    /// Heading in help texts.
    pub const fn heading(self) -> &'static str {
        match self {
            Group::Input => "Input",
            Group::Cut => "Cut",
            Group::Repair => "Repair",
            Group::Stage => "Ends",
            Group::Operators => "Operators",
            Group::Judgement => "Judgement",
            Group::Output => "Output",
        }
    }
}

/// How often an option may be given.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Arity {
    /// A switch without a value.
    Switch,
    /// Once, with a value.
    Once,
    /// Any number of times, with a value each.
    Many,
}

/// One option.
#[derive(Debug, Clone, Copy)]
pub struct OptionRow {
    /// Long name without dashes, also the recipe key.
    pub key: &'static str,
    /// What the value stands for.
    pub value: &'static str,
    /// How often it may be given.
    pub arity: Arity,
    /// Where it belongs.
    pub group: Group,
    /// Help text: what it does, unit, default.
    pub help: &'static str,
}

const fn row(key: &'static str, value: &'static str, arity: Arity, group: Group, help: &'static str) -> OptionRow {
    OptionRow { key, value, arity, group, help }
}

use crate::error::{Error, Result};
use crate::operator::STEPS;
use Arity::{Many, Once, Switch};
use Group::{Cut, Input, Judgement, Operators, Output, Repair, Stage};

/// The options that are not operators; `rows` gives all.
#[rustfmt::skip]
static OPTIONS: &[OptionRow] = &[
    row("channel", "NAME", Many, Input, "Channel to use, by name or by number as #2; may be repeated. Default: every numeric channel but the time column"),
    row("rate", "RATE", Once, Input, "Sampling rate where the file tells none, or to overrule it: 200 or 200Hz; for profiles 2/mm"),
    row("time-column", "NAME", Once, Input, "The column of stamps (or positions), by name or by number as #1; 'none' if there is none"),
    row("time-unit", "UNIT", Once, Input, "Unit of the stamps where the header tells none: s, ms, us, ns, m, mm, um"),
    row("delimiter", "CHAR", Once, Input, "Field separator of the text: ',' ';' '|' tab or blank. Default: detected"),
    row("decimal", "CHAR", Once, Input, "Decimal mark: '.' or ','. Default: detected together with the separator"),
    row("thousands", "CHAR", Once, Input, "Thousands separator inside numbers, where there is one"),
    row("header-lines", "COUNT", Once, Input, "Number of lines above the data. Default: detected"),
    row("missing", "TEXT", Many, Input, "A further spelling that stands for a missing value, such as -9999; may be repeated"),
    row("unit", "NAME=UNIT", Many, Input, "Unit of a channel where the header tells none or a wrong one, such as ax=g; may be repeated"),
    row("calibrate", "NAME=FACTOR[UNIT]", Many, Input, "Factor from the numbers in the file to a unit, such as ch1=98.1m/s2; may be repeated"),
    row("allow-truncated", "", Switch, Input, "Accept a file whose end is missing, with a note"),
    row("from", "STAMP", Once, Cut, "First stamp to use, with its unit: 2.5s, 30mm"),
    row("to", "STAMP", Once, Cut, "Last stamp to use, with its unit"),
    row("gaps", "HOW", Once, Repair, "What to do with missing rows and values: reject (default), fill (interpolates gaps of up to one cycle of the content) or split (works on each stretch between gaps; part k of OUT.csv goes to OUT-k.csv)"),
    row("duplicates", "HOW", Once, Repair, "What to do with repeated rows: reject (default) or drop (equal ones only)"),
    row("regrid", "HOW", Once, Repair, "What to do with uneven stamps: auto (default) interpolates jittered or drifting ones onto an even grid, by a cubic spline or, for content above a fifth of the rate, by the least-squares series; cubic and least-squares also those that are nearly even; off takes the samples as even"),
    row("strict", "", Switch, Repair, "Turn every note into an error"),
    row("extension", "NAME", Once, Stage, "What is assumed past the two ends. auto (default): an asserted structure, else a closed record that proves itself, else the forecast; symmetric: the verdict's pick among the bases; or by name: forecast, periodic, even, odd, even-odd, odd-even"),
    row("baseline", "NAME", Once, Stage, "Polynomial split off first, with a named extension: none, mean, level[:left|:right], line, slopes, trend[:DEGREE]. Default: none; level with mixed ends; slopes for integrals and derivatives with even"),
    row("seat", "NAME", Once, Stage, "Where the mirrors sit: half-sample (default) or whole-sample"),
    row("assert", "[END:]WHAT", Many, Stage, "What is known about the ends: zero-slope, zero-value or closed; with left: or right: for one end. Followed, and checked for contradiction"),
    row("shape", "NAME", Once, Operators, "Roll-off: butterworth:ORDER (zero phase, squared magnitude, gain 0.5 at the corner), gaussian, cosine:WIDTH, brickwall. Default: butterworth:4"),
    row("running-rms", "TIME", Once, Operators, "A further column a channel with its running RMS over this time, such as 1s or 0.125s; also the integration time of --weighting, 1s there by default"),
    row("tolerance", "ERROR", Once, Judgement, "Edge error that is tolerable: a share of the output's standard deviation (10%, the default) or a value with its unit (0.02m/s)"),
    row("require", "WHAT", Once, Judgement, "Exit with 1 where an edge error is not within, or not at least borderline: within or borderline. The output is written all the same"),
    row("edges", "HOW", Once, Judgement, "Output outside the trusted span: keep (default), mark (a column 'trusted'), blank (empty cells) or trim (cut off, with the new start stamp)"),
    row("mark-repairs", "", Switch, Output, "Add a column 'repaired' that tells which samples were filled in or replaced"),
    row("format", "NAME", Once, Output, "Format of the output: csv or wav. Default: what the output's name says, else that of the input"),
    row("encoding", "NAME", Once, Output, "Sample type of WAV output: pcm16, pcm24, pcm32, float32 (default), float64"),
    row("decimals", "COUNT", Once, Output, "Fixed decimals in CSV output. Default: the shortest digits that give the same number again"),
];

/// Every option that changes a result, in the order of help texts: operators follow from their own table.
pub fn rows() -> Vec<OptionRow> {
    let operators = STEPS.iter().map(|step| {
        // Filters may be repeated: their gains multiply. Of the others a run takes one.
        let repeated = ["response", "lowpass", "highpass", "bandpass", "bandstop", "notch"];
        let arity = if repeated.contains(&step.key) { Many } else { Once };
        row(step.key, step.value, arity, Operators, step.help)
    });
    let (before, after) = OPTIONS.split_at(OPTIONS.iter().position(|row| row.group == Operators).unwrap_or(0));
    before.iter().copied().chain(operators).chain(after.iter().copied()).collect()
}

/// The row of a key.
pub fn find(key: &str) -> Option<OptionRow> {
    rows().into_iter().find(|row| row.key == key)
}

/// The row of a key that must be there.
///
/// # Errors
/// `Usage` with the nearest known key.
pub fn known(key: &str) -> Result<OptionRow> {
    find(key).ok_or_else(|| {
        let all = rows();
        let error = Error::usage(format!("unknown setting {key:?}"));
        match nearest(key, all.iter().map(|row| row.key)) {
            Some(known) => error.remedy(format!("did you mean {known:?}?")),
            None => error,
        }
    })
}

/// The name that a mistyped one was probably meant to be.
pub fn nearest<'a>(name: &str, known: impl Iterator<Item = &'a str>) -> Option<&'a str> {
    known
        .map(|known| (strsim::jaro_winkler(known, name), known))
        .max_by(|a, b| a.0.total_cmp(&b.0))
        .filter(|(likeness, _)| *likeness > 0.8)
        .map(|(_, known)| known)
}
