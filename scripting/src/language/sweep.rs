//! Runs a plan: every point on all cores, each on its own copy of what the closure captures; nothing that a point gives
//! depends on its neighbours, on the threads or on the order.

use std::panic::{AssertUnwindSafe, catch_unwind};
use std::sync::atomic::{AtomicBool, AtomicU64, Ordering};
use std::sync::mpsc::{Receiver, RecvTimeoutError, SyncSender, sync_channel};
use std::sync::{Arc, Mutex};
use std::time::{Duration, Instant};

use rhai::{Dynamic, EvalAltResult, FnPtr, Map, NativeCallContext};

use crate::archive::{Point, PointOutput, Status, SweepStart};
use crate::diagnostics::{Diagnostic, codes};

use super::captured::Captured;
use super::cells;
use super::fault::{Fault, Outcome};
use super::plan::Plan;
use super::point::{self, Gathered};
use super::report;
use super::sandbox::{Stop, too_much_memory};
use super::session::{Event, Part, Session};
use super::table::builder::Builder;
use super::table::shown::counted;
use super::table::{Extent, Table, TableValue};

/// Points are handed to the listener once so many are done ..
const BATCH: usize = 256;
/// .. or after so long. Neither changes what is stored.
const BATCH_TIME: Duration = Duration::from_millis(250);
/// Reasons of failure that are told at the end of a sweep; the table has all.
const SHOWN_REASONS: usize = 5;

/// A plan being run.
struct Sweep<'a> {
    session: &'a Arc<Session>,
    context: &'a NativeCallContext<'a>,
    plan: &'a Arc<Plan>,
    closure: &'a Captured,
    start: Arc<SweepStart>,
    /// What stands before the names of its points' snapshots.
    prefix: String,
}

/// Why no more points are solved.
type Stopped = Box<EvalAltResult>;

/// Runs `plan` under a name that is the sweep's own.
pub fn run(
    session: &Arc<Session>,
    context: &NativeCallContext,
    plan: &Arc<Plan>,
    name: &str,
    closure: &FnPtr,
) -> Outcome<Dynamic> {
    if plan.size > session.options.limits.sweep_points {
        return Err(Fault::new(
            codes::TOO_LARGE,
            format!(
                "the plan has {} points; one sweep has at most {}",
                plan.size, session.options.limits.sweep_points
            ),
        )
        .help("run parts of it as plans of their own, or sample it: `latin_hypercube(#{ .. }, 10_000)`")
        .into());
    }
    let closure = Captured::new(closure)?;
    let step = begin(session, context, name)?;
    let start = Arc::new(SweepStart {
        name: name.to_string(),
        step,
        points: plan.size,
        plan: plan.words(),
        coordinates: plan.coordinates.iter().map(cells::coordinate_column).collect(),
    });
    let outer = point::with(|p| (p.prefix.clone(), p.index));
    let prefix = format!("{}{name}/", outer.as_ref().map_or("", |(prefix, _)| prefix));
    let sweep = Sweep { session, context, plan, closure: &closure, start, prefix };
    let table = if session.checking() {
        sweep.check()?
    } else {
        match outer {
            None => sweep.run_outer()?,
            Some((prefix, index)) => sweep.run_inside(&prefix, index)?,
        }
    };
    Ok(Dynamic::from(TableValue(Arc::new(table))))
}

/// Takes the name, and the sweep's place in the run; one inside a point has that of the point's sweep.
fn begin(session: &Arc<Session>, context: &NativeCallContext, name: &str) -> Outcome<u64> {
    let twice = || {
        Fault::new(codes::SNAPSHOT_TWICE, format!("two sweeps or snapshots are called `{name}`"))
            .help("put what changes into the name: plan.run(`map at ${t}`, ..)")
    };
    if let Some((new, step)) = point::with(|p| (p.names.insert(name.to_string()), p.step)) {
        return if new { Ok(step) } else { Err(twice().into()) };
    }
    let mut state = session.state();
    if state.snapshots.insert(name.to_string(), context.call_position()).is_some() {
        return Err(twice().into());
    }
    state.step += 1;
    Ok(state.step - 1)
}

