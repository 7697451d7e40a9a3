//! What a script cannot do: run for ever, grow without end, reach the clock, the disk or another script.

use std::sync::Arc;

use rhai::{Dynamic, Engine, INT, Module};

use crate::diagnostics::codes;

use super::fault::{Fault, Outcome};
use super::point;
use super::session::Session;

/// Why a script was stopped between two operations.
#[derive(Clone, Debug, PartialEq, Eq)]
pub(super) enum Stop {
    /// From outside.
    Interrupted,
    /// The process grew beyond its limit.
    Memory,
    /// A fault that is kept already.
    Fault,
    /// More operations than the script, or a point of a sweep, may do.
    Operations,
    /// Another point of the sweep has stopped the script.
    Halted,
    /// It reads the table of this sweep, of which this run has a share only.
    Share(String),
}

/// Operations between two looks at the memory in use.
const MEMORY_INTERVAL: u64 = 512;

/// Sets every limit and closes every hole; called after all else is registered.
pub(super) fn close(engine: &mut Engine, session: &Arc<Session>) {
    let limits = &session.options.limits;
    engine.set_max_operations(limits.operations);
    engine.set_max_call_levels(limits.call_depth);
    engine.set_max_expr_depths(128, 128);
    engine.set_max_string_size(limits.text);
    engine.set_max_array_size(limits.array);
    engine.set_max_map_size(limits.map);
    engine.set_max_variables(limits.variables);
    engine.set_max_functions(500);
    engine.set_max_modules(0);
    engine.set_module_resolver(rhai::module_resolvers::DummyModuleResolver::new());
    engine.disable_symbol("eval");
    engine.disable_symbol("import");
    for name in ["sleep", "timestamp"] {
        // disabling the symbol does not reach these: their names stay callable, so they are replaced
        let closed = move || -> Outcome<Dynamic> { Err(closed_function(name).into()) };
        engine.register_fn(name, closed);
        engine.register_fn(name, move |_: INT| -> Outcome<Dynamic> { Err(closed_function(name).into()) });
        engine.register_fn(name, move |_: f64| -> Outcome<Dynamic> { Err(closed_function(name).into()) });
    }
    let watched = Arc::clone(session);
    engine.on_progress(move |_| {
        // counted here, since the engine forgets what closures do that its own functions call
        let (operations, allowed) = point::count_operation();
        if !allowed {
            return Some(Dynamic::from(Stop::Operations));
        }
        if watched.interrupted() {
            return Some(Dynamic::from(Stop::Interrupted));
        }
        let lost = point::lost() || watched.lost_edit.load(std::sync::atomic::Ordering::Relaxed);
        if lost && !watched.checking() {
            return Some(Dynamic::from(Stop::Fault));
        }
        if operations % MEMORY_INTERVAL == 0 {
            if too_much_memory(&watched) {
                return Some(Dynamic::from(Stop::Memory));
            }
            if point::halted() {
                return Some(Dynamic::from(Stop::Halted));
            }
        }
        None
    });
}

/// The fault of calling a function that is closed.
pub(super) fn closed_function(name: &str) -> Fault {
    Fault::new(codes::CLOSED_FUNCTION, format!("`{name}` is closed to scripts")).help(match name {
        "eval" => "write the expression itself, or a closure `|x| ..`",
        "import" => "a script stands alone: copy the functions it needs into it",
        _ => "a result depends on the script alone, never on the clock: leave it out",
    })
}

/// Whether the process has grown beyond the script's limit.
pub(super) fn too_much_memory(session: &Session) -> bool {
    match (session.memory_at_start, memory_in_use()) {
        (Some(start), Some(now)) => now.saturating_sub(start) > session.options.limits.memory,
        _ => false,
    }
}

/// Resident memory of the process in bytes, where the system tells.
pub(super) fn memory_in_use() -> Option<u64> {
    #[cfg(target_os = "linux")]
    {
        let text = std::fs::read_to_string("/proc/self/statm").ok()?;
        let pages: u64 = text.split_whitespace().nth(1)?.parse().ok()?;
        Some(pages * 4096)
    }
    #[cfg(not(target_os = "linux"))]
    None
}

/// A module of constants that every scope, functions included, can read.
pub(super) fn constants(values: impl IntoIterator<Item = (String, Dynamic)>) -> Module {
    let mut module = Module::new();
    for (name, value) in values {
        module.set_var(name, value);
    }
    module
}
