//! A closure of which each point of a sweep works on a copy of its own, whatever it captures and in whatever way.

use std::collections::BTreeMap;

use rhai::{Array, Dynamic, FnPtr, Map};

use crate::diagnostics::codes;

use super::fault::Fault;

/// Levels of values in values that a closure may capture.
const DEEPEST: usize = 2_000;

/// A closure with its captured values, as it was when it was taken; later changes of the variables do not reach it.
///
/// The engine shares a captured variable between the closure and the script, and refuses to use it from two places
/// at once. Here a variable that is reached in one way only becomes a plain value; one that two closures (or a
/// closure and itself) share stays shared between the copies of these, and with nothing else.
#[derive(Clone, Debug)]
pub struct Captured {
    closure: FnPtr,
    /// Whether anything is left that copies must not share.
    plain: bool,
}

impl Captured {
    /// Takes a closure.
    ///
    /// # Errors
    /// A captured variable is in use by the very call that takes the closure; values nested too deeply.
    pub fn new(closure: &FnPtr) -> Result<Captured, Fault> {
        let own = copied(closure)?;
        let plain = own.curry().iter().all(is_plain);
        Ok(Captured { closure: own, plain })
    }

    /// A copy on whose values nothing else works.
    pub fn copy(&self) -> Result<FnPtr, Fault> {
        if self.plain { Ok(self.closure.clone()) } else { copied(&self.closure) }
    }
}

/// Whether a clone of a value shares nothing that could be changed.
fn is_plain(value: &Dynamic) -> bool {
    if value.is_shared() {
        return false;
    }
    if let Some(list) = value.read_lock::<Array>() {
        return list.iter().all(is_plain);
    }
    if let Some(map) = value.read_lock::<Map>() {
        return map.values().all(is_plain);
    }
    value.read_lock::<FnPtr>().is_none_or(|closure| closure.curry().iter().all(is_plain))
}

fn copied(closure: &FnPtr) -> Result<FnPtr, Fault> {
    let mut copier = Copier::default();
    for value in closure.curry() {
        copier.count(value, 0)?;
    }
    copier.closure(closure, 0)
}

/// Copies a graph of values.
#[derive(Default)]
struct Copier {
    /// How often each shared variable is reached, by its address.
    reached: BTreeMap<usize, usize>,
    /// The copies of those that are reached more than once.
    made: BTreeMap<usize, Dynamic>,
}

impl Copier {
    fn count(&mut self, value: &Dynamic, depth: usize) -> Result<(), Fault> {
        if depth > DEEPEST {
            return Err(Fault::new(codes::TOO_DEEP, "what the closure captures is nested too deeply"));
        }
        if value.is_shared() {
            let inner = value.read_lock::<Dynamic>().ok_or_else(in_use)?;
            let times = self.reached.entry(address(&inner)).or_insert(0);
            *times += 1;
            return if *times == 1 { self.count(&inner, depth + 1) } else { Ok(()) };
        }
        if let Some(list) = value.read_lock::<Array>() {
            return list.iter().try_for_each(|entry| self.count(entry, depth + 1));
        }
        if let Some(map) = value.read_lock::<Map>() {
            return map.values().try_for_each(|entry| self.count(entry, depth + 1));
        }
        match value.read_lock::<FnPtr>() {
            Some(closure) => closure.curry().iter().try_for_each(|entry| self.count(entry, depth + 1)),
            None => Ok(()),
        }
    }

    fn closure(&mut self, closure: &FnPtr, depth: usize) -> Result<FnPtr, Fault> {
        let mut copy = closure.clone();
        for value in copy.iter_curry_mut() {
            *value = self.value(value, depth + 1)?;
        }
        Ok(copy)
    }

    fn value(&mut self, value: &Dynamic, depth: usize) -> Result<Dynamic, Fault> {
        if value.is_shared() {
            let inner = value.read_lock::<Dynamic>().ok_or_else(in_use)?;
            let place = address(&inner);
            if self.reached.get(&place).is_none_or(|times| *times < 2) {
                return self.value(&inner, depth + 1);
            }
            if let Some(copy) = self.made.get(&place) {
                return Ok(copy.clone());
            }
            // the copy stands in the list before its content is made, which may lead back to it
            let mut copy = Dynamic::UNIT.into_shared();
            self.made.insert(place, copy.clone());
            let content = self.value(&inner, depth + 1)?;
            if let Some(mut slot) = copy.write_lock::<Dynamic>() {
                *slot = content;
            }
            return Ok(copy);
        }
        if let Some(list) = value.read_lock::<Array>() {
            let copies: Result<Array, Fault> =
                list.iter().map(|entry| self.value(entry, depth + 1)).collect();
            return Ok(copies?.into());
        }
        if let Some(map) = value.read_lock::<Map>() {
            let copies: Result<Map, Fault> =
                map.iter().map(|(key, entry)| Ok((key.clone(), self.value(entry, depth + 1)?))).collect();
            return Ok(copies?.into());
        }
        match value.read_lock::<FnPtr>() {
            Some(closure) => Ok(Dynamic::from(self.closure(&closure, depth + 1)?)),
            None => Ok(value.clone()),
        }
    }
}

/// Which variable a value lies in.
fn address(inner: &Dynamic) -> usize {
    std::ptr::from_ref(inner) as usize
}

/// The fault of a closure that captures the variable whose method it is given to: the engine holds it during the call.
pub fn in_use() -> Fault {
    held("map")
}

/// The same for the variable of this name.
pub fn held(name: &str) -> Fault {
    Fault::new(codes::WRONG_KIND, "a closure uses the variable whose method it is given to")
        .help(format!("take a copy above, `let all = {name};`, and use `all` in the closure"))
}
