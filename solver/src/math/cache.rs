//! A bounded memory of results, shared between threads: what does not change along a sweep is computed once.
//!
//! Keys are compared whole, and what is returned is what would have been computed, so no result depends on what is remembered.

use std::sync::{Arc, Mutex, PoisonError};

/// The last so many results by their keys.
pub struct Cache<K, V> {
    /// Most recently used last.
    known: Mutex<Vec<(K, Arc<V>)>>,
    capacity: usize,
}

impl<K: PartialEq, V> Cache<K, V> {
    /// A memory of so many results.
    pub const fn new(capacity: usize) -> Self {
        Cache { known: Mutex::new(Vec::new()), capacity }
    }

    /// The result of a key: remembered, or made and remembered in place of the one not used for longest.
    ///
    /// No thread waits while another makes a result; two that lack the same one both make it.
    pub fn get(&self, key: K, make: impl FnOnce() -> V) -> Arc<V> {
        match self.try_get(key, || Ok::<V, std::convert::Infallible>(make())) {
            Ok(value) => value,
        }
    }

    /// [`Cache::get`] of what may fail to be made; a failure is not remembered.
    pub fn try_get<E>(&self, key: K, make: impl FnOnce() -> Result<V, E>) -> Result<Arc<V>, E> {
        // A thread that broke off while it held the lock left a sound list: each change to it is one call.
        let known = || self.known.lock().unwrap_or_else(PoisonError::into_inner);
        {
            let mut known = known();
            if let Some(at) = known.iter().rposition(|(k, _)| *k == key) {
                let found = known.remove(at);
                let value = found.1.clone();
                known.push(found);
                return Ok(value);
            }
        }
        let value = Arc::new(make()?);
        let mut known = known();
        if known.len() >= self.capacity {
            known.remove(0);
        }
        known.push((key, value.clone()));
        Ok(value)
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    /// Definition: a known key is not computed again, the one unused for longest goes first, and the size is bounded.
    #[test]
    fn the_last_used_are_kept() {
        let cache: Cache<u32, u32> = Cache::new(2);
        let made = std::cell::Cell::new(0);
        let get = |key: u32| {
            let value = cache.get(key, || {
                made.set(made.get() + 1);
                10 * key
            });
            assert_eq!(*value, 10 * key);
        };
        for (key, count) in [(1, 1), (2, 2), (1, 2), (3, 3), (1, 3), (2, 4), (3, 5)] {
            get(key);
            assert_eq!(made.get(), count, "at {key}");
        }
        assert_eq!(cache.known.lock().unwrap().len(), 2);
    }
}
