//! `epiloom run`: solves what a script asks for and stores the results.

use std::num::NonZeroUsize;
use std::path::{Path, PathBuf};
use std::sync::Arc;
use std::sync::atomic::{AtomicBool, Ordering};

use crate::archive::{Archive, ArchiveError, Writer, unfinished_path};
use crate::diagnostics::{Diagnostic, codes};
use crate::language;

use super::exit::Exit;
use super::output::Output;
use super::recorder::{Recorder, header};
use super::script::ScriptArguments;
use super::trouble::writing_error;

/// `epiloom run SCRIPT`.
#[derive(clap::Args, Debug)]
#[command(after_help = "\
Prints the stack, each stored snapshot with its figures, their numerical errors and its ledger, warnings, and last the
archive. Snapshots are kept from the moment they are stored: after Ctrl-C, a fault or a kill they are in
FILE.epiloom.unfinished, which `epiloom show` opens. An earlier archive of the same script is replaced when the run
has ended well; the archive of another script never is.")]
pub struct Run {
    #[command(flatten)]
    script: ScriptArguments,
    /// The archive to write [default: the script's name with .epiloom, in the current folder]
    #[arg(long, value_name = "FILE.epiloom")]
    out: Option<PathBuf>,
    /// Threads to use; no result depends on it [default: all]
    #[arg(long, value_name = "N")]
    threads: Option<NonZeroUsize>,
    /// Print only what the script prints, and what is wrong
    #[arg(long)]
    quiet: bool,
}

impl Run {
    /// Runs the script.
    pub fn run(&self, output: &mut Output) -> Exit {
        match self.run_to_end(output) {
            Ok(exit) => exit,
            Err(fault) => {
                output.diagnostic(&fault, None);
                Exit::of(fault.code)
            }
        }
    }

    fn run_to_end(&self, output: &mut Output) -> Result<Exit, Box<Diagnostic>> {
        let script = self.script.read()?;
        let source = self.script.source(&script);
        let path = self.archive_path();
        may_replace(&path, &script.name)?;
        let first = header(&script);
        let writer = Writer::create(&path, &first).map_err(|e| writing_error(&e))?;
        if let Some(aside) = writer.set_aside() {
            output.remark(&format!("an unfinished archive of an earlier run is kept as {}", aside.display()));
        }
        let mut options = self.script.options();
        options.threads = self.threads.map(NonZeroUsize::get);
        options.interrupt = stop_on_interrupt(output);
        if !self.quiet {
            output.show_progress();
        }
        let mut recorder = Recorder::new(output, &source, self.quiet, writer, first);
        let outcome = language::run(&script, options, &mut recorder);
        let (writer, header, failed) = recorder.into_parts();
        output.end_progress();
        for error in &outcome.errors {
            output.diagnostic(error, Some(&source));
        }
        let stored = writer.count();
        if stored == 0 {
            discard(writer);
            if outcome.errors.is_empty() {
                output.remark(
                    "the script stored nothing, so no archive was written: store(\"name\", result) does",
                );
            }
        } else if outcome.errors.is_empty() {
            let written = writer.finish(&header).map_err(|error| kept(&error, &path))?;
            if !self.quiet {
                output.result(&format!("archive {}\n", written.display()));
            }
        } else {
            let unfinished = writer.abandon().map_err(|error| kept(&error, &path))?;
            let snapshots = if stored == 1 {
                "1 finished snapshot is"
            } else {
                &format!("{stored} finished snapshots are")
            };
            output.remark(&format!("{snapshots} kept in {}", unfinished.display()));
        }
        Ok(ending(&outcome, failed))
    }

    fn archive_path(&self) -> PathBuf {
        match &self.out {
            Some(path) => path.clone(),
            None => {
                let mut name = self.script.script.file_stem().unwrap_or_default().to_os_string();
                name.push(".epiloom");
                PathBuf::from(name)
            }
        }
    }
}

/// How the run ended for the shell.
fn ending(outcome: &language::RunOutcome, failed: usize) -> Exit {
    let worst = outcome.errors.iter().map(|error| match Exit::of(error.code) {
        exit @ (Exit::Internal | Exit::Interrupted) => exit,
        _ if error.code == codes::UNWRITABLE => Exit::File,
        _ => Exit::Fault,
    });
    match worst.max_by_key(|exit| exit.code()) {
        _ if outcome.interrupted => Exit::Interrupted,
        Some(exit) => exit,
        None if failed > 0 => Exit::Fault,
        None => Exit::Done,
    }
}

/// Refuses to replace anything but an earlier archive of the same script.
fn may_replace(path: &Path, script: &str) -> Result<(), Box<Diagnostic>> {
    if !path.try_exists().unwrap_or(false) {
        return Ok(());
    }
    let shown = path.display();
    let refusal = |what: String| {
        Err(Box::new(
            Diagnostic::new(codes::OTHER_ARCHIVE, what)
                .help("give this run another file, `--out FILE.epiloom`, or move that one away"),
        ))
    };
    match Archive::open(path).and_then(|archive| archive.run().map(|run| run.script_name.clone())) {
        Ok(name) if name == script => Ok(()),
        Ok(name) => refusal(format!("`{shown}` holds the results of another script, `{name}`")),
        Err(ArchiveError::Io { source, .. }) => {
            refusal(format!("`{shown}` is there and cannot be read: {source}"))
        }
        Err(_) => refusal(format!("`{shown}` is there and is no whole archive")),
    }
}

/// A failure at the end of a run, with where the snapshots are.
fn kept(error: &ArchiveError, path: &Path) -> Diagnostic {
    let unfinished = unfinished_path(path);
    writing_error(error).note(format!("what was stored is in {}", unfinished.display()))
}

/// Drops an archive that holds nothing; should its file refuse to go, the next run takes it over.
fn discard(writer: Writer<'static>) {
    let unfinished = writer.unfinished().to_path_buf();
    let _ = std::fs::remove_file(unfinished);
    drop(writer);
}

/// A flag that Ctrl-C raises; a second Ctrl-C ends the process at once, which loses nothing that is stored.
fn stop_on_interrupt(output: &mut Output) -> Arc<AtomicBool> {
    let flag = Arc::new(AtomicBool::new(false));
    let raised = Arc::clone(&flag);
    let set = ctrlc::set_handler(move || {
        if raised.swap(true, Ordering::Relaxed) {
            std::process::exit(i32::from(Exit::Interrupted.code()));
        }
    });
    if set.is_err() {
        output.remark("Ctrl-C cannot be caught here: it will end the run at once, with what is stored kept");
    }
    flag
}
