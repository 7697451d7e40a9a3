//! One run of one script: its limits, its inputs, what it has stored and warned of, and the line to whoever runs it.

use std::collections::{BTreeMap, BTreeSet};
use std::path::PathBuf;
use std::sync::atomic::{AtomicBool, AtomicU64, Ordering};
use std::sync::mpsc::{Sender, channel};
use std::sync::{Arc, Mutex, MutexGuard, OnceLock};

use rhai::Position;

use crate::archive::{Point, Snapshot, SweepStart};
use crate::diagnostics::{Diagnostic, SourceText, codes};

use super::fault::{Fault, Place};
use super::files::Files;
use super::point;
use super::quantity::Quantity;
use super::spans::locate;

/// What a script may use up.
#[derive(Clone, Debug)]
pub struct Limits {
    /// Operations of the script; solving does not count.
    pub operations: u64,
    /// Depth of nested calls.
    pub call_depth: usize,
    /// Bytes of one text.
    pub text: usize,
    /// Entries of one array, those of the arrays in it included.
    pub array: usize,
    /// Entries of one map, those of the maps in it included.
    pub map: usize,
    /// Variables alive at once.
    pub variables: usize,
    /// Bytes of memory of the process above what it used at the start, where the system tells (Linux).
    pub memory: u64,
    /// Points of one curve or spectral response.
    pub points: usize,
    /// Operations of the script in one point of a sweep; solving does not count.
    pub point_operations: u64,
    /// Operations of the script in all points of all sweeps.
    pub sweep_operations: u64,
    /// Points of one sweep.
    pub sweep_points: u64,
    /// Bytes of one data file.
    pub file: u64,
}

impl Default for Limits {
    fn default() -> Self {
        Limits {
            operations: 200_000_000,
            call_depth: 64,
            text: 1 << 20,
            array: 100_000,
            map: 20_000,
            variables: 2_000,
            memory: 1 << 30,
            points: 20_000,
            point_operations: 20_000_000,
            sweep_operations: 1_000_000_000_000,
            sweep_points: 20_000_000,
            file: 64 << 20,
        }
    }
}

/// How a script is run.
#[derive(Clone, Debug, Default)]
pub struct RunOptions {
    /// Overrides of inputs: name and value as typed, `("bsf_thickness", "50nm")`.
    pub set: Vec<(String, String)>,
    /// Folders outside the script's own that data files may be read from.
    pub allow_read: Vec<PathBuf>,
    /// Look for faults and solve nothing.
    pub check_only: bool,
    /// What the script may use up.
    pub limits: Limits,
    /// Threads for what can be done in parallel; `None` takes all. No result depends on it.
    pub threads: Option<usize>,
    /// The share of every plan that this run solves; `None` solves all.
    pub part: Option<Part>,
    /// Raised from outside to stop the run (Ctrl-C).
    pub interrupt: Arc<AtomicBool>,
}

/// One of equal shares of every plan: the points whose index leaves `number - 1` when divided by `of`.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct Part {
    /// Which share, from 1.
    pub number: u64,
    /// How many shares there are.
    pub of: u64,
}

/// Operations of a rehearsal, at most: a fraction of a second.
const REHEARSED_OPERATIONS: u64 = 2_000_000;

/// A script to run.
#[derive(Clone, Debug, Default)]
pub struct Script {
    /// Its file name, as shown to a person.
    pub name: String,
    /// Its text.
    pub text: String,
    /// The folder it lies in, from which its data files are read; without one no file can be read.
    pub folder: Option<PathBuf>,
    /// Data files by the name the script gives them, instead of the folder's own: for a replay from an archive.
    pub files: BTreeMap<String, Vec<u8>>,
}

/// An input that a script declared.
#[derive(Clone, Debug)]
pub struct InputRecord {
    /// Its name.
    pub name: String,
    /// The value that the script gives.
    pub default: InputValue,
    /// The value that this run uses.
    pub used: InputValue,
    /// Whether the value was set from outside.
    pub overridden: bool,
}

