//! What the program asks of the machine: threads, Ctrl-C, memory.

use std::time::{Duration, Instant};

use crate::sampler::Interrupt;

use super::{CommandError, message};

/// What Ctrl-C is answered with while shots are drawn into a file.
pub(super) const STOPPING_A_RUN: &str =
    "stopping; finished shots are kept (a second Ctrl-C ends at once and loses them)";

/// What it is answered with where nothing is lost.
pub(super) const STOPPING: &str = "stopping (a second Ctrl-C ends at once)";

/// Raised by Ctrl-C.
pub(super) static INTERRUPT: Interrupt = Interrupt::new();

/// Sets up the thread pool; says how many threads there are.
pub(super) fn start_threads(wanted: Option<u16>) -> Result<usize, CommandError> {
    let mut builder = rayon::ThreadPoolBuilder::new();
    if let Some(wanted) = wanted {
        builder = builder.num_threads(usize::from(wanted));
    }
    builder
        .build_global()
        .map_err(|error| CommandError::Usage(format!("cannot start threads: {error}")))?;
    Ok(rayon::current_num_threads())
}

/// The first Ctrl-C asks the work to stop and is answered with `stopping`; a later one ends the program. Some
/// senders deliver one request twice at once, so a second signal counts only
/// after a while.
pub(super) fn catch_interrupts(stopping: &'static str) -> Result<(), CommandError> {
    const SAME_REQUEST: Duration = Duration::from_secs(1);
    let mut first: Option<Instant> = None;
    ctrlc::set_handler(move || match first {
        None => {
            first = Some(Instant::now());
            INTERRUPT.raise();
            message::note(stopping);
        }
        Some(first) if first.elapsed() < SAME_REQUEST => {}
        Some(_) => std::process::exit(130),
    })
    .map_err(|error| CommandError::Usage(format!("cannot watch for Ctrl-C: {error}")))
}

/// Bytes of memory that may be used: nine tenths of what the system says is
/// available, or no limit where it does not say.
pub(super) fn available_memory() -> u64 {
    let said = std::fs::read_to_string("/proc/meminfo")
        .ok()
        .and_then(|text| {
            let line = text
                .lines()
                .find(|line| line.starts_with("MemAvailable:"))?;
            line.split_whitespace().nth(1)?.parse::<u64>().ok()
        });
    said.map_or(u64::MAX, |kibibytes| kibibytes * 1024 / 10 * 9)
}
