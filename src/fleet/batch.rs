//! A batch at work: groups of records in parallel, each group's outputs and results made safe together.

use std::num::NonZeroUsize;
use std::panic::{AssertUnwindSafe, catch_unwind};
use std::path::{Path, PathBuf};
use std::sync::atomic::{AtomicBool, AtomicU64, Ordering};
use std::sync::mpsc::{Receiver, sync_channel};

use rayon::prelude::*;

use crate::error::{Error, Result};
use crate::fleet::attempt::Attempt;
use crate::fleet::group;
use crate::fleet::line::{Failure, Head, Line};
use crate::fleet::plan::{Plan, Planned, hex, results_of};
use crate::fleet::resume::{Earlier, Standing, fingerprint_of_file};
use crate::fleet::shard::Shard;
use crate::job::{self, Audited, Bench, Target};
use crate::place::Place;
use crate::read::Input;
use crate::write::{Overwrite, Pending, Written, finish_all};

/// A batch that is ready to run.
pub struct Batch {
    /// Its records.
    pub plan: Plan,
    /// The output folder, which exists.
    pub into: PathBuf,
    /// The share to do.
    pub shard: Shard,
    /// Records worked on at once.
    pub jobs: NonZeroUsize,
    /// Bytes that all jobs together may take, as estimated from the sizes of the files.
    pub memory: u64,
    /// Failures after which no further record is begun.
    pub max_failures: Option<u64>,
}

/// How far a batch is.
#[derive(Debug, Clone, Copy, Default, PartialEq, Eq)]
pub struct Tally {
    /// Records of the shard.
    pub total: u64,
    /// Conditioned by this attempt.
    pub done: u64,
    /// Found whole from an earlier attempt.
    pub kept: u64,
    /// Earlier records under another name.
    pub repeated: u64,
    /// Failed.
    pub failed: u64,
    /// Conditioned, but below `--require`.
    pub below: u64,
}

impl Tally {
    /// Records that need nothing more.
    pub fn settled(&self) -> u64 {
        self.done + self.kept + self.repeated + self.failed
    }
}

/// How a batch ended.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum End {
    /// Every record of the shard has its result.
    Complete,
    /// It was asked to stop: running it again does the rest.
    Interrupted,
    /// Too many records failed.
    TooManyFailures,
}

/// Runs a batch. `stop` ends it after the records in work; `watch` is told how far it is after every group.
///
/// # Errors
/// `Io` where results cannot be written; records that fail are no error.
pub fn run(batch: &Batch, stop: &AtomicBool, watch: &(dyn Fn(&Tally) + Sync)) -> Result<(Tally, End)> {
    let results = results_of(&batch.into);
    std::fs::create_dir_all(&results)
        .map_err(|error| Error::from(error).at(Place::file(results.display().to_string())))?;
    let earlier = Earlier::read(&results, &batch.plan, batch.shard)?;
    batch.plan.store(&results)?;
    let head = Head::new(&batch.plan.sha256, batch.shard, batch.plan.records.len() as u64);
    let mut attempt = Attempt::create(&results, batch.shard, &head)?;
    let outcome = work(batch, &earlier, stop, watch, &mut attempt);
    attempt.close();
    outcome
}

/// One record after its turn.
enum Outcome {
    /// Nothing began: the batch is ending.
    Open,
    /// An earlier attempt stands.
    Kept(Option<Vec<u8>>),
    /// It repeats another.
    Repeated(Vec<u8>),
    /// Failed, with its line.
    Failed(Vec<u8>),
    /// Conditioned: the output still under its temporary name, and the line for when it has its own.
    Ready { output: Box<Pending<'static>>, line: Vec<u8>, met: bool },
}

type Group<'a> = Vec<(u64, &'a Planned, Outcome)>;

/// Threads that wait for the disk: it takes many small files at once, and they cost no processor.
const WAITING: usize = 32;

