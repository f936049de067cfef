//! Long outputs in blocks: formatted in parallel, written in order, never more than a few blocks in memory.

use std::io::Write;

use rayon::prelude::*;

use crate::error::Result;

/// Takes batches of jobs until there are none, lets `format` turn each job into bytes, and writes these in order. The next
/// batch is formatted while the last one is written.
///
/// # Errors
/// The first error in the order of the jobs, or that of the sink.
pub(super) fn pump<J: Send + Sync>(
    sink: &mut (dyn Write + Send),
    mut batch: impl FnMut() -> Result<Option<Vec<J>>> + Send,
    format: impl Fn(&J, &mut Vec<u8>) -> Result<()> + Sync,
) -> Result<()> {
    let (mut ready, mut spare): (Vec<Vec<u8>>, Vec<Vec<u8>>) = (Vec::new(), Vec::new());
    loop {
        let make = || -> Result<bool> {
            let Some(jobs) = batch()? else { return Ok(false) };
            spare.resize_with(jobs.len(), Vec::new);
            let made: Vec<Result<()>> = jobs
                .par_iter()
                .zip(spare.par_iter_mut())
                .map(|(job, slot)| {
                    // Into a local: neighbouring vectors share a cache line that every push would fight over.
                    let mut local = std::mem::take(slot);
                    local.clear();
                    let result = format(job, &mut local);
                    *slot = local;
                    result
                })
                .collect();
            made.into_iter().collect::<Result<()>>().map(|()| true)
        };
        let (written, made) = rayon::join(|| ready.iter().try_for_each(|bytes| sink.write_all(bytes)), make);
        written?;
        if !made? {
            return Ok(sink.flush()?);
        }
        std::mem::swap(&mut ready, &mut spare);
    }
}
