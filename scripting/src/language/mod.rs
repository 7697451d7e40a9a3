//! The script language: from a script's text to snapshots, printed lines and diagnostics, for whoever runs one.
//!
//! [`run`] is the whole seam: it takes a [`Script`] and [`RunOptions`], tells a [`Sink`] what happens, in the order
//! of the script, and returns a [`RunOutcome`]. No panic leaves it.

use std::sync::mpsc::channel;

use crate::diagnostics::{Diagnostic, codes};

mod captured;
mod cells;
mod described;
mod device_value;
mod dimension;
mod display;
mod engine;
mod fault;
mod files;
mod light_value;
mod lower;
mod plan;
mod point;
mod quantity;
mod receivers;
mod reference;
mod report;
mod result_value;
mod sandbox;
mod session;
mod snapshot;
mod solver_faults;
mod spans;
mod steps;
mod sweep;
mod table;
mod topics;
mod units;
mod value;
mod vocabulary;

pub use dimension::Dimension;
pub use quantity::Quantity;
pub use reference::reference;
pub use session::{
    DataFile, InputRecord, InputValue, Limits, Part, PictureRefused, RunOptions, RunOutcome, Script, Sink,
    StoredPoints,
};
pub use units::{UNITS, Unit, unit};

use fault::Fault;
use session::{Event, Session};

/// Stack of the script's thread, bytes, the first that the system grants. Only what is used takes memory. Values nested
/// as deeply as the limit on memory allows (closures that capture closures) are dropped level by level: the first
/// size holds them, the others are for systems that do not reserve so much.
const STACKS: [usize; 3] = [2 << 30, 512 << 20, 64 << 20];

/// Runs a script, or checks it, telling `sink` what happens in the order of the script.
///
/// The script runs in a thread of its own, so that a fault of the program itself ends as a diagnostic (E900) with
/// what was stored kept. Ctrl-C is told by raising [`RunOptions::interrupt`]. A check evaluates the script with
/// analyses that solve nothing: their figures are quantities of known dimension and unknown value, comparisons with
/// them do not hold, prints are suppressed, and evaluation goes on after a fault with the next statement.
pub fn run(script: &Script, options: RunOptions, sink: &mut dyn Sink) -> RunOutcome {
    let (sender, receiver) = channel();
    let session = Session::new(script, options, sender);
    let mut outcome = RunOutcome::default();
    std::thread::scope(|scope| {
        let shared = std::sync::Arc::clone(&session);
        let spawn = |stack: usize| {
            let shared = std::sync::Arc::clone(&shared);
            let builder = std::thread::Builder::new().name("script".to_string()).stack_size(stack);
            builder.spawn_scoped(scope, move || {
                let _last_word = LastWord(&shared);
                evaluate(&shared)
            })
        };
        let mut spawned = spawn(STACKS[0]);
        for stack in &STACKS[1..] {
            if spawned.is_err() {
                spawned = spawn(*stack);
            }
        }
        let thread = match spawned {
            Ok(thread) => thread,
            Err(error) => {
                outcome.errors.push(internal(&format!("no thread could be started: {error}")));
                return;
            }
        };
        listen(&receiver, sink);
        outcome.errors = match thread.join() {
            Ok((errors, waits_for)) => {
                outcome.waits_for = waits_for;
                errors
            }
            Err(panic) => vec![internal(panic_words(&*panic))],
        };
    });
    let mut state = session.state();
    let mut errors = std::mem::take(&mut state.faults);
    errors.append(&mut outcome.errors);
    errors.sort_by_key(|d| d.span());
    outcome.errors = errors;
    outcome.warnings = std::mem::take(&mut state.warnings);
    outcome.interrupted = outcome.errors.iter().any(|e| e.code == codes::INTERRUPTED);
    outcome.stored = session.stored.load(std::sync::atomic::Ordering::Relaxed) as usize;
    outcome
}

/// Reads and runs the script of a session: its errors, and the sweep whose table it waits for where it ended well.
fn evaluate(session: &std::sync::Arc<Session>) -> (Vec<Diagnostic>, Option<String>) {
    point::allow(session.options.limits.operations);
    let mut engine = engine::build(session);
    let ast = match engine::compile(&mut engine, &session.source.text) {
        Ok(ast) => ast,
        Err(error) => return (vec![report::parse_diagnostic(session, &error)], None),
    };
    receivers::watch(&mut engine, &ast);
    let redefined = engine::redefined(&session.source.text, &ast);
    if !redefined.is_empty() {
        return (redefined, None);
    }
    if let Some(strange) = strange_inputs(session) {
        return (strange, None);
    }
    match engine::run(&engine, &ast, session) {
        Ok(()) => (unknown_inputs(session, &declared_inputs(session)), None),
        Err(error) => {
            let waits_for = match report::stop(&error) {
                Some(sandbox::Stop::Share(sweep)) => Some(sweep),
                _ => None,
            };
            (report::diagnostics(session, &error), waits_for)
        }
    }
}

