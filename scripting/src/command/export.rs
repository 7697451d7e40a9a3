//! `epiloom export`: one snapshot in an open format.

use std::path::PathBuf;

use crate::archive::export::{Format, export};
use crate::diagnostics::{Diagnostic, codes};

use super::exit::Exit;
use super::output::Output;
use super::show::{condition, open, tell};

/// `epiloom export FILE SNAPSHOT --to csv|npz|json -o PATH`.
#[derive(clap::Args, Debug)]
#[command(after_help = "\
CSV writes one file for each table: the first at PATH, the others beside it with the table's name before the ending.
NPZ is a zip of numpy arrays, one for each column. JSON holds everything. A file at PATH is replaced.")]
pub struct Export {
    /// The archive
    #[arg(value_hint = clap::ValueHint::FilePath)]
    pub file: PathBuf,
    /// The snapshot
    pub snapshot: String,
    /// The format
    #[arg(long, value_parser = ["csv", "npz", "json"])]
    pub to: String,
    /// The file to write
    #[arg(short, long, value_name = "PATH")]
    pub out: PathBuf,
}

impl Export {
    /// Writes the file.
    pub fn run(&self, output: &mut Output) -> Exit {
        let archive = match open(&self.file, output) {
            Ok(archive) => archive,
            Err(exit) => return exit,
        };
        let Some(format) = Format::named(&self.to) else {
            let fault = Diagnostic::new(codes::NOT_EXPORTABLE, format!("no format is called `{}`", self.to));
            output.diagnostic(&fault.help("csv, npz or json"), None);
            return Exit::Usage;
        };
        match archive.snapshot(&self.snapshot).and_then(|snapshot| export(&snapshot, format, &self.out)) {
            Ok(files) => {
                for file in files {
                    output.result(&format!("{}\n", file.display()));
                }
                condition(&archive)
            }
            Err(error) => tell(&error, output),
        }
    }
}
