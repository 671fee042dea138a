//! Signals: those that stop a run in good order, and those whose default would end it without a word.

use std::io;
use std::sync::Arc;
use std::sync::atomic::AtomicBool;

use signal_hook::consts::{SIGHUP, SIGINT, SIGPIPE, SIGTERM, SIGXFSZ};
use signal_hook::flag;

/// A flag that SIGINT, SIGTERM and SIGHUP raise from now on.
///
/// A write beyond the limit on file sizes becomes an error of that write instead of the end of the process.
///
/// # Errors
/// What the operating system says.
pub(super) fn stop_flag() -> io::Result<Arc<AtomicBool>> {
    let stop = Arc::new(AtomicBool::new(false));
    for signal in [SIGINT, SIGTERM, SIGHUP] {
        flag::register(signal, Arc::clone(&stop))?;
    }
    flag::register(SIGXFSZ, Arc::default())?;
    Ok(stop)
}

/// Ends the process quietly when nobody reads its output any more, as in `spindrift show FILE | head`.
///
/// # Errors
/// What the operating system says.
pub(super) fn end_with_the_reader() -> io::Result<()> {
    flag::register_conditional_default(SIGPIPE, Arc::new(AtomicBool::new(true)))?;
    Ok(())
}
