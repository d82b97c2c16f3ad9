//! A progress bar on anything over a second, on a terminal only.

use std::time::{Duration, Instant};

use indicatif::{ProgressBar, ProgressDrawTarget, ProgressStyle};
use ringfield::study::Watch;

/// How far a study has come; the bar is gone when this is.
pub struct Progress {
    bar: ProgressBar,
    started: Instant,
}

impl Progress {
    /// Before anything has begun.
    pub fn new() -> Self {
        let bar = ProgressBar::with_draw_target(None, ProgressDrawTarget::hidden());
        if let Ok(style) = ProgressStyle::with_template("{bar:30} {pos} of {len} {msg}") {
            bar.set_style(style);
        }
        Self {
            bar,
            started: Instant::now(),
        }
    }
}

impl Watch for Progress {
    fn begin(&self, what: &'static str, count: usize) {
        self.bar.set_message(what);
        self.bar.set_length(count as u64);
        self.bar.set_position(0);
    }

    fn step(&self) {
        // Not worth showing for less. Draws nothing where standard error is no terminal.
        if self.bar.is_hidden() && self.started.elapsed() > Duration::from_secs(1) {
            self.bar.set_draw_target(ProgressDrawTarget::stderr());
        }
        self.bar.inc(1);
    }
}

impl Drop for Progress {
    fn drop(&mut self) {
        self.bar.finish_and_clear();
    }
}
