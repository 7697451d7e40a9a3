//! `epiloom export`: one snapshot or one sweep in an open format.

use std::path::PathBuf;

use crate::archive::export::{Format, export, export_sweep};
use crate::diagnostics::{Diagnostic, codes};

use super::exit::Exit;
use super::output::Output;
use super::show::{condition, open, tell};

/// `epiloom export FILE NAME --to csv|npz|json|parquet -o PATH`.
#[derive(clap::Args, Debug)]
#[command(after_help = "\
CSV writes one file for each table: the first at PATH, the others beside it with the table's name before the ending.
NPZ is a zip of numpy arrays, one for each column. JSON holds everything. A file at PATH is replaced.

A sweep is one table: a row a point with its index, coordinates, outputs and their numerical errors under names with
their units, and the reason why a point failed. It is read as it is written: a sweep of any length takes little memory (NPZ
and JSON hold some of its columns at a time). Parquet takes sweeps, and wants a program built with the feature
`parquet`.")]
pub struct Export {
    /// The archive
    #[arg(value_hint = clap::ValueHint::FilePath)]
    pub file: PathBuf,
    /// The snapshot or the sweep
    pub name: String,
    /// The format
    #[arg(long, value_parser = ["csv", "npz", "json", "parquet"])]
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
            output.diagnostic(&fault.help("csv, npz, json or parquet"), None);
            return Exit::Usage;
        };
        let sweep = archive.sweeps().iter().find(|sweep| sweep.name == self.name);
        if format == Format::Parquet && (sweep.is_none() || !cfg!(feature = "parquet")) {
            let fault = match sweep {
                None => Diagnostic::new(codes::NOT_EXPORTABLE, format!("`{}` is no sweep", self.name))
                    .help("Parquet takes sweeps; csv, npz and json take snapshots"),
                Some(_) => Diagnostic::new(codes::NOT_EXPORTABLE, "this program was built without Parquet")
                    .help("build it with `cargo build --release --features parquet`, or take npz"),
            };
            output.diagnostic(&fault, None);
            return Exit::Usage;
        }
        let written = match sweep {
            Some(sweep) => export_sweep(&archive, sweep, format, &self.out).map(|()| vec![self.out.clone()]),
            None => archive.snapshot(&self.name).and_then(|snapshot| export(&snapshot, format, &self.out)),
        };
        match written {
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