impl Sweep<'_> {
    /// Solves a point; nothing where a filter leaves it out.
    ///
    /// # Errors
    /// What stops the whole script. A fault of the point is its result.
    fn solve(&self, index: u64, outermost: u64) -> Result<Option<Point>, Stopped> {
        let entered = point::enter(Gathered {
            prefix: format!("{}{index}/", self.prefix),
            step: self.start.step,
            index: outermost,
            coordinates: self.names(),
            ..Gathered::default()
        });
        let found = catch_unwind(AssertUnwindSafe(|| self.evaluate(index)));
        // while the point is still entered, so that its own limits are named
        let failed = match &found {
            Ok(Err(error)) if matches!(report::stop(error), None | Some(Stop::Operations)) => {
                Some(reason(self.session, &report::diagnostics(self.session, error)))
            }
            _ => None,
        };
        let gathered = entered.leave();
        // an analysis that was broken off is no point that failed: it is solved when the run goes on
        let whole = matches!(found, Ok(Ok(_))) && gathered.faults.is_empty();
        if self.session.interrupted() && !whole {
            return Err(report::stopped(Stop::Interrupted, self.context.call_position()));
        }
        let values = self.plan.values(index);
        let mut point = Point {
            index,
            coordinates: values
                .iter()
                .zip(&self.start.coordinates)
                .map(|(value, column)| cells::coordinate_cell(value, column))
                .collect(),
            printed: gathered.printed,
            warnings: gathered.warnings,
            snapshots: gathered.snapshots,
            ..Point::default()
        };
        let reason = match found {
            Ok(Ok(None)) => return Ok(None),
            Ok(Ok(Some(outputs))) if gathered.faults.is_empty() => {
                point.outputs = outputs;
                return Ok(Some(point));
            }
            Ok(Ok(Some(_))) => reason(self.session, &gathered.faults),
            Ok(Err(error)) => match (failed, report::stop(&error)) {
                (Some(reason), _) => reason,
                (None, Some(Stop::Fault)) => reason(self.session, &gathered.faults),
                (None, _) => return Err(error),
            },
            Err(panic) => format!(
                "[{}] a fault of the program itself: {}",
                codes::INTERNAL,
                super::panic_words(&*panic)
            ),
        };
        point.status = Status::Failed { reason };
        Ok(Some(point))
    }

    /// Names of the plan's coordinates.
    fn names(&self) -> Vec<String> {
        self.start.coordinates.iter().map(|column| column.name.clone()).collect()
    }

    /// The outputs of a point; nothing where a filter leaves it out.
    fn evaluate(&self, index: u64) -> Outcome<Option<Vec<PointOutput>>> {
        let global = self.context.global_runtime_state().clone();
        let position = self.context.call_position();
        let context =
            NativeCallContext::new_with_all_fields(self.context.engine(), "run", None, &global, position);
        let ask = |closure: &FnPtr, point: Map| call(&context, closure, point);
        if !self.plan.admits(index, &ask)? {
            return Ok(None);
        }
        let given = ask(&self.closure.copy()?, self.plan.point(index))?;
        let values = self.plan.values(index);
        Ok(Some(cells::outputs(&given.flatten(), &self.plan.coordinates, &values)?))
    }

    /// All points of this run's share, on all threads.
    fn run_outer(&self) -> Outcome<Table> {
        let session = self.session;
        session.working(format!("sweep `{}`", self.start.name));
        let stored = session.ask(|reply| Event::Sweep(Arc::clone(&self.start), reply))?;
        let share = Share::of(session.options.part, self.plan.size);
        let mut builder = Builder::default();
        let mut done = Done::default();
        for point in stored {
            let point = point.map_err(|message| Fault::new(codes::UNWRITABLE, message))?;
            if point.index >= self.plan.size || done.has(point.index) {
                return Err(Fault::new(
                    codes::UNWRITABLE,
                    format!(
                        "what is stored of the sweep `{}` is not of this plan: point {}",
                        self.start.name, point.index
                    ),
                )
                .into());
            }
            done.add(point.index);
            builder.push(&point);
        }
        let pool = session.workers()?;
        let work = Work {
            next: AtomicU64::new(0),
            left_out: AtomicU64::new(0),
            halt: Arc::new(AtomicBool::new(false)),
            stopped: Mutex::new(None),
            begun: (0..pool.current_num_threads()).map(|_| AtomicU64::new(0)).collect(),
        };
        let (sender, receiver) = sync_channel(BATCH);
        let kept = pool.in_place_scope(|scope| {
            let (work, done) = (&work, &done);
            for (worker, sender) in vec![sender; work.begun.len()].into_iter().enumerate() {
                scope.spawn(move |_| self.work(worker, work, share, done, &sender));
            }
            self.collect(&receiver, work, &mut builder)
        });
        if let Some(stopped) = work.stopped.into_inner().unwrap_or_else(|p| p.into_inner()) {
            return Err(stopped);
        }
        kept?;
        session.tell(Event::SweepDone(Arc::clone(&self.start), work.left_out.into_inner()));
        let partial = session.options.part.is_some_and(|part| part.of > 1);
        self.summary(&builder, partial)?;
        let mut table = builder.finish(&self.start, self.plan);
        if partial {
            table.extent = Extent::Share;
        }
        Ok(table)
    }

    /// One thread's points, one after the other, the lowest that is left first.
    fn work(&self, worker: usize, work: &Work, share: Share, done: &Done, sender: &SyncSender<Finished>) {
        point::stop_by(Some(Arc::clone(&work.halt)));
        loop {
            let turn = work.next.fetch_add(1, Ordering::SeqCst);
            work.begun[worker].store(turn, Ordering::SeqCst);
            if turn >= share.count || work.halt.load(Ordering::Relaxed) {
                break;
            }
            let index = share.first + turn * share.stride;
            if done.has(index) {
                continue;
            }
            point::allow(self.session.options.limits.point_operations);
            let mut found = if self.session.interrupted() {
                Err(report::stopped(Stop::Interrupted, self.context.call_position()))
            } else if turn.is_multiple_of(64) && too_much_memory(self.session) {
                Err(report::stopped(Stop::Memory, self.context.call_position()))
            } else {
                self.solve(index, index)
            };
            let operations = point::operations_done();
            let all = self.session.swept_operations.fetch_add(operations, Ordering::Relaxed) + operations;
            if all > self.session.options.limits.sweep_operations && found.is_ok() {
                let fault = Fault::new(
                    codes::TOO_MANY_OPERATIONS,
                    format!(
                        "the sweeps of the script did more than {} operations",
                        self.session.options.limits.sweep_operations
                    ),
                );
                found = Err(fault.into());
            }
            match found {
                Ok(Some(point)) => {
                    if sender.send((turn, point)).is_err() {
                        break;
                    }
                }
                Ok(None) => {
                    work.left_out.fetch_add(1, Ordering::Relaxed);
                }
                Err(error) => {
                    work.stop(error);
                    break;
                }
            }
        }
        work.begun[worker].store(u64::MAX, Ordering::SeqCst);
        point::stop_by(None);
    }

    /// Takes finished points, hands them on in batches, and prints what they printed in the order of the plan.
    fn collect(&self, receiver: &Receiver<Finished>, work: &Work, builder: &mut Builder) -> Outcome<()> {
        let mut batch = Vec::new();
        let mut lines: Vec<(u64, u64, Vec<String>)> = Vec::new();
        let mut last = Instant::now();
        let mut result = Ok(());
        loop {
            let wait = BATCH_TIME.saturating_sub(last.elapsed());
            let ended = match receiver.recv_timeout(wait) {
                Ok((turn, point)) => {
                    if !point.printed.is_empty() {
                        lines.push((turn, point.index, point.printed.clone()));
                    }
                    batch.push(point);
                    false
                }
                Err(RecvTimeoutError::Timeout) => false,
                Err(RecvTimeoutError::Disconnected) => true,
            };
            if !(ended || batch.len() >= BATCH || last.elapsed() >= BATCH_TIME) {
                continue;
            }
            // read before the queue is emptied: every point of an earlier turn has been sent by then
            let turn = work.begun.iter().map(|b| b.load(Ordering::SeqCst)).min().unwrap_or(u64::MAX);
            while let Ok((turn, point)) = receiver.try_recv() {
                if !point.printed.is_empty() {
                    lines.push((turn, point.index, point.printed.clone()));
                }
                batch.push(point);
            }
            if !batch.is_empty() && result.is_ok() {
                batch.iter().for_each(|point| builder.push(point));
                let points = std::mem::take(&mut batch);
                result = self.session.ask(|reply| Event::Points(Arc::clone(&self.start), points, reply));
                if result.is_err() {
                    work.halt.store(true, Ordering::Relaxed);
                }
            }
            batch.clear();
            lines.sort_by_key(|(turn, ..)| *turn);
            let ready = lines.partition_point(|(t, ..)| ended || *t < turn);
            for (_, index, printed) in lines.drain(..ready) {
                for line in printed {
                    self.session.tell(Event::Print(format!("{}[{index}]: {line}", self.start.name)));
                }
            }
            last = Instant::now();
            if ended {
                return Ok(result?);
            }
        }
    }

    /// A sweep inside a point: one point after the other, on the point's thread and out of its operations; the table is
    /// a snapshot of the point.
    fn run_inside(&self, prefix: &str, outermost: u64) -> Outcome<Table> {
        let mut builder = Builder::default();
        for index in 0..self.plan.size {
            let Some(point) = self.solve(index, outermost)? else { continue };
            builder.push(&point);
            point::with(|outer| {
                let printed =
                    point.printed.into_iter().map(|line| format!("{}[{index}]: {line}", self.start.name));
                outer.printed.extend(printed);
                for warning in point.warnings {
                    if !outer.warnings.contains(&warning) {
                        outer.warnings.push(warning);
                    }
                }
                outer.snapshots.extend(point.snapshots);
            });
        }
        self.summary(&builder, false)?;
        let table = builder.finish(&self.start, self.plan);
        let name = format!("{prefix}{}", self.start.name);
        let mut snapshot = table.snapshot(&name, "sweep", self.start.step);
        snapshot.label.order.point = outermost;
        point::with(|outer| outer.snapshots.push(snapshot));
        Ok(table)
    }

    /// Tells what failed and what was warned of; that no point at all was solved is a fault.
    fn summary(&self, builder: &Builder, partial: bool) -> Result<(), Fault> {
        let (solved, failed) = (builder.solved(), builder.failed());
        let name = &self.start.name;
        let reasons = builder.reasons();
        let noted = |mut fault: Fault| {
            for (reason, points, first) in reasons.iter().take(SHOWN_REASONS) {
                fault = fault.note(format!("{}, first point {first}: {reason}", counted(*points, "point")));
            }
            if reasons.len() > SHOWN_REASONS {
                fault = fault.note(format!("and {}", counted(reasons.len() - SHOWN_REASONS, "other reason")));
            }
            fault
        };
        if failed > 0 && solved == 0 && !partial {
            return Err(noted(Fault::new(
                codes::ALL_POINTS_FAILED,
                match failed {
                    1 => format!("the only point of the sweep `{name}` failed"),
                    _ => format!("all {failed} points of the sweep `{name}` failed"),
                },
            )));
        }
        if failed > 0 {
            let fault = Fault::new(
                codes::POINTS_FAILED,
                format!("{failed} of {} points of the sweep `{name}` failed", failed + solved),
            );
            self.session.warn(noted(fault), self.context.call_position());
        }
        let warned = builder.warned();
        if !warned.is_empty() {
            let counts: Vec<String> =
                warned.iter().map(|(code, w)| format!("{code} at {}", w.points)).collect();
            let mut fault = Fault::new(
                codes::POINTS_WARNED,
                format!(
                    "of {} points of the sweep `{name}` some have warnings: {}",
                    failed + solved,
                    counts.join(", ")
                ),
            );
            for found in warned.values() {
                let words: Vec<&str> = found.words.iter().map(String::as_str).collect();
                fault = fault.note(format!("point {}: {}", found.first, words.join("; ")));
            }
            self.session.warn(fault, self.context.call_position());
        }
        Ok(())
    }

    /// Looks for faults at the first and the last point without solving; one row of unknown figures.
    fn check(&self) -> Outcome<Table> {
        let mut builder = Builder::default();
        let size = self.plan.size;
        let last = (size > 1).then(|| size - 1);
        for index in std::iter::once(0).chain(last) {
            let entered = point::enter(Gathered { coordinates: self.names(), ..Gathered::default() });
            let found = self.evaluate(index);
            // while the point is still entered, so that its coordinates are named
            if let Err(error) = &found
                && !report::is_stop(error)
            {
                report::keep(self.session, error);
            }
            drop(entered.leave());
            match found {
                Ok(Some(outputs)) if index == 0 => {
                    builder.push(&Point { index, outputs, ..Point::default() });
                }
                Err(error) if report::is_stop(&error) => return Err(error),
                Ok(_) | Err(_) => {}
            }
        }
        if builder.solved() == 0 {
            // a filter may leave out the first point, a fault its figures: nothing is known of the columns
            return Err(Fault::of_unknown().into());
        }
        let mut table = builder.finish(&self.start, self.plan);
        table.extent = Extent::Checked;
        Ok(table)
    }
}

