//! `epiloom run`: solves what a script asks for and stores the results.

use std::num::NonZeroUsize;
use std::path::{Path, PathBuf};
use std::sync::Arc;
use std::sync::atomic::{AtomicBool, Ordering};
use std::time::Duration;

use crate::archive::{Archive, ArchiveError, RunHeader, Share, Writer, unfinished_path};
use crate::diagnostics::{Diagnostic, codes};
use crate::language::{self, Part};

use super::exit::Exit;
use super::holder::{Holder, holder_of};
use super::output::{LOG_EVERY, Output};
use super::recorder::{Failures, Recorder, header};
use super::script::ScriptArguments;
use super::trouble::writing_error;

/// `epiloom run SCRIPT`.
#[derive(clap::Args, Debug)]
#[command(after_help = "\
Prints the stack, each stored snapshot with its figures, their numerical errors and its ledger, what came of each sweep,
warnings, and last the archive. Snapshots and points are kept from the moment they are stored: after Ctrl-C, a fault or
a kill they are in FILE.epiloom.unfinished, which `epiloom show` opens. The same command goes on from there: points of
sweeps that are stored are not solved again, and the archive is the same to the byte as that of a run that was never
stopped. An unfinished archive of another run is kept under another name. An earlier archive of the same script is
replaced when the run has ended well; the archive of another script never is.

A failed point of a sweep is a row with its reason and no failure of the run: the summary counts it, and the code is 0.
`--strict` is for scripts that must know: the archive is finished in the same way, and the code is 7.

On several machines: `--part 3/64` solves every 64th point of each plan, beginning with the third, into an archive of
its own; `epiloom gather` makes the whole of all parts, and `epiloom job` writes the script for a cluster.")]
pub struct Run {
    #[command(flatten)]
    script: ScriptArguments,
    /// The archive to write [default: the script's name with .epiloom, in the current folder]
    #[arg(long, value_name = "FILE.epiloom")]
    out: Option<PathBuf>,
    /// Solve only this share of every plan, such as 3/64, for `epiloom gather`
    #[arg(long, value_name = "K/N", value_parser = share)]
    part: Option<Share>,
    /// Begin anew: an unfinished archive of this very run is set aside, not gone on with
    #[arg(long)]
    anew: bool,
    /// End with code 7 where a point of a sweep failed; the archive is whole all the same
    #[arg(long)]
    strict: bool,
    /// Threads to use; no result depends on it [default: all]
    #[arg(long, value_name = "N")]
    threads: Option<NonZeroUsize>,
    /// Print only what the script prints, and what is wrong
    #[arg(long)]
    quiet: bool,
    /// Seconds between two lines of progress, where standard error is no terminal
    #[arg(long, value_name = "SECONDS", default_value_t = LOG_EVERY)]
    log_every: u64,
}

/// A share as it is typed, `3/64`.
pub fn share(text: &str) -> Result<Share, String> {
    let parts = text.split_once('/').and_then(|(number, of)| Some((number.parse().ok()?, of.parse().ok()?)));
    match parts {
        Some((number, of)) if (1..=of).contains(&number) => Ok(Share { number, of }),
        _ => Err("expected K/N, such as 3/64 for the third of 64 parts".to_string()),
    }
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
        let opened =
            if self.anew { Writer::create(&path, &first) } else { Writer::resume(&path, &first, self.part) };
        let writer = opened.map_err(|error| claim_error(&error, &path))?;
        let _holder = Holder::name(&path);
        let mut options = self.script.options();
        options.threads = self.threads.map(NonZeroUsize::get);
        options.part = self.part.map(|share| Part { number: share.number, of: share.of });
        options.interrupt = stop_on_interrupt(output);
        if !self.quiet {
            output.log_every(Duration::from_secs(self.log_every));
            output.show_progress();
        }
        let mut recorder = Recorder::new(output, &source, self.quiet, writer, first, self.part);
        let outcome = language::run(&script, options, &mut recorder);
        let (writer, header, failures) = recorder.into_parts();
        output.end_progress();
        for error in &outcome.errors {
            output.diagnostic(error, Some(&source));
        }
        end(output, writer, &header, &path, &outcome, self.quiet)?;
        if let (Some(share), Some(sweep)) = (self.part, &outcome.waits_for) {
            output.remark(&format!(
                "part {share} ends where the script reads the table of the sweep `{sweep}`: `epiloom gather` goes on from there with all parts"
            ));
        }
        Ok(ending(&outcome, failures, self.strict))
    }

    fn archive_path(&self) -> PathBuf {
        self.out.clone().unwrap_or_else(|| default_archive(&self.script.script, self.part))
    }
}

