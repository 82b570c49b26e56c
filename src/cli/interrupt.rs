//! Ctrl-C: ends the run at once with exit code 130, never between the files of one answer.

use std::sync::{Mutex, MutexGuard, PoisonError};

use super::output::tell;

static WRITING: Mutex<()> = Mutex::new(());

/// Ends the run from now on when interrupted.
pub(super) fn install() {
    // Without the handler the signal itself ends the run.
    let _ = ctrlc::set_handler(|| {
        let _files_are_whole = hold();
        tell("\nInterrupted.\n");
        std::process::exit(130);
    });
}

/// Makes an interrupt wait until the guard is dropped.
pub(super) fn hold() -> MutexGuard<'static, ()> {
    WRITING.lock().unwrap_or_else(PoisonError::into_inner)
}
