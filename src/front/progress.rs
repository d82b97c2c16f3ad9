//! A progress bar on anything over a second, on a terminal only.

use std::time::{Duration, Instant};

use indicatif::{ProgressBar, ProgressDrawTarget, ProgressStyle};

/// How far a piece of work has come; the bar is gone when this is.
pub struct Progress {
    bar: ProgressBar,
    started: Instant,
}

impl Progress {
    /// The start of so many of something.
    pub fn new(what: &'static str, count: usize) -> Self {
        let bar = ProgressBar::with_draw_target(Some(count as u64), ProgressDrawTarget::hidden());
        if let Ok(style) = ProgressStyle::with_template("{bar:30} {pos} of {len} {msg}") {
            bar.set_style(style);
        }
        bar.set_message(what);
        Self {
            bar,
            started: Instant::now(),
        }
    }

    /// Does one of them.
    pub fn after<T>(&self, work: impl FnOnce() -> T) -> T {
        let done = work();
        // Not worth showing for less. Draws nothing where standard error is no terminal.
        if self.bar.is_hidden() && self.started.elapsed() > Duration::from_secs(1) {
            self.bar.set_draw_target(ProgressDrawTarget::stderr());
        }
        self.bar.inc(1);
        done
    }
}

impl Drop for Progress {
    fn drop(&mut self) {
        self.bar.finish_and_clear();
    }
}