/// What `--set` names without the script having it, as far as that can be told before anything is solved.
///
/// A rehearsal of the script, which solves nothing, declares its inputs, those with computed names too. It knows them
/// all if it came past every call of `input` with a known name.
fn strange_inputs(session: &std::sync::Arc<Session>) -> Option<Vec<Diagnostic>> {
    let literal = |name: &str| session.source.text.contains(&format!("input(\"{name}\""));
    if session.checking() || session.options.set.iter().all(|(name, _)| literal(name)) {
        return None;
    }
    let rehearsal = session.rehearsal();
    let mut engine = engine::build(&rehearsal);
    let ast = engine::compile(&mut engine, &rehearsal.source.text).ok()?;
    receivers::watch(&mut engine, &ast);
    point::allow(rehearsal.options.limits.operations);
    let rehearsed = engine::run(&engine, &ast, &rehearsal);
    point::allow(session.options.limits.operations);
    rehearsed.ok()?;
    let calls = engine::calls_of(&ast, "input");
    if !calls.is_subset(&rehearsal.state().input_calls) {
        return None;
    }
    let strange = unknown_inputs(session, &declared_inputs(&rehearsal));
    (!strange.is_empty()).then_some(strange)
}

/// Names of the inputs that a run has declared.
fn declared_inputs(session: &Session) -> Vec<String> {
    session.state().inputs.keys().cloned().collect()
}

/// What `--set` names that is not among the inputs.
fn unknown_inputs(session: &Session, inputs: &[String]) -> Vec<Diagnostic> {
    let set = session.options.set.iter();
    set.filter(|(name, _)| !inputs.contains(name))
        .map(|(name, _)| {
            let fault =
                Fault::new(codes::UNKNOWN_INPUT, format!("--set {name}: the script has no input `{name}`"));
            let fault = if inputs.is_empty() {
                fault.help(format!("declare it: let {name} = input(\"{name}\", ..);"))
            } else {
                let all = inputs.iter().map(|k| format!("`{k}`")).collect::<Vec<_>>().join(", ");
                fault
                    .candidates(name, inputs.iter().map(String::as_str))
                    .note(format!("the inputs of the script: {all}"))
            };
            session.diagnostic(&fault, rhai::Position::NONE)
        })
        .collect()
}

/// Tells the listener, when it is dropped (by a panic too), that nothing more will come.
struct LastWord<'a>(&'a Session);

impl Drop for LastWord<'_> {
    fn drop(&mut self) {
        self.0.tell(Event::Done);
    }
}

/// Hands events to the sink until the script's thread is done.
fn listen(events: &std::sync::mpsc::Receiver<Event>, sink: &mut dyn Sink) {
    while let Ok(event) = events.recv() {
        match event {
            Event::Done => return,
            event => hand_over(event, sink),
        }
    }
}

fn hand_over(event: Event, sink: &mut dyn Sink) {
    match event {
        Event::Print(line) => sink.print(&line),
        Event::Input(input) => sink.input(&input),
        Event::DataFile(file) => sink.data_file(&file),
        Event::Warning(warning) => sink.warning(&warning),
        Event::Working(what) => sink.working(&what),
        Event::Done => {}
        Event::Snapshot(snapshot, reply) => {
            let _ = reply.send(sink.snapshot(*snapshot));
        }
        Event::Sweep(sweep, reply) => {
            let _ = reply.send(sink.sweep(&sweep));
        }
        Event::Points(sweep, points, reply) => {
            let _ = reply.send(sink.points(&sweep, points));
        }
        Event::SweepDone(sweep, left_out) => sink.sweep_done(&sweep, left_out),
        Event::Picture(name, bytes, reply) => {
            let _ = reply.send(sink.picture(&name, &bytes));
        }
    }
}

fn internal(message: &str) -> Diagnostic {
    Diagnostic::new(codes::INTERNAL, format!("a fault of the program itself: {message}"))
        .help("please report it with the script; what was stored before is kept")
}

fn panic_words(panic: &(dyn std::any::Any + Send)) -> &str {
    panic
        .downcast_ref::<&str>()
        .copied()
        .or_else(|| panic.downcast_ref::<String>().map(String::as_str))
        .unwrap_or("no message")
}

#[cfg(test)]
mod tests;
