//! Lights that may be wanted again, for another net or variant.

use super::lights::Lights;
use std::collections::HashMap;
use std::sync::atomic::{AtomicUsize, Ordering};
use std::sync::{Arc, Mutex};

/// Lights by variant, distance and frequency; so many bytes of them at most.
#[derive(Debug, Default)]
pub(super) struct Kept {
    lights: Mutex<HashMap<(usize, usize, u64), Arc<Lights>>>,
    bytes: AtomicUsize,
}

/// Lights are kept up to this much memory.
const MOST_BYTES: usize = 96 << 20;

impl Kept {
    /// What is kept under a key, else what is made and, while there is room, kept.
    pub(super) fn or_made(
        &self,
        key: (usize, usize, u64),
        make: &dyn Fn() -> Lights,
    ) -> Arc<Lights> {
        let known = |kept: &Self| kept.lights.lock().ok()?.get(&key).cloned();
        if let Some(lights) = known(self) {
            return lights;
        }
        let made = Arc::new(make());
        let bytes = self.bytes.fetch_add(made.bytes(), Ordering::Relaxed) + made.bytes();
        if bytes <= MOST_BYTES
            && let Ok(mut lights) = self.lights.lock()
        {
            lights.insert(key, Arc::clone(&made));
        }
        made
    }
}
