//! Ctrl-C: the first one asks the run to stop, the second one ends the program at once.

use crate::exit::Exit;
use std::sync::atomic::{AtomicBool, Ordering};

static STOP: AtomicBool = AtomicBool::new(false);

/// Starts listening; returns the flag that the first Ctrl-C sets.
///
/// # Errors
/// When the operating system refuses the handler.
pub(crate) fn listen() -> Result<&'static AtomicBool, ctrlc::Error> {
    ctrlc::set_handler(|| {
        if STOP.swap(true, Ordering::SeqCst) {
            #[expect(clippy::exit, reason = "the second Ctrl-C means: now")]
            std::process::exit(i32::from(Exit::Interrupted.code()));
        }
    })?;
    Ok(&STOP)
}