fn work(
    batch: &Batch,
    earlier: &Earlier,
    stop: &AtomicBool,
    watch: &(dyn Fn(&Tally) + Sync),
    attempt: &mut Attempt,
) -> Result<(Tally, End)> {
    let pool = |threads: usize| {
        let built = rayon::ThreadPoolBuilder::new().num_threads(threads).build();
        built.map_err(|error| Error::io(format!("no threads: {error}")))
    };
    let (workers, waiters) = (pool(batch.jobs.get())?, pool(WAITING)?);
    let total = batch.shard.share_of(batch.plan.records.len() as u64);
    let failures = AtomicU64::new(0);
    let broken = AtomicBool::new(false);
    let too_many = || batch.max_failures.is_some_and(|most| failures.load(Ordering::Relaxed) >= most);
    let ending = || stop.load(Ordering::Relaxed) || broken.load(Ordering::Relaxed) || too_many();
    let tally = std::thread::scope(|scope| {
        // One group is made safe while the next one is worked on; no more wait between the two.
        let (sender, receiver) = sync_channel::<Group<'_>>(1);
        let keeper = scope.spawn(|| {
            let start = Tally { total, ..Tally::default() };
            let kept = keep(receiver, attempt, &waiters, start, watch);
            broken.store(kept.is_err(), Ordering::Relaxed);
            kept
        });
        for group in group::groups(batch) {
            if ending() {
                break;
            }
            let bench = Bench::new(Audited::Yes);
            let begin = |(number, planned, bytes): &(u64, &'_ Planned, u64)| {
                if ending() {
                    return Outcome::Open;
                }
                let outcome = one(batch, earlier, &bench, *number, planned, *bytes);
                if matches!(outcome, Outcome::Failed(_)) {
                    failures.fetch_add(1, Ordering::Relaxed);
                }
                outcome
            };
            let worked: Group<'_> =
                workers.install(|| group.par_iter().map(|record| (record.0, record.1, begin(record))).collect());
            if sender.send(worked).is_err() {
                break; // the keeper has ended: it tells why
            }
        }
        drop(sender);
        keeper.join().unwrap_or_else(|_| Err(Error::io("the results could not be kept")))
    })?;
    let end = if tally.settled() == tally.total {
        End::Complete
    } else if too_many() {
        End::TooManyFailures
    } else {
        End::Interrupted
    };
    Ok((tally, end))
}

/// Makes group after group safe: contents, names, then results in the order of the list, in one write.
fn keep(
    groups: Receiver<Group<'_>>,
    attempt: &mut Attempt,
    waiters: &rayon::ThreadPool,
    mut tally: Tally,
    watch: &(dyn Fn(&Tally) + Sync),
) -> Result<Tally> {
    attempt.reserve()?;
    for group in groups {
        let (mut lines, mut outputs, mut settled) = (Vec::new(), Vec::new(), Vec::new());
        for (number, planned, outcome) in group {
            match outcome {
                Outcome::Open => {}
                Outcome::Ready { output, line, met } => {
                    outputs.push(*output);
                    settled.push((number, planned, Some(met), line));
                }
                Outcome::Failed(line) => {
                    tally.failed += 1;
                    settled.push((number, planned, None, line));
                }
                Outcome::Kept(line) => {
                    tally.kept += 1;
                    settled.push((number, planned, None, line.unwrap_or_default()));
                }
                Outcome::Repeated(line) => {
                    tally.repeated += 1;
                    settled.push((number, planned, None, line));
                }
            }
        }
        let mut finished = waiters.install(|| finish_all(outputs)).into_iter();
        for (number, planned, met, line) in settled {
            let written: Option<Result<Written>> = met.and_then(|_| finished.next());
            match (met, written) {
                (Some(_), Some(Err(error))) => {
                    tally.failed += 1;
                    let settings = planned.settings().ok();
                    let failed = Line::failed(number, planned, settings.as_deref(), None, Failure::of(&error));
                    lines.extend(failed.bytes()?);
                }
                (Some(met), _) => {
                    tally.done += 1;
                    tally.below += u64::from(!met);
                    lines.extend(line);
                }
                (None, _) => lines.extend(line),
            }
        }
        if !lines.is_empty() {
            attempt.append(&lines)?;
            attempt.reserve()?;
        }
        watch(&tally);
    }
    Ok(tally)
}