/// The value of an input.
#[derive(Clone, Debug)]
pub enum InputValue {
    /// A quantity or a plain number.
    Quantity(Quantity),
    /// A text.
    Text(String),
    /// Yes or no.
    Flag(bool),
}

/// A data file that a script read.
#[derive(Clone, Debug)]
pub struct DataFile {
    /// The name that the script gives it, relative to its folder, with forward slashes.
    pub name: String,
    /// Its bytes.
    pub bytes: Arc<Vec<u8>>,
}

/// Who listens to a run: the command line, a test, a replay. Calls come in the order of the script.
pub trait Sink {
    /// The script printed a line.
    fn print(&mut self, _line: &str) {}
    /// The script declared an input.
    fn input(&mut self, _input: &InputRecord) {}
    /// The script read a data file for the first time.
    fn data_file(&mut self, _file: &DataFile) {}
    /// Something a person should know; the run goes on.
    fn warning(&mut self, _warning: &Diagnostic) {}
    /// An analysis begins ("jv of `Larch Bay 12`"), for a progress display.
    fn working(&mut self, _what: &str) {}
    /// The script stored a result. An error stops the script with this message.
    fn snapshot(&mut self, snapshot: Snapshot) -> Result<(), String>;
    /// A sweep begins. Gives those of its points that are stored already, in any order; they are not solved again.
    ///
    /// # Errors
    /// What is stored does not belong to this sweep, or cannot be read: the script stops with this message.
    fn sweep(&mut self, _sweep: &SweepStart) -> Result<StoredPoints, String> {
        Ok(Box::new(std::iter::empty()))
    }
    /// Points of a sweep are done, in any order. They count as finished once this returns: they are durable then.
    ///
    /// # Errors
    /// They could not be stored: the script stops with this message.
    fn points(&mut self, sweep: &SweepStart, _points: Vec<Point>) -> Result<(), String> {
        Err(format!("the points of the sweep `{}` are kept nowhere here", sweep.name))
    }
    /// All points of this run's share are done. Not told of a sweep that was stopped.
    ///
    /// `left_out` counts the indices of this run's share that the plan's filter leaves out: they are no points and
    /// nothing is handed over for them, so that a share is complete when its points and they add up to it.
    fn sweep_done(&mut self, _sweep: &SweepStart, _left_out: u64) {}
    /// The script made a picture: its name below the output folder, and the bytes of its file. Who keeps no files
    /// passes it by.
    ///
    /// # Errors
    /// It would lie outside the folder, or cannot be written.
    fn picture(&mut self, _name: &str, _bytes: &[u8]) -> Result<(), PictureRefused> {
        Ok(())
    }
}

/// Why a picture of a script was not written.
#[derive(Clone, Debug, PartialEq, Eq)]
pub enum PictureRefused {
    /// A link leads out of the output folder.
    Outside,
    /// The file system refuses it.
    Unwritable(String),
}

/// Points that are stored already, one after the other, so that a million need no memory.
pub type StoredPoints = Box<dyn Iterator<Item = Result<Point, String>> + Send>;

/// What came of a run.
#[derive(Clone, Debug, Default)]
pub struct RunOutcome {
    /// Errors, in the order of the script; empty when it ran to its end.
    pub errors: Vec<Diagnostic>,
    /// Warnings, all of which the sink has seen already.
    pub warnings: Vec<Diagnostic>,
    /// Whether the run was stopped from outside.
    pub interrupted: bool,
    /// How many snapshots were stored, those of points not counted.
    pub stored: usize,
    /// Whether the script ended early, and well, where it reads the table of a sweep of which this run solves a share
    /// only ([`RunOptions::part`]): the name of that sweep. Gathering the parts runs the script again with all points.
    pub waits_for: Option<String>,
}

/// A message from the script's thread to the sink.
pub(super) enum Event {
    Print(String),
    Input(InputRecord),
    DataFile(DataFile),
    Warning(Diagnostic),
    Working(String),
    Snapshot(Box<Snapshot>, Sender<Result<(), String>>),
    Sweep(Arc<SweepStart>, Sender<Result<StoredPoints, String>>),
    Points(Arc<SweepStart>, Vec<Point>, Sender<Result<(), String>>),
    SweepDone(Arc<SweepStart>, u64),
    Picture(String, Vec<u8>, Sender<Result<(), PictureRefused>>),
    Done,
}

