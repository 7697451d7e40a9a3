//! `epiloom check`: all faults of a script at once, solving nothing.

use crate::archive::Snapshot;
use crate::diagnostics::{Diagnostic, Severity};
use crate::language::{self, RunOptions, Sink};

use super::exit::Exit;
use super::output::Output;
use super::script::ScriptArguments;

/// `epiloom check SCRIPT`.
#[derive(clap::Args, Debug)]
pub struct Check {
    #[command(flatten)]
    script: ScriptArguments,
}

/// Nothing is solved, printed or stored: faults and warnings come with the outcome.
struct Silence;

impl Sink for Silence {
    fn snapshot(&mut self, _: Snapshot) -> Result<(), String> {
        Ok(())
    }
}

impl Check {
    /// Checks the script.
    pub fn run(&self, output: &mut Output) -> Exit {
        let script = match self.script.read() {
            Ok(script) => script,
            Err(fault) => {
                output.diagnostic(&fault, None);
                return Exit::of(fault.code);
            }
        };
        let source = self.script.source(&script);
        let options = RunOptions { check_only: true, ..self.script.options() };
        let outcome = language::run(&script, options, &mut Silence);
        let mut all: Vec<&Diagnostic> = outcome.errors.iter().chain(&outcome.warnings).collect();
        all.sort_by_key(|diagnostic| diagnostic.span());
        for diagnostic in &all {
            output.diagnostic(diagnostic, Some(&source));
        }
        let warnings = all.iter().filter(|d| d.severity == Severity::Warning).count();
        let count = |n: usize, word: &str| format!("{n} {word}{}", if n == 1 { "" } else { "s" });
        let summary = match (outcome.errors.len(), warnings) {
            (0, 0) => "no faults".to_string(),
            (0, warnings) => format!("no faults, {}", count(warnings, "warning")),
            (faults, warnings) => format!("{}, {}", count(faults, "fault"), count(warnings, "warning")),
        };
        output.result(&format!("{}: {summary}\n", source.name));
        match outcome
            .errors
            .iter()
            .map(|e| Exit::of(e.code))
            .find(|e| matches!(e, Exit::Internal | Exit::Interrupted))
        {
            Some(exit) => exit,
            None if outcome.errors.is_empty() => Exit::Done,
            None => Exit::Fault,
        }
    }
}
