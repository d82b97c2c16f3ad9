//! How far long work has come, for whoever waits for it. Any stage may tell.

/// Told while work goes on. Calls come from several threads.
pub trait Watch: Sync {
    /// The next stretch of work: so many of something, named in the plural.
    fn begin(&self, what: &'static str, count: usize);

    /// One of them is done.
    fn step(&self);

    /// Whether to stop with what is finished, where the study can.
    fn is_stopped(&self) -> bool {
        false
    }
}

/// Tells nobody.
#[derive(Debug, Clone, Copy, Default)]
pub struct Unwatched;

impl Watch for Unwatched {
    fn begin(&self, _: &'static str, _: usize) {}

    fn step(&self) {}
}