/// Calls a closure with a point.
fn call(context: &NativeCallContext, closure: &FnPtr, point: Map) -> Outcome<Dynamic> {
    let result = closure.call_raw(context, None, [Dynamic::from(point)]);
    result.map_err(|error| match &*error {
        EvalAltResult::ErrorFunctionNotFound(signature, _) if signature.starts_with(closure.fn_name()) => {
            Fault::new(codes::WRONG_ARGUMENTS, "the closure takes one argument, the point")
                .help("|p| ..")
                .into()
        }
        _ => error,
    })
}

/// A finished point and its turn.
type Finished = (u64, Point);

/// What the threads of a sweep share.
struct Work {
    next: AtomicU64,
    left_out: AtomicU64,
    halt: Arc<AtomicBool>,
    stopped: Mutex<Option<Stopped>>,
    /// The turn that each thread has begun.
    begun: Vec<AtomicU64>,
}

impl Work {
    /// Ends the work of all threads; the first reason is kept, unless a later one is not just its consequence.
    fn stop(&self, error: Stopped) {
        self.halt.store(true, Ordering::Relaxed);
        let mut stopped = self.stopped.lock().unwrap_or_else(|p| p.into_inner());
        if report::stop(&error) != Some(Stop::Halted) && stopped.is_none() {
            *stopped = Some(error);
        }
    }
}

