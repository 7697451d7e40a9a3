//! The point of a sweep that a thread works on: where its lines, warnings and snapshots go, and what it may use up.

use std::cell::{Cell, RefCell};
use std::collections::BTreeSet;
use std::sync::Arc;
use std::sync::atomic::{AtomicBool, Ordering};

use crate::archive::Snapshot;
use crate::diagnostics::Diagnostic;

/// What a point gathers while it is worked on.
#[derive(Debug, Default)]
pub struct Gathered {
    /// What stands before the names of its snapshots: `map/3/`.
    pub prefix: String,
    /// Where the sweep stands in the run of the script.
    pub step: u64,
    /// The point's index in its plan; in a sweep inside a sweep that of the outermost point.
    pub index: u64,
    /// Names of its coordinates, for whoever mistypes one.
    pub coordinates: Vec<String>,
    /// Lines that the script printed.
    pub printed: Vec<String>,
    /// Warnings, each once.
    pub warnings: Vec<String>,
    /// Results that the script stored.
    pub snapshots: Vec<Snapshot>,
    /// Names of what was stored, without the prefix.
    pub names: BTreeSet<String>,
    /// Faults that the engine does not carry: changes that were lost.
    pub faults: Vec<Diagnostic>,
}

/// What a thread may still do.
#[derive(Clone, Copy, Debug)]
struct Meter {
    done: u64,
    allowed: u64,
}

thread_local! {
    static POINTS: RefCell<Vec<Gathered>> = const { RefCell::new(Vec::new()) };
    static METER: Cell<Meter> = const { Cell::new(Meter { done: 0, allowed: u64::MAX }) };
    static LOST: Cell<bool> = const { Cell::new(false) };
    static HALT: RefCell<Option<Arc<AtomicBool>>> = const { RefCell::new(None) };
}

/// Whether this thread works on a point.
pub fn inside() -> bool {
    POINTS.with_borrow(|points| !points.is_empty())
}

/// Does something with what the innermost point of this thread gathers; nothing outside a point.
pub fn with<R>(f: impl FnOnce(&mut Gathered) -> R) -> Option<R> {
    POINTS.with_borrow_mut(|points| points.last_mut().map(f))
}

/// Names of the coordinates of this thread's innermost point; none outside a point.
pub fn coordinates() -> Vec<String> {
    with(|point| point.coordinates.clone()).unwrap_or_default()
}

/// Keeps a change that was lost in the point of this thread; false outside a point.
pub fn lose(fault: Diagnostic) -> bool {
    let kept = with(|point| point.faults.push(fault)).is_some();
    LOST.set(kept);
    kept
}

/// Whether a change was lost in the point of this thread.
pub fn lost() -> bool {
    LOST.get()
}

/// A point in work: left when this is dropped, by a panic too.
#[derive(Debug)]
pub struct Entered {
    depth: usize,
}

/// Begins a point on this thread.
pub fn enter(gathered: Gathered) -> Entered {
    POINTS.with_borrow_mut(|points| {
        points.push(gathered);
        Entered { depth: points.len() }
    })
}

impl Entered {
    /// Ends the point and gives what it gathered.
    pub fn leave(self) -> Gathered {
        LOST.set(false);
        POINTS.with_borrow_mut(|points| {
            points.truncate(self.depth);
            points.pop().unwrap_or_default()
        })
    }
}

impl Drop for Entered {
    fn drop(&mut self) {
        POINTS.with_borrow_mut(|points| points.truncate(self.depth - 1));
    }
}

/// Allows this thread so many operations from now on.
pub fn allow(operations: u64) {
    METER.set(Meter { done: 0, allowed: operations });
}

/// Operations since they were last allowed.
pub fn operations_done() -> u64 {
    METER.get().done
}

/// Counts one operation; how many are done, and whether that is within what is allowed.
pub fn count_operation() -> (u64, bool) {
    let mut meter = METER.get();
    meter.done += 1;
    METER.set(meter);
    (meter.done, meter.done <= meter.allowed)
}

/// Lets this thread be stopped by this flag as well.
pub fn stop_by(flag: Option<Arc<AtomicBool>>) {
    HALT.set(flag);
}

/// Whether the flag of this thread is raised.
pub fn halted() -> bool {
    HALT.with_borrow(|flag| flag.as_ref().is_some_and(|flag| flag.load(Ordering::Relaxed)))
}