fn one(batch: &Batch, earlier: &Earlier, bench: &Bench, number: u64, planned: &Planned, bytes: u64) -> Outcome {
    if let Some(same_as) = planned.same_as {
        return match Line::repeated(number, planned, same_as).bytes() {
            Ok(line) => Outcome::Repeated(line),
            Err(error) => failed(number, planned, None, Failure::of(&error)),
        };
    }
    match earlier.standing(number, planned, &batch.into) {
        Some(Standing::Here) => return Outcome::Kept(None),
        Some(Standing::Moved(line)) => return Outcome::Kept(Some(line)),
        None => {}
    }
    if bytes > batch.memory {
        let what =
            format!("about {} MiB of memory would be needed, {} MiB are allowed", bytes >> 20, batch.memory >> 20);
        let error = Error::unsupported(what).remedy("raise --memory, or cut the record with --from and --to");
        let place = Place::file(planned.path.display().to_string());
        // Its bytes are not read for a fingerprint either: there may be no end of them.
        return failed(number, planned, None, Failure::of(&error.at(place)));
    }
    match guarded(|| condition(batch, bench, number, planned)) {
        Ok(ready) => ready,
        Err(failure) => {
            let input = fingerprint_of_file(&planned.path).ok().map(|bytes| hex(&bytes));
            failed(number, planned, input, failure)
        }
    }
}

fn failed(number: u64, planned: &Planned, input_sha256: Option<String>, failure: Failure) -> Outcome {
    let settings = planned.settings().ok();
    let line = Line::failed(number, planned, settings.as_deref(), input_sha256, failure);
    // A failure holds nothing that JSON cannot; if it did, the record would be missing and done again.
    line.bytes().map_or(Outcome::Open, Outcome::Failed)
}

/// What a record does to itself stays with it: an error, or a fault of the program.
fn guarded<T>(work: impl FnOnce() -> Result<T>) -> std::result::Result<T, Failure> {
    match catch_unwind(AssertUnwindSafe(work)) {
        Ok(Ok(value)) => Ok(value),
        Ok(Err(error)) => Err(Failure::of(&error)),
        Err(payload) => {
            let text = payload.downcast_ref::<String>().map(String::as_str);
            Err(Failure::panic(text.or(payload.downcast_ref::<&str>().copied()).unwrap_or("no message")))
        }
    }
}

fn condition(batch: &Batch, bench: &Bench, number: u64, planned: &Planned) -> Result<Outcome> {
    let here = || Place::file(planned.path.display().to_string());
    let settings = planned.settings()?;
    // Reading a pipe or a device would wait for ever, or never end.
    if let Ok(about) = std::fs::metadata(&planned.path)
        && !about.is_file()
        && !about.is_dir()
    {
        return Err(Error::malformed("neither a file nor a folder").remedy("name files only").at(here()));
    }
    let output = batch.into.join(&planned.output);
    folder_of(&output)?;
    let target = Target::alone(&output, Overwrite::Force);
    let prepared = job::prepare(Input::Path(planned.path.clone()), target, &settings, bench)?;
    let (report, audit, output) = prepared.into_parts();
    let met = report.requirement_met;
    let line = Line::done(number, planned, report, audit).bytes()?;
    Ok(Outcome::Ready { output: Box::new(output), line, met })
}

fn folder_of(output: &Path) -> Result<()> {
    match output.parent() {
        Some(folder) if !folder.is_dir() => std::fs::create_dir_all(folder)
            .map_err(|error| Error::from(error).at(Place::file(folder.display().to_string()))),
        _ => Ok(()),
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_panic_costs_only_its_record() {
        let hook = std::panic::take_hook();
        std::panic::set_hook(Box::new(|_| {}));
        let found = guarded(|| -> Result<()> { panic!("index {} of {}", 7, 3) }).expect_err("a failure");
        let plain = guarded(|| -> Result<()> { std::panic::panic_any(3_u8) }).expect_err("a failure");
        std::panic::set_hook(hook);
        assert_eq!((found.kind.as_str(), plain.kind.as_str()), ("panic", "panic"));
        assert!(found.text.contains("index 7 of 3"), "{}", found.text);
        assert_eq!(guarded(|| Ok(5)).ok(), Some(5));
        assert_eq!(guarded(|| Err::<(), _>(Error::usage("x"))).expect_err("a failure").kind, "usage");
    }
}
