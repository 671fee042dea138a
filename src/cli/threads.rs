//! How many threads a run uses.

use std::thread::available_parallelism;

use anyhow::bail;

/// The batch system's statement of how many cores a task has.
const BATCH_VARIABLE: &str = "SLURM_CPUS_PER_TASK";

/// More threads than any one machine has.
pub(super) const MOST_THREADS: u16 = 4096;

/// Cores that this process may use, its affinity and quota respected; 1 where the system does not tell.
pub(super) fn cores() -> usize {
    available_parallelism().map_or(1, usize::from)
}

/// What the command line says, else the batch system, else all cores that may be used.
///
/// # Errors
/// The batch system's variable holds no number of threads.
pub(super) fn choose(asked: Option<u16>) -> anyhow::Result<usize> {
    if let Some(threads) = asked {
        return Ok(usize::from(threads));
    }
    let Some(text) = std::env::var_os(BATCH_VARIABLE) else {
        return Ok(cores());
    };
    let text = text.to_string_lossy();
    match text.trim().parse() {
        Ok(threads @ 1..=MOST_THREADS) => Ok(usize::from(threads)),
        _ => bail!(
            "the environment variable {BATCH_VARIABLE} is \"{text}\", must be 1 to {MOST_THREADS}; correct it, or give --threads"
        ),
    }
}
