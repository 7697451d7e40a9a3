//! Tests of the language as a whole: scripts with the expected diagnostics written beside the guilty lines.

mod attacks;
mod devices;
mod files;
mod material_models;
mod numbers;
mod pictures;
mod plans;
mod solving;
mod temperature_models;
mod words;

use std::collections::BTreeMap;

use super::*;
use crate::archive::{Point, Snapshot, SweepStart};

/// A sink that remembers.
#[derive(Default)]
pub(super) struct Recorder {
    pub lines: Vec<String>,
    pub inputs: Vec<InputRecord>,
    pub files: Vec<DataFile>,
    pub snapshots: Vec<Snapshot>,
    /// Sweeps with their points in the order of the plan, and what their filters left out.
    pub sweeps: Vec<(SweepStart, Vec<Point>, Option<u64>)>,
    /// Points that are stored from the start, by the name of their sweep.
    pub stored: BTreeMap<String, Vec<Point>>,
}

impl Sink for Recorder {
    fn print(&mut self, line: &str) {
        self.lines.push(line.to_string());
    }
    fn input(&mut self, input: &InputRecord) {
        self.inputs.push(input.clone());
    }
    fn data_file(&mut self, file: &DataFile) {
        self.files.push(file.clone());
    }
    fn snapshot(&mut self, snapshot: Snapshot) -> Result<(), String> {
        self.snapshots.push(snapshot);
        Ok(())
    }
    fn sweep(&mut self, sweep: &SweepStart) -> Result<StoredPoints, String> {
        let stored = self.stored.get(&sweep.name).cloned().unwrap_or_default();
        self.sweeps.push((sweep.clone(), stored.clone(), None));
        Ok(Box::new(stored.into_iter().map(Ok)))
    }
    fn points(&mut self, sweep: &SweepStart, points: Vec<Point>) -> Result<(), String> {
        let found = self.sweeps.iter_mut().find(|(start, ..)| start == sweep);
        let (_, kept, _) = found.ok_or("points of no sweep")?;
        kept.extend(points);
        kept.sort_by_key(|point| point.index);
        Ok(())
    }
    fn sweep_done(&mut self, sweep: &SweepStart, left_out: u64) {
        if let Some((_, _, done)) = self.sweeps.iter_mut().find(|(start, ..)| start == sweep) {
            *done = Some(left_out);
        }
    }
}

/// A script without a folder.
pub(super) fn script(text: &str) -> Script {
    Script { name: "test.rhai".to_string(), text: text.to_string(), folder: None, files: BTreeMap::new() }
}

/// Runs a text with default options.
pub(super) fn run_text(text: &str) -> (RunOutcome, Recorder) {
    run_with(text, RunOptions::default())
}

/// Runs a text with these options.
pub(super) fn run_with(text: &str, options: RunOptions) -> (RunOutcome, Recorder) {
    let mut recorder = Recorder::default();
    let outcome = run(&script(text), options, &mut recorder);
    (outcome, recorder)
}

/// The lines that a script prints, which must run without a fault.
pub(super) fn printed(text: &str) -> Vec<String> {
    let (outcome, recorder) = run_text(text);
    assert!(outcome.errors.is_empty(), "{}", shown(text, &outcome.errors));
    recorder.lines
}

/// Diagnostics as a person reads them.
pub(super) fn shown(text: &str, diagnostics: &[Diagnostic]) -> String {
    let source = crate::diagnostics::SourceText::new("test.rhai", text);
    diagnostics
        .iter()
        .map(|d| crate::diagnostics::render(d, Some(&source), crate::diagnostics::Look::plain()))
        .collect::<Vec<_>>()
        .join("\n")
}

/// Line and code of every expected diagnostic: `// ~ E210` stands at the end of the guilty line, several codes apart by blanks.
fn expected(text: &str) -> Vec<(usize, String)> {
    let mut list = Vec::new();
    for (index, line) in text.lines().enumerate() {
        if let Some((_, codes)) = line.split_once("// ~ ") {
            list.extend(codes.split_whitespace().map(|code| (index + 1, code.to_string())));
        }
    }
    list.sort();
    list
}

/// Runs (or checks) a script and compares its diagnostics, all of them, with those written in it.
pub(super) fn expect_diagnostics(text: &str, options: RunOptions) -> RunOutcome {
    let (outcome, _) = run_with(text, options);
    let source = crate::diagnostics::SourceText::new("test.rhai", text);
    let mut found: Vec<(usize, String)> = outcome
        .errors
        .iter()
        .chain(&outcome.warnings)
        .map(|d| (d.span().map_or(0, |s| source.position(s.start).0), d.code.to_string()))
        .collect();
    found.sort();
    assert_eq!(
        found,
        expected(text),
        "\n{text}\n{}{}",
        shown(text, &outcome.errors),
        shown(text, &outcome.warnings)
    );
    outcome
}

/// A run of a one-fault script: its diagnostics are those written in it.
pub(super) fn fails(text: &str) -> Diagnostic {
    let outcome = expect_diagnostics(text, RunOptions::default());
    outcome.errors.into_iter().next().unwrap_or_else(|| internal("no fault"))
}
