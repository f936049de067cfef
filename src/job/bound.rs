//! The bound on memory, kept before any work.

use crate::audit::estimate::{self, Way};
use crate::condition::Layout;
use crate::error::Result;
use crate::numeric::smooth::is_smooth;
use crate::operator::Chain;
use crate::read;
use crate::record::Record;
use crate::settings::Settings;

/// Refuses a run that would take more memory than `--memory` allows.
///
/// # Errors
/// `Unsupported` beyond the bound.
pub fn refuse_beyond_memory(record: &Record, chain: &Chain, settings: &Settings) -> Result<()> {
    let len = record.len();
    let whole = chain.passes().iter().any(|pass| !pass.is_identity() && Layout::of(pass, len).is_none());
    let way = if whole && !is_smooth(len) { Way::Awkward } else { Way::Easy };
    let bytes = estimate::memory(record.channel_count(), len as u64, way);
    read::refuse_beyond(settings.read.memory, bytes, "the run")
}
