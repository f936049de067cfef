//! Which channels' edges are not as good as required, and why.

use crate::error::Finding;
use crate::place::Place;
use crate::report::{ChannelComparison, ChannelReport, VerdictReport, figure};
use crate::settings::Settings;
use crate::unit::Unit;
use crate::verdict::{Adequacy, Unjudged};

/// What a requirement looks at in one channel.
pub struct Met<'a> {
    name: &'a str,
    unit: &'a Unit,
    verdict: Option<&'a VerdictReport>,
    unjudged: Option<Unjudged>,
}

impl<'a> From<&'a ChannelReport> for Met<'a> {
    fn from(channel: &'a ChannelReport) -> Met<'a> {
        Met {
            name: &channel.name,
            unit: &channel.unit,
            verdict: channel.verdict.as_ref(),
            unjudged: channel.not_judged,
        }
    }
}

impl<'a> From<&'a ChannelComparison> for Met<'a> {
    fn from(channel: &'a ChannelComparison) -> Met<'a> {
        Met {
            name: &channel.name,
            unit: &channel.unit,
            verdict: channel.verdict.as_ref(),
            unjudged: channel.not_judged,
        }
    }
}

/// One finding for each channel that does not meet `--require`; none without it. A channel that no assumption about the
/// ends can spoil (no operator, a constant) meets every requirement.
pub fn unmet<'a, T>(settings: &Settings, channels: &'a [T]) -> Vec<Finding>
where
    Met<'a>: From<&'a T>,
{
    let Some(required) = settings.require else { return Vec::new() };
    channels
        .iter()
        .map(Met::from)
        .filter_map(|channel| {
            let text = channel.shortcoming(required)?;
            Some(Finding::new("requirement_not_met", text).at(Place::channel(channel.name)))
        })
        .collect()
}

impl Met<'_> {
    /// Why the channel does not meet the requirement; `None` where it does.
    fn shortcoming(&self, required: Adequacy) -> Option<String> {
        if let Some(reason) = self.unjudged {
            return (!reason.is_harmless()).then(|| format!("the edges were not judged: {reason}"));
        }
        let Some(verdict) = self.verdict else { return Some("the edges were not judged".to_owned()) };
        let (Some(found), Some(bound), Some(error)) = (verdict.adequacy, verdict.bound, verdict.predicted_error) else {
            return Some("the edges were not judged".to_owned());
        };
        let unit = if self.unit.is_unknown() { String::new() } else { format!(" {}", self.unit) };
        (found > required).then(|| {
            format!(
                "the edges are {}: error about {}{unit}, bound {}{unit}, tolerance {}{unit}",
                found.word(),
                figure(error, 2),
                figure(bound, 2),
                figure(verdict.tolerance, 2)
            )
        })
    }
}
