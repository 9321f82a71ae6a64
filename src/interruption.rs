//! Ctrl-C and the other polite ways to end a program.

use crate::failure::{Failure, Status};
use std::sync::atomic::{AtomicBool, Ordering};

/// A flag that the first interruption sets, for the work to end at the next good place; the second
/// one ends the program where it stands. To be called once.
pub(crate) fn interruption() -> Result<&'static AtomicBool, Failure> {
    static INTERRUPTED: AtomicBool = AtomicBool::new(false);
    ctrlc::set_handler(|| {
        if INTERRUPTED.swap(true, Ordering::Relaxed) {
            std::process::exit(Status::Interrupted as i32);
        }
    })
    .map_err(|error| Failure::new(Status::Failed, format!("interruptions: {error}")))?;
    Ok(&INTERRUPTED)
}
