//! A progress bar on anything over a second, on a terminal only.

use std::sync::atomic::{AtomicBool, Ordering};
use std::time::{Duration, Instant};

use indicatif::{ProgressBar, ProgressDrawTarget, ProgressState, ProgressStyle};
use ringfield::study::Watch;

/// How far a study has come; the bar is gone when this is.
pub struct Progress {
    bar: ProgressBar,
    started: Instant,
    /// Set by whoever wants the study to stop.
    stop: Option<&'static AtomicBool>,
}

impl Progress {
    /// Before anything has begun.
    pub fn new() -> Self {
        let bar = ProgressBar::with_draw_target(None, ProgressDrawTarget::hidden());
        if let Ok(style) =
            ProgressStyle::with_template("{bar:30} {pos} of {len} {msg}, {rate}, {eta} left")
        {
            bar.set_style(style.with_key("rate", write_rate));
        }
        Self {
            bar,
            started: Instant::now(),
            stop: None,
        }
    }

    /// The same, for a study that ends early once the flag is set.
    pub fn until(stop: &'static AtomicBool) -> Self {
        let mut progress = Self::new();
        progress.stop = Some(stop);
        progress
    }
}

/// How many are done in a second, with as many digits as are of use.
fn write_rate(state: &ProgressState, out: &mut dyn std::fmt::Write) {
    let rate = state.per_sec();
    let decimals = if rate < 10.0 { 1 } else { 0 };
    // Nobody can be told of a failure here.
    let _ = write!(out, "{rate:.decimals$} a second");
}

impl Watch for Progress {
    fn begin(&self, what: &'static str, count: usize) {
        self.bar.set_message(what);
        self.bar.set_length(count as u64);
        self.bar.set_position(0);
        self.bar.reset_eta();
    }

    fn step(&self) {
        // Not worth showing for less. Draws nothing where standard error is no terminal.
        if self.bar.is_hidden() && self.started.elapsed() > Duration::from_secs(1) {
            self.bar.set_draw_target(ProgressDrawTarget::stderr());
        }
        self.bar.inc(1);
    }

    fn is_stopped(&self) -> bool {
        self.stop.is_some_and(|stop| stop.load(Ordering::Relaxed))
    }
}

impl Drop for Progress {
    fn drop(&mut self) {
        self.bar.finish_and_clear();
    }
}