/// The indices that a run solves: `first`, `first + stride`, ..
#[derive(Clone, Copy, Debug)]
struct Share {
    first: u64,
    stride: u64,
    count: u64,
}

impl Share {
    fn of(part: Option<Part>, size: u64) -> Share {
        match part {
            None => Share { first: 0, stride: 1, count: size },
            Some(Part { number, of }) => {
                let first = number.saturating_sub(1);
                Share { first, stride: of, count: size.saturating_sub(first).div_ceil(of.max(1)) }
            }
        }
    }
}

/// Which points are stored already.
#[derive(Debug, Default)]
struct Done {
    bits: Vec<u64>,
}

impl Done {
    fn has(&self, index: u64) -> bool {
        self.bits.get((index / 64) as usize).is_some_and(|word| word >> (index % 64) & 1 == 1)
    }

    fn add(&mut self, index: u64) {
        let word = (index / 64) as usize;
        if word >= self.bits.len() {
            self.bits.resize(word + 1, 0);
        }
        self.bits[word] |= 1 << (index % 64);
    }
}

/// Why a point failed, as a person reads it: "line 12: [E300] the potential did not converge ..".
fn reason(session: &Session, faults: &[Diagnostic]) -> String {
    let words: Vec<String> = faults
        .iter()
        .map(|fault| {
            let place = fault.span().map(|span| session.source.position(span.start).0);
            let mut text = place.map_or(String::new(), |line| format!("line {line}: "));
            text.push_str(&format!("[{}] {}", fault.code, fault.message));
            let label = fault.labels.first().map(|label| label.text.as_str()).filter(|text| !text.is_empty());
            for more in label.into_iter().chain(fault.notes.iter().map(String::as_str)) {
                text.push_str(&format!("; {more}"));
            }
            text
        })
        .collect();
    if words.is_empty() { "the script ended the point".to_string() } else { words.join("\n") }
}
