//! Columns of running RMS beside the conditioned channels.

use crate::metric::exposure::{running_rms, window};
use crate::record::Record;
use crate::settings::Settings;
use crate::write::{Cells, Extra};

/// The running RMS of one channel; blank until the record has lasted the integration time.
pub struct Running {
    name: String,
    cells: Vec<Option<f64>>,
}

impl Running {
    /// As a column of an output.
    pub fn column(&self) -> Extra<'_> {
        Extra { name: &self.name, cells: Cells::Numbers(&self.cells) }
    }
}

/// One column a channel, where they are asked for.
pub fn columns(record: &Record, settings: &Settings) -> Vec<Running> {
    let Some(running_s) = settings.running_rms else { return Vec::new() };
    let column = |channel: crate::record::Channel<'_>| {
        let unit = if channel.unit.is_unknown() { String::new() } else { format!(" [{}]", channel.unit) };
        Running {
            name: format!("{} running RMS{unit}", channel.name),
            cells: running_rms(channel.samples, window(running_s, channel.axis.step_base())),
        }
    };
    record.channels().map(column).collect()
}
