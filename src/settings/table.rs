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
    /// How a spectrum is formed and what is read from it.
    Spectrum,
    /// How the result is judged.
    Judgement,
    /// How the result is written.
    Output,
    /// What an archive may lose.
    Archive,
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
            Group::Spectrum => "Spectrum",
            Group::Judgement => "Judgement",
            Group::Output => "Output",
            Group::Archive => "Archive",
        }
    }
}

/// Groups of `condition` and `batch`.
pub const CONDITION: &[Group] = &[Operators, Stage, Judgement, Cut, Repair, Input, Output];
/// Groups of `compare`.
pub const COMPARE: &[Group] = &[Operators, Stage, Judgement, Cut, Repair, Input];
/// Groups of `spectrum`.
pub const SPECTRUM: &[Group] = &[Spectrum, Operators, Stage, Cut, Repair, Input];

/// Groups of `compress`.
pub const COMPRESS: &[Group] = &[Archive, Input];

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
use Group::{Archive, Cut, Input, Judgement, Operators, Output, Repair, Spectrum, Stage};

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
    row("memory", "SIZE", Once, Input, "Refuse, before working, what would take more memory than this: 500MB, 4GiB. Default: no bound. For batch: of all jobs together, by default half of what is free"),
    row("allow-truncated", "", Switch, Input, "Accept a file whose end is missing, with a note"),
    row("from", "STAMP", Once, Cut, "First stamp to use, with its unit: 2.5s, 30mm"),
    row("to", "STAMP", Once, Cut, "Last stamp to use, with its unit"),
    row("gaps", "HOW", Once, Repair, "What to do with missing rows and values: reject (default), fill (interpolates gaps of up to one cycle of the content), smooth (left to --smooth, which bridges them) or split (works on each stretch between gaps; part k of OUT.csv goes to OUT-k.csv)"),
    row("duplicates", "HOW", Once, Repair, "What to do with repeated rows: reject (default) or drop (equal ones only)"),
    row("regrid", "HOW", Once, Repair, "What to do with uneven stamps: auto (default) interpolates jittered or drifting ones onto an even grid, by a cubic spline or, for content above a fifth of the rate, by the least-squares series; cubic and least-squares also those that are nearly even; off takes the samples as even"),
    row("strict", "", Switch, Repair, "Turn every note into an error"),
    row("extension", "NAME", Once, Stage, "What is assumed past the two ends. auto (default): an asserted structure, else a closed record that proves itself, else the forecast, and even where nothing can be judged (no operator, no corner, an integral without high-pass, a constant or under 16 samples); symmetric: the verdict's pick among the bases; or by name: forecast, periodic, even, odd, even-odd, odd-even"),
    row("baseline", "NAME", Once, Stage, "Polynomial split off first, with a named extension or both ends asserted: none, mean, level[:left|:right], line, slopes, tangents (slopes of cubic fits), trend[:DEGREE]. Default: none; level with mixed ends; tangents for integrals and derivatives with even"),
    row("seat", "NAME", Once, Stage, "Where the mirrors sit: half-sample (default) or whole-sample"),
    row("assert", "[END:]WHAT", Many, Stage, "What is known about the ends: zero-slope, zero-value or closed; with left: or right: for one end. Followed, and checked for contradiction"),
    row("conditions", "NAME", Once, Operators, "End conditions of an integral: start-rest, rest, rest-to=D, start-rest-to=D (at rest at the start or both ends, displaced by D), pinned[=D] (displacement known at both ends), steady[:offset] (motion about a fixed place), zero-mean (whole cycles, periodic), still=A..B[,C..D] (at rest in these stretches). Needed with --integrate: there is no default"),
    row("offset", "VALUE", Once, Operators, "Sensor offset taken off before an integral, with start-rest and pinned: a value with its unit, or the quiet stretch whose mean it is (0s..1.5s)"),
    row("insist", "", Switch, Operators, "Take end conditions that the motion at the record's ends speaks against"),
    row("target-sigma", "ERROR", Once, Operators, "Uncertainty that an integral should have: the report names the high-pass that gives it. A share of its peak (5%, the default) or a value with its unit"),
    row("beside", "COLUMN", Many, Operators, "A further column for each integrated channel: sigma (standard deviation from the record's noise) or corrected (the record less offset and drift, filtered, whose integral the result is)"),
    row("shape", "NAME", Once, Operators, "Roll-off: butterworth:ORDER (zero phase, squared magnitude, gain 0.5 at the corner), gaussian, cosine:WIDTH, brickwall. Default: butterworth:4"),
    row("running-rms", "TIME", Once, Operators, "A further column a channel with its running RMS over this time, such as 1s or 0.125s; also the integration time of --weighting, 1s there by default"),
    row("method", "NAME", Once, Spectrum, "welch (default): density from averaged segments; sine: density from sine tapers over the whole record, their number chosen line by line; sine:COUNT: so many of them; basis: coefficients in the basis of the ends"),
    row("segment", "LENGTH", Once, Spectrum, "Length of a segment: samples (512), a duration (2s), or the spacing of its lines (0.5Hz). Default: about an eighth of the record, lines on round frequencies where the rate allows"),
    row("window", "NAME", Once, Spectrum, "Window of the segments: hann (default), rectangular, hamming, blackman, blackman-harris, nuttall, flat-top, flat-top-hft70, flat-top-hft95, flat-top-hft90d, flat-top-5"),
    row("overlap", "SHARE", Once, Spectrum, "Overlap of the segments: 50% or 0.5. Default: what suits the window, 50% for hann"),
    row("detrend", "WHAT", Once, Spectrum, "Taken off before a density is formed: none, mean (default), line, quadratic or cubic by least squares through the whole record; segment-mean or segment-line through every segment"),
    row("confidence", "SHARE", Once, Spectrum, "Confidence of the limits. Default: 95%"),
    row("band", "RANGE", Many, Spectrum, "RMS in a band, lines at its edges counted by their share: 2Hz..40Hz; may be repeated"),
    row("octaves", "WIDTH", Once, Spectrum, "Band levels by IEC 61260-1, base ten: third, octave or none (default). Bands of fewer than 5 lines are refused"),
    row("lines", "COUNT", Once, Spectrum, "Spectral lines to list at most, with interpolated frequency and amplitude. Default: 5"),
    row("road", "", Switch, Spectrum, "Class of a road profile by its displacement density, ISO 8608"),
    row("against", "EXTENSION[+BASELINE]", Once, Spectrum, "A second extension laid over the first: odd+line. With --method basis, or with operators"),
    row("tolerance", "ERROR", Once, Judgement, "Edge error that is tolerable: a share of the output's standard deviation (10%, the default) or a value with its unit (0.02m/s)"),
    row("require", "WHAT", Once, Judgement, "Exit with 1 where an edge error is not within, or not at least borderline: within or borderline. What no assumption can spoil (no operator, a constant) counts as met. The output is written all the same"),
    row("edges", "HOW", Once, Judgement, "Output outside the trusted span: keep (default), mark (a column 'trusted', which is no channel when it is read back), blank (empty cells) or trim (cut off, with the new start stamp)"),
    row("mark-repairs", "", Switch, Output, "Add a column 'repaired' that tells which samples were filled in or replaced"),
    row("format", "NAME", Once, Output, "Format of the output: csv or wav. Default: what the output's name says, else that of the input"),
    row("encoding", "NAME", Once, Output, "Sample type of WAV output: pcm16, pcm24, pcm32, float32 (default), float64"),
    row("decimals", "COUNT", Once, Output, "Fixed decimals in CSV output. Default: the shortest digits that give the same number again"),
    row("max-error", "ERROR", Once, Archive, "No sample is off by more: in the channel's unit (0.01 or 0.01g), as a share of its range (0.1%) or as a multiple of its noise (0.5x)"),
    row("rms-error", "ERROR", Once, Archive, "The root of the mean squared error is at most this; written as for --max-error"),
    row("lossless", "", Switch, Archive, "Every sample comes back as it was"),
    row("keep", "COUNT", Once, Archive, "The plain truncated cosine basis: the first COUNT coefficients of each channel, with no bound on the error"),
    row("corner", "CORNER", Once, Archive, "The same for coefficients below a corner: 40Hz, 2.5s, 0.8mm"),
    row("effort", "LEVEL", Once, Archive, "How long to look for the smallest archive: 1 one mode, 2 (default) all modes tried on stretches, 3 all modes in full"),
    row("bare", "", Switch, Archive, "Leave out the source's layout, notes and provenance: for very short records"),
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
