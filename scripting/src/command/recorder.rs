//! What listens to a run: prints as it goes, and puts every snapshot into the archive before the script goes on.

use epiloom_solver::solve::Tolerances;

use std::sync::{Arc, Mutex, PoisonError};

use crate::archive::{
    Condition, DataFile, Earlier, Point, RunHeader, Share, Snapshot, Stack, Status, SweepStart, Value, Writer,
};
use crate::diagnostics::{Diagnostic, SourceText};
use crate::language::{self, InputRecord, PictureRefused, Script, Sink, StoredPoints};

use super::inputs;
use super::output::Output;
use super::pictures::write_below;
use super::report::{snapshot_text, stack_text, warnings_text};
use super::sweeps::Tally;

/// What of a run holds no solution.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq)]
pub struct Failures {
    /// Snapshots.
    pub snapshots: usize,
    /// Points of sweeps, those that were found stored as well.
    pub points: u64,
}

/// The listener of `epiloom run`.
pub struct Recorder<'a> {
    output: &'a mut Output,
    source: &'a SourceText,
    quiet: bool,
    writer: Writer<'static>,
    header: RunHeader,
    shown: Option<Stack>,
    told: Vec<String>,
    told_of_earlier: bool,
    failures: Failures,
    share: Option<Share>,
    /// The points of the sweep that is going on, those that were found stored as they are read.
    tally: Arc<Mutex<Tally>>,
}

impl<'a> Recorder<'a> {
    /// A listener that writes to this archive.
    pub fn new(
        output: &'a mut Output,
        source: &'a SourceText,
        quiet: bool,
        writer: Writer<'static>,
        header: RunHeader,
        share: Option<Share>,
    ) -> Self {
        Recorder {
            output,
            source,
            quiet,
            writer,
            header,
            shown: None,
            told: Vec::new(),
            told_of_earlier: false,
            failures: Failures::default(),
            share,
            tally: Arc::default(),
        }
    }

    /// What became of the unfinished file of an earlier run, once.
    fn tell_of_earlier(&mut self) {
        let Some(earlier) = self.writer.earlier().filter(|_| !self.told_of_earlier) else { return };
        let text = earlier_text(earlier);
        self.told_of_earlier = true;
        self.output.remark(&text);
    }

    /// The archive, the description of the run, and what of it holds no solution.
    pub fn into_parts(self) -> (Writer<'static>, RunHeader, Failures) {
        (self.writer, self.header, self.failures)
    }

    fn report(&mut self, snapshot: &Snapshot) {
        let mut text = String::new();
        if self.shown.as_ref() != Some(&snapshot.stack) && !snapshot.stack.layers.is_empty() {
            text.push_str(&stack_text(&snapshot.stack));
            text.push('\n');
            self.shown = Some(snapshot.stack.clone());
        }
        text.push_str(&snapshot_text(snapshot));
        // what stood on standard error already, with its place in the script, is not said again
        let news: Vec<String> = snapshot
            .warnings
            .iter()
            .filter(|w| !self.told.iter().any(|told| w.contains(told.as_str())))
            .cloned()
            .collect();
        text.push_str(&warnings_text(&news));
        text.push('\n');
        self.output.result(&text);
    }
}

/// What became of the unfinished file of an earlier run, in words.
pub fn earlier_text(earlier: &Earlier) -> String {
    match earlier {
        Earlier::SetAside { path, why } => {
            format!("an unfinished archive was there, but {why}: it is kept as {}", path.display())
        }
        Earlier::TakenOver { snapshots, points } => format!(
            "going on with the unfinished archive of an earlier run: {points} points of sweeps are stored and not \
             solved again, {snapshots} snapshots are compared"
        ),
    }
}

/// The counts, whoever holds them.
fn tally_of(tally: &Mutex<Tally>) -> std::sync::MutexGuard<'_, Tally> {
    // counting cannot fail half-way
    tally.lock().unwrap_or_else(PoisonError::into_inner)
}

/// The description of a run before its script has said anything.
pub fn header(script: &Script) -> RunHeader {
    RunHeader {
        program_version: env!("CARGO_PKG_VERSION").to_string(),
        script_name: script.name.clone(),
        script_text: script.text.clone(),
        tolerances: tolerances(),
        ..RunHeader::default()
    }
}