/// What changes while a script runs.
#[derive(Default)]
pub(super) struct State {
    pub inputs: BTreeMap<String, InputRecord>,
    /// Line and column of every call that declared an input.
    pub input_calls: std::collections::BTreeSet<(usize, usize)>,
    pub snapshots: BTreeMap<String, Position>,
    pub faults: Vec<Diagnostic>,
    pub warnings: Vec<Diagnostic>,
    pub step: u64,
    pub pictures: BTreeSet<String>,
}

/// One run of one script, as its functions see it.
pub struct Session {
    /// The script.
    pub(super) source: SourceText,
    /// How it is run.
    pub(super) options: RunOptions,
    /// Its data files.
    pub(super) files: Files,
    /// What is read from memory use at the start, in bytes.
    pub(super) memory_at_start: Option<u64>,
    /// Raised once the script's last line is done, so that its variables may be dropped quietly.
    pub(super) finished: AtomicBool,
    /// Raised when a change was dropped with its value: the fault is kept, the script is to stop.
    pub(super) lost_edit: AtomicBool,
    pub(super) stored: AtomicU64,
    /// Operations in the points of all sweeps.
    pub(super) swept_operations: AtomicU64,
    /// The threads that solve points, once there was a sweep.
    workers: OnceLock<Option<rayon::ThreadPool>>,
    events: Sender<Event>,
    state: Mutex<State>,
}

impl Session {
    /// A session of this script that reports to `events`.
    pub(super) fn new(script: &Script, options: RunOptions, events: Sender<Event>) -> Arc<Self> {
        Arc::new(Session {
            source: SourceText::new(script.name.clone(), script.text.clone()),
            files: Files::new(script, &options),
            options,
            memory_at_start: super::sandbox::memory_in_use(),
            finished: AtomicBool::new(false),
            lost_edit: AtomicBool::new(false),
            stored: AtomicU64::new(0),
            swept_operations: AtomicU64::new(0),
            workers: OnceLock::new(),
            events,
            state: Mutex::new(State::default()),
        })
    }

    /// A session of the same script that solves nothing, tells nobody, takes every default and gives up early.
    pub(super) fn rehearsal(&self) -> Arc<Self> {
        let mut options = RunOptions { check_only: true, set: Vec::new(), ..self.options.clone() };
        options.limits.operations = options.limits.operations.min(REHEARSED_OPERATIONS);
        Arc::new(Session {
            source: self.source.clone(),
            files: self.files.afresh(),
            options,
            memory_at_start: self.memory_at_start,
            finished: AtomicBool::new(false),
            lost_edit: AtomicBool::new(false),
            stored: AtomicU64::new(0),
            swept_operations: AtomicU64::new(0),
            workers: OnceLock::new(),
            events: channel().0,
            state: Mutex::new(State::default()),
        })
    }

    /// Whether nothing is to be solved.
    pub(super) fn checking(&self) -> bool {
        self.options.check_only
    }