/// The archive of a script, or of a part of it, in the current folder: names of parts sort by their number.
pub fn default_archive(script: &Path, share: Option<Share>) -> PathBuf {
    let mut name = script.file_stem().unwrap_or_default().to_os_string();
    if let Some(Share { number, of }) = share {
        let digits = of.to_string().len();
        name.push(format!(".part-{number:0digits$}-of-{of}"));
    }
    name.push(".epiloom");
    PathBuf::from(name)
}

/// Finishes the archive, or keeps what is stored, and says so.
///
/// # Errors
/// The archive could not be finished; what was stored is kept.
pub fn end(
    output: &mut Output,
    writer: Writer<'static>,
    header: &RunHeader,
    path: &Path,
    outcome: &language::RunOutcome,
    quiet: bool,
) -> Result<(), Box<Diagnostic>> {
    if !writer.holds_anything() {
        // should its file refuse to go, the next run takes it over
        let _ = writer.discard();
        if outcome.errors.is_empty() {
            output.remark(
                "the script stored nothing, so no archive was written: store(\"name\", result) does, and a sweep",
            );
        }
        return Ok(());
    }
    if outcome.errors.is_empty() {
        let written = writer.finish(header).map_err(|error| kept(&error, path))?;
        if !quiet {
            output.result(&format!("archive {}\n", written.display()));
        }
        return Ok(());
    }
    let (snapshots, points) = (writer.count(), writer.points());
    let unfinished = writer.abandon().map_err(|error| kept(&error, path))?;
    let mut what = Vec::new();
    if points > 0 {
        what.push(if points == 1 {
            "1 finished point".to_string()
        } else {
            format!("{points} finished points")
        });
    }
    if snapshots == 1 {
        what.push("1 finished snapshot".to_string());
    } else if snapshots > 1 {
        what.push(format!("{snapshots} finished snapshots"));
    }
    let verb = if points + snapshots as u64 == 1 { "is" } else { "are" };
    let what = if what.is_empty() { "what an earlier run stored".to_string() } else { what.join(" and ") };
    output.remark(&format!(
        "{what} {verb} kept in {}; the same command goes on from there",
        unfinished.display()
    ));
    Ok(())
}

/// Why the archive could not be claimed, with who holds it.
pub fn claim_error(error: &ArchiveError, path: &Path) -> Diagnostic {
    let fault = writing_error(error);
    match (error, holder_of(path)) {
        (ArchiveError::HeldByAnotherRun { .. }, Some(holder)) => fault.note(format!("it is {holder}")),
        _ => fault,
    }
}

/// How the run ended for the shell.
pub fn ending(outcome: &language::RunOutcome, failures: Failures, strict: bool) -> Exit {
    let worst = outcome.errors.iter().map(|error| match Exit::of(error.code) {
        exit @ (Exit::Internal | Exit::Interrupted) => exit,
        _ if error.code == codes::UNWRITABLE => Exit::File,
        _ => Exit::Fault,
    });
    match worst.max_by_key(|exit| exit.code()) {
        _ if outcome.interrupted => Exit::Interrupted,
        Some(exit) => exit,
        None if failures.snapshots > 0 => Exit::Fault,
        None if strict && failures.points > 0 => Exit::PointsFailed,
        None => Exit::Done,
    }
}

/// Refuses to replace anything but an earlier archive of the same script.
///
/// # Errors
/// What stands there instead.
pub fn may_replace(path: &Path, script: &str) -> Result<(), Box<Diagnostic>> {
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

/// A flag that Ctrl-C raises; a second Ctrl-C ends the process at once, which loses nothing that is stored.
pub fn stop_on_interrupt(output: &mut Output) -> Arc<AtomicBool> {
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
