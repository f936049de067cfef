//! What the machine gives: memory that may be used, and the life of the process that started this one.

use endgrain::error::{Error, Result};

/// Where nothing tells: a small machine.
const UNKNOWN: u64 = 4 << 30;

/// Half the memory that is free to use, with the limit of a container taken into account; in bytes.
pub fn half_of_free_memory() -> u64 {
    let read = |path: &str| std::fs::read_to_string(path).ok();
    let free = read("/proc/meminfo").and_then(|text| {
        let line = text.lines().find(|line| line.starts_with("MemAvailable:"))?.to_owned();
        line.split_whitespace().nth(1)?.parse::<u64>().ok().map(|kib| kib << 10)
    });
    let number = |path: &str| read(path).and_then(|text| text.trim().parse::<u64>().ok());
    let limits = [
        ("/sys/fs/cgroup/memory.max", "/sys/fs/cgroup/memory.current"),
        ("/sys/fs/cgroup/memory/memory.limit_in_bytes", "/sys/fs/cgroup/memory/memory.usage_in_bytes"),
    ];
    let contained = limits.iter().filter_map(|(limit, used)| Some(number(limit)?.saturating_sub(number(used)?))).min();
    [free, contained].into_iter().flatten().min().unwrap_or(UNKNOWN) / 2
}

/// Ends this process with the one that started it, as by an interrupt.
///
/// # Errors
/// `Usage` where the system cannot do that.
#[cfg(target_os = "linux")]
pub fn die_with_parent() -> Result<()> {
    use rustix::process::{Signal, set_parent_process_death_signal};
    set_parent_process_death_signal(Some(Signal::TERM))
        .map_err(|error| Error::usage(format!("--die-with-parent: {error}")).remedy("leave it out"))
}

/// Ends this process with the one that started it.
///
/// # Errors
/// `Usage`: this system cannot do that.
#[cfg(not(target_os = "linux"))]
pub fn die_with_parent() -> Result<()> {
    Err(Error::usage("--die-with-parent: this system cannot do that").remedy("leave it out"))
}