    /// What changes while the script runs. A panic while it was held leaves it readable: it only ever grows.
    pub(super) fn state(&self) -> MutexGuard<'_, State> {
        self.state.lock().unwrap_or_else(|poisoned| poisoned.into_inner())
    }

    /// The threads that solve points.
    ///
    /// # Errors
    /// The system gives no threads.
    pub(super) fn workers(&self) -> Result<&rayon::ThreadPool, Fault> {
        let pool = self.workers.get_or_init(|| {
            let threads = self.options.threads.unwrap_or(0);
            // as for the script's own thread: what the system grants
            super::STACKS.iter().find_map(|stack| {
                let builder = rayon::ThreadPoolBuilder::new().num_threads(threads).stack_size(*stack);
                builder.thread_name(|k| format!("points {k}")).build().ok()
            })
        });
        pool.as_ref().ok_or_else(|| Fault::new(codes::INTERNAL, "no threads could be started"))
    }

    /// Asks the sink and waits for its answer.
    pub(super) fn ask<T>(&self, event: impl FnOnce(Sender<Result<T, String>>) -> Event) -> Result<T, Fault> {
        let (reply, answer) = channel();
        self.tell(event(reply));
        match answer.recv() {
            Ok(Ok(given)) => Ok(given),
            Ok(Err(message)) => Err(Fault::new(codes::UNWRITABLE, message)),
            Err(_) => Err(Fault::new(codes::INTERNAL, "what was told was not taken")),
        }
    }

    /// Hands a picture to the sink and waits until it is written.
    pub(super) fn write_picture(&self, name: String, bytes: Vec<u8>) -> Result<(), PictureRefused> {
        let (reply, answer) = channel();
        self.tell(Event::Picture(name, bytes, reply));
        answer.recv().unwrap_or_else(|_| Err(PictureRefused::Unwritable("it was not taken".to_string())))
    }

    /// Tells what is being worked on; points of a sweep are told by their number alone.
    pub(super) fn working(&self, what: String) {
        if !point::inside() {
            self.tell(Event::Working(what));
        }
    }

    /// Tells the sink. A sink that has gone away has no use for it.
    pub(super) fn tell(&self, event: Event) {
        let _ = self.events.send(event);
    }

    /// The script printed a line; while checking nothing is printed, since figures are not known.
    pub(super) fn print(&self, line: &str) {
        if self.checking() {
            return;
        }
        if point::with(|p| p.printed.push(line.to_string())).is_none() {
            self.tell(Event::Print(line.to_string()));
        }
    }

    /// A warning, told once for each place and message.
    pub(super) fn warn(&self, fault: Fault, position: Position) {
        let warning = self.diagnostic(&fault, position);
        let gathered = (!self.checking()).then(|| {
            point::with(|p| {
                let words = format!("[{}] {}", warning.code, warning.message);
                if !p.warnings.contains(&words) {
                    p.warnings.push(words);
                }
            })
        });
        if gathered.flatten().is_some() {
            return;
        }
        let mut state = self.state();
        if !state.warnings.contains(&warning) {
            state.warnings.push(warning.clone());
            drop(state);
            self.tell(Event::Warning(warning));
        }
    }

    /// Keeps an error without stopping, while checking.
    pub(super) fn keep(&self, fault: &Fault, position: Position) {
        let diagnostic = self.diagnostic(fault, position);
        let mut state = self.state();
        if !state.faults.contains(&diagnostic) {
            state.faults.push(diagnostic);
        }
    }

    /// Forgets changes that were lost only because the script broke off before their use.
    pub(super) fn forget_lost_edits(&self) {
        self.state().faults.retain(|fault| fault.code != super::codes::EDIT_LOST);
    }

    /// Hands a snapshot to the sink and waits until it is safe there.
    pub(super) fn store(&self, snapshot: Snapshot) -> Result<(), Fault> {
        self.ask(|reply| Event::Snapshot(Box::new(snapshot), reply))?;
        self.stored.fetch_add(1, Ordering::Relaxed);
        Ok(())
    }

    /// Whether the run is to stop.
    pub(super) fn interrupted(&self) -> bool {
        self.options.interrupt.load(Ordering::Relaxed)
    }

    /// A fault at a position of the script as a diagnostic with spans.
    pub(super) fn diagnostic(&self, fault: &Fault, position: Position) -> Diagnostic {
        diagnostic(&self.source, fault, position)
    }
}

/// A fault at a position of a script as a diagnostic with spans.
pub(super) fn diagnostic(source: &SourceText, fault: &Fault, position: Position) -> Diagnostic {
    let mut diagnostic = Diagnostic::new(fault.code, fault.message.clone());
    let line = position.line().or(match fault.place {
        Place::Elsewhere(line, ..) => Some(line),
        _ => None,
    });
    if let Some(line) = line {
        let span = locate(&source.text, line, position.position().unwrap_or(0), &fault.place);
        diagnostic = diagnostic.label(span, fault.label.clone());
    }
    diagnostic.notes.clone_from(&fault.notes);
    diagnostic.help.clone_from(&fault.help);
    diagnostic
}
