//! Records that are worked on together: so many that cores and disk are busy, so few that their memory stays within bounds.

use crate::fleet::batch::Batch;
use crate::fleet::plan::Planned;

/// Records a group at most, for each job: enough to even out records of different length.
const A_JOB: usize = 32;

/// Most records of a group: each holds a file open until the group is safe.
const MOST: usize = 256;

/// The groups of a batch's shard in the order of the list: number, record and estimated bytes of memory.
pub fn groups(batch: &Batch) -> impl Iterator<Item = Vec<(u64, &Planned, u64)>> + '_ {
    let most = (batch.jobs.get() * A_JOB).min(MOST);
    let records = batch.plan.records.iter().enumerate().map(|(number, record)| (number as u64, record));
    let mut records = records
        .filter(|(number, _)| batch.shard.holds(*number))
        .map(|(number, record)| (number, record, memory_of(record)))
        .peekable();
    std::iter::from_fn(move || {
        let (mut group, mut total) = (Vec::new(), 0_u64);
        // One that is too large for the whole batch takes nothing: it is refused.
        while let Some(record) = records.next_if(|(_, _, bytes)| {
            let fits = group.len() < most && total.saturating_add(*bytes) <= batch.memory;
            fits || group.is_empty()
        }) {
            total = total.saturating_add(record.2);
            group.push(record);
        }
        (!group.is_empty()).then_some(group)
    })
}

/// Bytes that a record takes while it is worked on, from the size of its file: values, channels and transforms take about 50
/// bytes a row and channel, its text about a dozen; a sample of WAV often two.
fn memory_of(record: &Planned) -> u64 {
    const FIXED: u64 = 1 << 18;
    let size = std::fs::metadata(&record.path).map_or(0, |about| if about.is_file() { about.len() } else { 0 });
    let wave = record.path.extension().is_some_and(|e| e.eq_ignore_ascii_case("wav") || e.eq_ignore_ascii_case("wave"));
    size.saturating_mul(if wave { 16 } else { 4 }).saturating_add(FIXED)
}