/// What the solver calls solved.
fn tolerances() -> Vec<Condition> {
    let Tolerances { update, most_iterations, .. } = Tolerances::default();
    vec![
        Condition::new("last Newton update in kT/q, at most", Value::number(update, "")),
        Condition::new("Newton iterations of a step, at most", Value::number(most_iterations as f64, "")),
    ]
}

/// Name and digest of a data file as an archive holds them.
pub fn data_file(file: &language::DataFile) -> (String, DataFile) {
    let bytes: &[u8] = &file.bytes;
    (
        file.name.clone(),
        DataFile { blake3: blake3::hash(bytes).to_hex().to_string(), length: bytes.len() as u64 },
    )
}

impl Sink for Recorder<'_> {
    fn print(&mut self, line: &str) {
        self.output.result(&format!("{line}\n"));
    }

    fn input(&mut self, input: &InputRecord) {
        self.header.inputs.insert(input.name.clone(), inputs::stored(input));
    }

    fn data_file(&mut self, file: &language::DataFile) {
        self.header.data_files.extend([data_file(file)]);
    }

    fn warning(&mut self, warning: &Diagnostic) {
        self.told.push(warning.message.clone());
        self.output.diagnostic(warning, Some(self.source));
    }

    fn working(&mut self, what: &str) {
        self.output.working(what);
    }

    fn snapshot(&mut self, snapshot: Snapshot) -> Result<(), String> {
        let kept = self.writer.update_run(&self.header).and_then(|()| self.writer.append(&snapshot));
        self.tell_of_earlier();
        kept.map_err(|error| error_text(&error))?;
        self.output.stored();
        self.failures.snapshots += usize::from(snapshot.label.status != Status::Solved);
        if !self.quiet {
            self.report(&snapshot);
        }
        Ok(())
    }

    fn sweep(&mut self, sweep: &SweepStart) -> Result<StoredPoints, String> {
        let begun = self.writer.update_run(&self.header).and_then(|()| self.writer.begin_sweep(sweep));
        self.tell_of_earlier();
        let found = begun.map_err(|error| error_text(&error))?;
        self.tally = Arc::default();
        let total = self.share.map_or(sweep.points, |share| share.count(sweep.points));
        self.output.sweep_begins(&sweep.name, total, found.count_left() as u64);
        let tally = Arc::clone(&self.tally);
        Ok(Box::new(found.map(move |point| {
            let point = point.map_err(|error| error_text(&error))?;
            tally_of(&tally).count(&point);
            Ok(point)
        })))
    }

    fn points(&mut self, sweep: &SweepStart, points: Vec<Point>) -> Result<(), String> {
        points.iter().for_each(|point| tally_of(&self.tally).count(point));
        self.writer.append_points(&sweep.name, points).map_err(|error| error_text(&error))?;
        let tally = tally_of(&self.tally);
        self.output.sweep_goes_on(tally.done, tally.failed);
        Ok(())
    }

    fn sweep_done(&mut self, sweep: &SweepStart, left_out: u64) {
        let finished = self.writer.finish_sweep(&sweep.name, left_out);
        self.output.sweep_ends();
        self.failures.points += tally_of(&self.tally).failed;
        if let Err(error) = finished {
            // the writer is broken now, or the archive lacks no point: finishing tells
            self.output.remark(&error_text(&error));
        }
        if !self.quiet {
            let text = tally_of(&self.tally).summary(sweep, left_out);
            self.output.result(&text);
        }
    }

    fn picture(&mut self, name: &str, bytes: &[u8]) -> Result<(), PictureRefused> {
        let folder = match self.writer.unfinished().parent() {
            Some(parent) if !parent.as_os_str().is_empty() => parent.to_path_buf(),
            _ => std::path::PathBuf::from("."),
        };
        write_below(&folder, name, bytes)?;
        if !self.quiet {
            self.output.result(&format!("picture {}\n", folder.join(name).display()));
        }
        Ok(())
    }
}

/// A fault of the archive in one text, with its mend.
fn error_text(error: &crate::archive::ArchiveError) -> String {
    match error.help() {
        Some(help) => format!("{error}; {help}"),
        None => error.to_string(),
    }
}
