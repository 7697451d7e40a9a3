//! `epiloom show`: what an archive holds.

use std::fmt::Write;
use std::path::{Path, PathBuf};

use crate::archive::export::{json_listing, json_snapshot};
use crate::archive::{Archive, ArchiveError, RunHeader, Status};

use super::columns::{Align, columns};
use super::exit::Exit;
use super::output::Output;
use super::report::{snapshot_text, stack_text, value_text, warnings_text};
use super::trouble::{archive_error, archive_warning};

/// `epiloom show FILE [SNAPSHOT]`.
#[derive(clap::Args, Debug)]
pub struct Show {
    /// The archive
    #[arg(value_hint = clap::ValueHint::FilePath)]
    pub file: PathBuf,
    /// The snapshot; without one all are listed
    pub snapshot: Option<String>,
    /// Print JSON, with every number of the snapshot
    #[arg(long)]
    pub json: bool,
}

impl Show {
    /// Shows it.
    pub fn run(&self, output: &mut Output) -> Exit {
        let archive = match open(&self.file, output) {
            Ok(archive) => archive,
            Err(exit) => return exit,
        };
        let mut all_whole = true;
        let text = match (&self.snapshot, self.json) {
            (None, json) => {
                all_whole = tell_damaged(&archive, output);
                if json { json_listing(&archive) } else { Ok(listing(&archive).into_bytes()) }
            }
            (Some(name), json) => archive.snapshot(name).and_then(|snapshot| {
                if json {
                    return json_snapshot(&snapshot);
                }
                let stack = stack_text(&snapshot.stack);
                let warnings = warnings_text(&snapshot.warnings);
                Ok(format!("{stack}\n{}{warnings}", snapshot_text(&snapshot)).into_bytes())
            }),
        };
        match text {
            Ok(text) => {
                output.result(&String::from_utf8_lossy(&text));
                if all_whole { condition(&archive) } else { Exit::Archive }
            }
            Err(error) => tell(&error, output),
        }
    }
}

/// Reads every snapshot, names the damaged ones, and says whether all are whole.
fn tell_damaged(archive: &Archive, output: &mut Output) -> bool {
    let mut all_whole = true;
    for index in 0..archive.entries().len() {
        if let Err(error) = archive.snapshot_at(index) {
            tell(&error, output);
            all_whole = false;
        }
    }
    all_whole
}

/// Opens an archive and says what is amiss in it.
///
/// # Errors
/// How the command ends when it cannot be opened at all.
pub fn open(path: &Path, output: &mut Output) -> Result<Archive, Exit> {
    let archive = Archive::open(path).map_err(|error| tell(&error, output))?;
    for warning in archive.warnings() {
        output.diagnostic(&archive_warning(warning), None);
    }
    Ok(archive)
}

/// How a command ends that has shown what is whole in an archive.
pub fn condition(archive: &Archive) -> Exit {
    if archive.warnings().is_empty() { Exit::Done } else { Exit::Archive }
}

/// Prints the fault; the way the command ends.
pub fn tell(error: &ArchiveError, output: &mut Output) -> Exit {
    let fault = archive_error(error);
    output.diagnostic(&fault, None);
    Exit::of(fault.code)
}

/// The run and the list of snapshots.
fn listing(archive: &Archive) -> String {
    let mut text = match archive.run() {
        Ok(run) => run_text(run),
        // said among the archive's warnings
        Err(_) => String::new(),
    };
    let mut rows = vec![vec!["snapshot".to_string(), "kind".to_string(), String::new()]];
    for (index, entry) in archive.entries().iter().enumerate() {
        let status = match (&entry.label.status, archive.snapshot_at(index)) {
            (_, Err(_)) => "damaged".to_string(),
            (Status::Failed { reason }, _) => format!("failed: {reason}"),
            (Status::Solved, Ok(_)) => String::new(),
        };
        rows.push(vec![entry.label.name.clone(), entry.label.kind.clone(), status]);
    }
    text.push_str(&columns(&rows, &[], 0));
    text
}

fn run_text(run: &RunHeader) -> String {
    let mut text = format!("script {}, run by epiloom {}\n", run.script_name, run.program_version);
    let inputs: Vec<Vec<String>> = run
        .inputs
        .iter()
        .map(|(name, input)| {
            let origin = if input.overridden {
                format!("set from outside, {} in the script", value_text(&input.default))
            } else {
                String::new()
            };
            vec![format!("input {name}"), value_text(&input.used), origin]
        })
        .collect();
    text.push_str(&columns(&inputs, &[Align::Left], 2));
    for each in &run.tolerances {
        // writing to a text cannot fail, here and below
        let _ = writeln!(text, "  {}: {}", each.name, value_text(&each.value));
    }
    for (name, file) in &run.data_files {
        let _ = writeln!(text, "  data file {name}, {} bytes, BLAKE3 {}", file.length, file.blake3);
    }
    text.push('\n');
    text
}
