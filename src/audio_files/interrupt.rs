//! Ctrl-C: the first asks the work to stop, which drops every temporary; the second ends the program at once.

use std::sync::atomic::{AtomicBool, Ordering};

use super::AudioError;

/// The customary exit code of a program that Ctrl-C ended: 128 + SIGINT.
pub const EXIT_CODE: i32 = 130;

static REQUESTED: AtomicBool = AtomicBool::new(false);

/// Listens for Ctrl-C and, on Unix, for the signals that ask a program to end. To be called once, at the start.
///
/// # Errors
/// The system refuses the handler, or there is one already.
pub fn listen() -> Result<(), ctrlc::Error> {
    ctrlc::set_handler(|| {
        if REQUESTED.swap(true, Ordering::Relaxed) {
            std::process::exit(EXIT_CODE);
        }
    })
}

/// To be asked in every loop that takes a while; reading and writing blocks ask by themselves.
///
/// # Errors
/// [`AudioError::Interrupted`] once the user has asked to stop.
pub fn check() -> Result<(), AudioError> {
    if REQUESTED.load(Ordering::Relaxed) { Err(AudioError::Interrupted) } else { Ok(()) }
}
