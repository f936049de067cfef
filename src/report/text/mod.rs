//! Results for people: short lines and tables, units everywhere, nothing that a file could use to command a terminal.

mod archived;
mod audited;
mod compared;
mod conditioned;
mod exposed;
mod figure;
mod integrated;
mod planned;
mod spectral;

use comfy_table::presets::NOTHING;
use comfy_table::{CellAlignment, Table};

use crate::compare::How;
use crate::error::Finding;
use crate::report::{AxisReport, ExtensionReport, InputReport};
use crate::unit::counted;

pub use archived::{archive_text, listing_text, restore_text};
pub use audited::audit_text;
pub use compared::comparison_text;
pub use conditioned::summary;
pub use planned::plan_text;
pub use spectral::spectrum_text;

pub use figure::figure;
pub(super) use planned::operators_text;

/// A table without rules: first column to the left, the others to the right.
fn table(header: &[&str]) -> Table {
    let mut table = Table::new();
    table.load_style(NOTHING);
    table.set_header(header.to_vec());
    for (index, column) in table.column_iter_mut().enumerate() {
        column.set_padding((0, 2));
        if index > 0 {
            column.set_cell_alignment(CellAlignment::Right);
        }
    }
    table
}

/// The table's lines, two blanks in, no blanks at the end.
fn indented(table: &Table) -> String {
    table.to_string().lines().map(|line| format!("  {}\n", line.trim_end())).collect()
}

/// `hoist.csv: 2400 samples, 200 Hz (from the stamps, between ...), 0 s to 11.995 s`.
fn input_line(input: &InputReport) -> String {
    format!("{}: {}\n", crate::place::escape(&input.path), axis_text(&input.axis, input.samples))
}

fn axis_text(axis: &AxisReport, samples: usize) -> String {
    use crate::record::RateSource;
    let rate_unit = if axis.kind == "time" { "Hz" } else { "samples/m" };
    let how = match axis.how {
        RateSource::Given => "as given",
        RateSource::Header => "from the header",
        RateSource::Stamps => "from the stamps",
    };
    let interval = match axis.rate_interval {
        Some([low, high]) => format!(", between {} and {}", figure(low, 8), figure(high, 8)),
        None => String::new(),
    };
    let last = axis.start + (samples.saturating_sub(1)) as f64 * axis.step;
    let unit = &axis.unit;
    format!(
        "{}, {} {rate_unit} ({how}{interval}), {} {unit} to {} {unit}",
        counted(samples, "sample"),
        figure(axis.rate, 8),
        figure(axis.start, 10),
        figure(last, 10),
    )
}

fn extension_text(extension: &ExtensionReport) -> String {
    let chosen = match extension.how {
        How::Asked => "as asked",
        How::Asserted => "as asserted",
        How::Verdict => "by the verdict",
        How::Default => "a default, not a finding about this record",
    };
    let seat = if extension.kind == "periodic" { String::new() } else { format!("{} seat, ", extension.seat) };
    format!("{} ends ({seat}{}), {chosen}", extension.kind, extension.transform)
}

/// The channels that do not meet the requirement, and why.
fn unmet_text(unmet: &[Finding]) -> String {
    unmet
        .iter()
        .map(|finding| format!("requirement not met: {}\n", crate::place::escape(&finding.to_string())))
        .collect()
}

fn notes_text(notes: &[Finding]) -> String {
    notes.iter().map(|note| format!("note: {}\n", crate::place::escape(&note.to_string()))).collect()
}
