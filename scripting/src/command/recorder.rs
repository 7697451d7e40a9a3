//! What listens to a run: prints as it goes, and puts every snapshot into the archive before the script goes on.

use epiloom_solver::solve::Tolerances;

use crate::archive::{Condition, DataFile, RunHeader, Snapshot, Stack, Status, Value, Writer};
use crate::diagnostics::{Diagnostic, SourceText};
use crate::language::{self, InputRecord, Script, Sink};

use super::inputs;
use super::output::Output;
use super::report::{snapshot_text, stack_text, warnings_text};

/// The listener of `epiloom run`.
pub struct Recorder<'a> {
    output: &'a mut Output,
    source: &'a SourceText,
    quiet: bool,
    writer: Writer<'static>,
    header: RunHeader,
    shown: Option<Stack>,
    told: Vec<String>,
    failed: usize,
}

impl<'a> Recorder<'a> {
    /// A listener that writes to this archive.
    pub fn new(
        output: &'a mut Output,
        source: &'a SourceText,
        quiet: bool,
        writer: Writer<'static>,
        header: RunHeader,
    ) -> Self {
        Recorder { output, source, quiet, writer, header, shown: None, told: Vec::new(), failed: 0 }
    }

    /// The archive, the description of the run, and how many snapshots hold no solution.
    pub fn into_parts(self) -> (Writer<'static>, RunHeader, usize) {
        (self.writer, self.header, self.failed)
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
        kept.map_err(|error| error.to_string())?;
        self.output.stored();
        self.failed += usize::from(snapshot.label.status != Status::Solved);
        if !self.quiet {
            self.report(&snapshot);
        }
        Ok(())
    }
}
