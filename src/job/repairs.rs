//! What is said and shown of samples that were mended.

use crate::error::Finding;
use crate::job::intake::Intake;
use crate::operator::Chain;
use crate::place::Place;
use crate::record::{Channel, Mending, Record, Repair};
use crate::report::ChannelReport;
use crate::settings::Settings;
use crate::write::{Cells, Extra};

/// Remarks on mended samples within one reach of an end: there the result rests on them and on the extension at once.
/// `channels` gives name and repairs of each, of `len` samples.
pub fn near_ends<'a>(
    channels: impl Iterator<Item = (&'a str, &'a Vec<Repair>)>,
    len: usize,
    chain: &Chain,
    file: &str,
) -> Vec<Finding> {
    let reach = chain.reaches().reach.samples().unwrap_or(f64::INFINITY);
    let near = |repair: &&Repair| (repair.first as f64) < reach || ((len - 1 - repair.last) as f64) < reach;
    let one = |(name, repairs): (&str, &Vec<Repair>)| {
        let first = repairs.iter().find(near)?;
        let count: usize = repairs.iter().filter(near).map(Repair::count).sum();
        let text =
            format!("{count} mended samples lie within one reach of an end: the edge error counts them as measured");
        let place = Place { sample: Some(first.first as u64), ..Place::channel(name) };
        Some(Finding::new("repair_near_end", text).at(place.within(&Place::file(file))))
    };
    channels.filter_map(one).collect()
}

/// The same of a record that was filled and not yet worked on.
pub fn near_ends_of(intake: &Intake, chain: &Chain) -> Vec<Finding> {
    let (record, file) = (&intake.record, &intake.outline.source.path);
    near_ends(record.channels().map(|channel| channel.name).zip(&intake.repairs), record.len(), chain, file)
}

/// All that was mended in each channel: gaps that were filled before, and spikes that were replaced by the run.
pub fn with_spikes(repairs: Vec<Vec<Repair>>, channels: &[ChannelReport]) -> Vec<Vec<Repair>> {
    let spikes = |channel: &ChannelReport| channel.despike.as_ref().map(|d| d.samples.clone()).unwrap_or_default();
    let one = |(mut own, channel): (Vec<Repair>, &ChannelReport)| {
        own.extend(spikes(channel).into_iter().map(|n| Repair { first: n, last: n, how: Mending::Despiked }));
        own.sort_by_key(|repair| repair.first);
        own
    };
    repairs.into_iter().zip(channels).map(one).collect()
}

/// The repairs of `len` samples from sample `first` on.
pub fn cut(repairs: &[Vec<Repair>], first: usize, len: usize) -> Vec<Vec<Repair>> {
    repairs.iter().map(|own| own.iter().filter_map(|repair| repair.cut(first, len)).collect()).collect()
}

/// A column that tells which samples of a channel were mended.
pub struct Mark {
    name: String,
    flags: Vec<Option<bool>>,
}

impl Mark {
    /// As a column of an output.
    pub fn column(&self) -> Extra<'_> {
        Extra { name: &self.name, cells: Cells::Flags(&self.flags) }
    }
}

/// The `repaired` columns, where marking is asked for: one a channel.
pub fn marks(record: &Record, repairs: &[Vec<Repair>], settings: &Settings) -> Vec<Mark> {
    if !settings.mark_repairs {
        return Vec::new();
    }
    let single = record.channel_count() == 1;
    let mark = |(channel, repairs): (Channel<'_>, &Vec<Repair>)| {
        let mut flags = vec![Some(false); record.len()];
        for repair in repairs {
            flags[repair.first..=repair.last].fill(Some(true));
        }
        Mark { name: if single { "repaired".to_owned() } else { format!("{} repaired", channel.name) }, flags }
    };
    record.channels().zip(repairs).map(mark).collect()
}
