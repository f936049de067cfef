//! Exposure figures of weighted channels for people.

use crate::metric::exposure::Exposure;
use crate::place::escape;
use crate::report::ChannelReport;
use crate::report::text::{figure, indented, table};

/// The exposure figures of all weighted channels, and the caution; empty without any.
pub fn exposures_text(channels: &[ChannelReport], axis_unit: &str, caution: &str) -> String {
    let weighted = || channels.iter().filter_map(|channel| channel.exposure.as_ref().map(|e| (channel, e)));
    let Some((_, first)) = weighted().next() else { return String::new() };
    let running = format!("MTVV ({} s)", figure(first.running_s, 4));
    let mut rows =
        table(&["channel", "weighting", "RMS", &running, "at", "VDV", "crest", "MTVV/RMS", "VDV/(RMS T^1/4)", "unit"]);
    let shown = |value: Option<f64>| value.map_or_else(|| "-".to_owned(), |v| figure(v, 4));
    for (channel, e) in weighted() {
        rows.add_row(vec![
            escape(&channel.name),
            e.weighting.to_owned(),
            figure(e.rms, 4),
            shown(e.mtvv),
            e.mtvv_at.map_or_else(|| "-".to_owned(), |at| format!("{} {axis_unit}", figure(at, 6))),
            figure(e.vdv, 4),
            shown(e.crest),
            shown(e.mtvv_ratio),
            shown(e.vdv_ratio),
            unit_text(e),
        ]);
    }
    let mut text = indented(&rows);
    for (channel, e) in weighted() {
        if let Some(msdv) = e.msdv {
            let name = escape(&channel.name);
            text.push_str(&format!("{name}: motion sickness dose {} {} s^1/2\n", figure(msdv, 4), e.unit));
        }
    }
    text.push_str(&format!("caution: {caution}\n"));
    text
}

/// `m/s2, VDV m/s1.75`: the dose has its own unit.
fn unit_text(exposure: &Exposure) -> String {
    match exposure.unit.label() {
        "m/s2" => "m/s2, VDV m/s1.75".to_owned(),
        "" => "-".to_owned(),
        _ => format!("{0}, VDV {0} s^1/4", exposure.unit),
    }
}
