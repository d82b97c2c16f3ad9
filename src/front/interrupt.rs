//! Ctrl-C: the first asks a study to stop with what is finished, the second ends the program.

use std::sync::atomic::{AtomicBool, Ordering};

static STOP: AtomicBool = AtomicBool::new(false);

/// What shells show for a program that was interrupted.
const INTERRUPTED: i32 = 130;

/// A flag that Ctrl-C sets from now on. Where that cannot be had, Ctrl-C ends the program as ever.
#[expect(
    clippy::exit,
    reason = "who asks twice wants out, whatever is under way"
)]
pub fn stop_flag() -> &'static AtomicBool {
    let _ = ctrlc::set_handler(|| {
        if STOP.swap(true, Ordering::Relaxed) {
            std::process::exit(INTERRUPTED);
        }
    });
    &STOP
}
