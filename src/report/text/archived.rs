//! Archives for people: what each channel took and lost, and what an archive holds.

use std::fmt::Write as _;

use super::{figure, indented, notes_text, table};
use crate::place::escape;
use crate::report::{ArchiveListing, ArchiveReport, RestoreReport};

/// The summary of an archive that was made.
pub fn archive_text(report: &ArchiveReport) -> String {
    let mut text = format!("{}: {} rows, {} bytes\n", escape(&report.path), report.rows, report.source_bytes);
    let mut rows = table(&[
        "channel",
        "unit",
        "bound",
        "bits/sample",
        "RMSE",
        "max error",
        "at row",
        "PSNR dB",
        "retained",
        "kept",
        "noise",
    ]);
    let shown = |value: Option<f64>, digits: usize| value.map_or("-".to_owned(), |v| figure(v, digits));
    for channel in &report.channels {
        let fidelity = &channel.fidelity;
        rows.add_row(vec![
            escape(&channel.name),
            channel.unit.to_string(),
            shown(channel.error, 4),
            figure(channel.bits_per_sample, 4),
            figure(fidelity.rmse, 4),
            figure(fidelity.max_error, 4),
            fidelity.max_error_row.map_or("-".to_owned(), |row| row.to_string()),
            shown(fidelity.psnr_db, 4),
            fidelity.retained_energy.map_or("-".to_owned(), |share| format!("{:.4} %", 100.0 * share)),
            channel.kept.map_or("-".to_owned(), |kept| kept.to_string()),
            shown(channel.noise, 3),
        ]);
    }
    text.push_str(&indented(&rows));
    for channel in &report.channels {
        let Some(mode) = channel.mode else { continue };
        let _ = write!(text, "{}: {}", escape(&channel.name), mode.name());
        if let Some(cut_off) = channel.cut_off {
            let _ = write!(text, ", equivalent cut-off {}", figure(cut_off, 4));
        }
        if let Some(parseval) = channel.parseval_rmse {
            let _ = write!(text, ", RMSE by Parseval {}", figure(parseval, 6));
        }
        if let (Some(mode), Some(bytes)) = (channel.runner_up, channel.runner_up_bytes) {
            let _ = write!(text, "; next best {}, {bytes} bytes", mode.name());
        }
        if let Some(bits) = channel.noise_bits.filter(|bits| *bits > 0.0) {
            let _ = write!(text, "; noise takes about {bits:.1} bits a sample");
        }
        text.push('\n');
    }
    text.push_str(&notes_text(&report.notes));
    let _ = writeln!(
        text,
        "{} bytes, {} bits a sample: {} x smaller than the source, {} x than 64-bit numbers",
        report.bytes,
        figure(report.bits_per_sample, 4),
        figure(report.ratio_to_source, 3),
        figure(report.ratio_to_doubles, 3)
    );
    for output in &report.outputs {
        let _ = writeln!(text, "wrote {}", escape(&output.path));
    }
    text
}

/// What an archive holds.
pub fn listing_text(listing: &ArchiveListing) -> String {
    let axis = listing.axis.as_deref().map_or(String::new(), |axis| format!(", {axis}"));
    let mut text =
        format!("{}: archive, {} bytes, {} rows{axis}\n", escape(&listing.path), listing.bytes, listing.rows);
    let mut rows = table(&["channel", "unit", "bound", "error", "blocks", "bytes", "bits/sample", "modes"]);
    for channel in &listing.channels {
        let modes: Vec<&str> = channel.modes.iter().map(|mode| mode.name()).collect();
        rows.add_row(vec![
            escape(&channel.name),
            channel.unit.to_string(),
            channel.bound.as_deref().map_or("-".to_owned(), escape),
            channel.error.map_or("-".to_owned(), |error| figure(error, 4)),
            channel.blocks.to_string(),
            channel.bytes.to_string(),
            figure(8.0 * channel.bytes as f64 / listing.rows as f64, 4),
            modes.join(", "),
        ]);
    }
    text.push_str(&indented(&rows));
    if let (Some(source), Some(bytes)) = (&listing.source, listing.source_bytes) {
        let sha256 = listing.source_sha256.as_deref().unwrap_or_default();
        let _ = writeln!(text, "made from {}, {bytes} bytes, SHA-256 {}", escape(source), escape(sha256));
    }
    if let (Some(by), Some(with)) = (&listing.made_by, &listing.made_with) {
        let _ = writeln!(text, "made by {} with {}", escape(by), escape(with));
    }
    text
}

/// The summary of a restored record.
pub fn restore_text(report: &RestoreReport) -> String {
    let mut text =
        format!("{}: rows {}..{}\n", escape(&report.path), report.first, report.first + report.rows.saturating_sub(1));
    text.push_str(&notes_text(&report.notes));
    for output in &report.outputs {
        let _ = writeln!(text, "wrote {}", escape(&output.path));
    }
    text
}
