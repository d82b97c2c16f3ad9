//! Lights that may be wanted again, for another net or variant.

use super::lights::Lights;
use std::collections::HashMap;
use std::sync::{Arc, Mutex};

/// Which variant, which scan and which frequency, as bits.
type Key = (usize, usize, u64);

/// Lights by what they are of, and the bytes that they take.
#[derive(Debug, Default)]
pub(super) struct Kept(Mutex<(HashMap<Key, Arc<Lights>>, usize)>);

/// Lights are kept up to this much memory.
const MOST_BYTES: usize = 96 << 20;

impl Kept {
    /// What is kept under a key, else what is made and, while there is room, kept.
    pub(super) fn or_made(&self, key: Key, make: &dyn Fn() -> Lights) -> Arc<Lights> {
        let known = || self.0.lock().ok()?.0.get(&key).cloned();
        known().unwrap_or_else(|| {
            let made = Arc::new(make());
            if let Ok(mut kept) = self.0.lock()
                && kept.1 + made.bytes() <= MOST_BYTES
            {
                kept.1 += made.bytes();
                kept.0.insert(key, Arc::clone(&made));
            }
            made
        })
    }
}
