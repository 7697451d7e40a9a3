//! The ways out: one snapshot as CSV, NPZ or JSON, with the same bytes each time.

mod csv;
mod json;
mod npz;
#[cfg(feature = "parquet")]
mod parquet;
mod sheet;

use std::io::{BufWriter, Seek, Write};
use std::path::{Path, PathBuf};

pub use self::csv::{CsvDocument, csv_documents, csv_names, csv_sheet};
pub use self::json::{json_listing, json_point, json_sheet, json_snapshot};
pub use self::npz::{npz, npz_sheet};
pub use self::sheet::{
    CellKind, Form, FormColumn, OrderError, Row, Rows, Sheet, SheetCell, SheetCells, SheetColumn,
};

use super::error::ArchiveError;
use super::model::Snapshot;
use super::reader::Archive;
use super::storage::{Disk, Storage};
use super::stored::Sweep;

/// The form of an export.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Format {
    /// Comma-separated values: one file a table.
    Csv,
    /// A zip of numpy arrays.
    Npz,
    /// Everything, as JSON.
    Json,
    /// Apache Parquet: sweeps only, and only where the program was built with the feature `parquet`.
    Parquet,
}

impl Format {
    /// Every form with the word that names it.
    pub const ALL: [(&'static str, Format); 4] =
        [("csv", Format::Csv), ("npz", Format::Npz), ("json", Format::Json), ("parquet", Format::Parquet)];

    /// The form of that name.
    pub fn named(name: &str) -> Option<Format> {
        Format::ALL.into_iter().find(|(word, _)| *word == name).map(|(_, format)| format)
    }
}

/// Writes the snapshot in that form and returns the files written, the one at `path` first.
///
/// CSV takes one file a table: the first one stands at `path`, the others beside it with the name of the
/// table before the ending (`out.csv`, `out-figures.csv`, `out-ledger.csv`). Each file is written beside its
/// place and renamed, so that none is ever half there.
///
/// # Errors
/// [`ArchiveError::Io`], [`ArchiveError::Encoding`].
pub fn export(snapshot: &Snapshot, format: Format, path: &Path) -> Result<Vec<PathBuf>, ArchiveError> {
    let files = match format {
        Format::Csv => {
            let documents = csv_documents(snapshot)?;
            documents.into_iter().map(|each| (beside(path, each.suffix.as_deref()), each.bytes)).collect()
        }
        Format::Npz => vec![(path.to_owned(), npz(snapshot)?)],
        Format::Json => vec![(path.to_owned(), json_snapshot(snapshot)?)],
        Format::Parquet => {
            let reason = "it takes sweeps; CSV, NPZ and JSON take snapshots".to_owned();
            return Err(ArchiveError::Encoding { what: "a snapshot as Parquet".to_owned(), reason });
        }
    };
    for (file, bytes) in &files {
        write_whole(file, bytes)?;
    }
    Ok(files.into_iter().map(|(file, _)| file).collect())
}

/// Writes the sweep in that form to one file, beside its place and renamed, as it is read: the memory that is taken does not
/// grow with the sweep in CSV and Parquet, and holds a few columns at once in NPZ and JSON.
///
/// # Errors
/// A block that is damaged, [`ArchiveError::Io`], [`ArchiveError::Encoding`].
pub fn export_sweep(
    archive: &Archive,
    sweep: &Sweep,
    format: Format,
    path: &Path,
) -> Result<(), ArchiveError> {
    let form = Form::of(archive, sweep)?;
    let rows = || form.rows(archive, sweep);
    write_with(path, |out| match format {
        Format::Csv => csv_sheet(&form, rows(), out),
        Format::Npz => npz_sheet(&form, archive, sweep, out),
        Format::Json => json_sheet(&form, archive, sweep, out),
        #[cfg(feature = "parquet")]
        Format::Parquet => self::parquet::parquet(&form, rows(), out),
        #[cfg(not(feature = "parquet"))]
        Format::Parquet => {
            let reason =
                "this program was built without it: cargo build --release --features parquet".to_owned();
            Err(ArchiveError::Encoding { what: "Parquet".to_owned(), reason })
        }
    })
}

/// `path` with a suffix before its ending.
fn beside(path: &Path, suffix: Option<&str>) -> PathBuf {
    let Some(suffix) = suffix else { return path.to_owned() };
    let mut name = path.file_stem().unwrap_or_default().to_owned();
    name.push("-");
    name.push(suffix);
    if let Some(ending) = path.extension() {
        name.push(".");
        name.push(ending);
    }
    path.with_file_name(name)
}

/// Writes a file beside its place and renames it, so that it is never half there.
///
/// # Errors
/// [`ArchiveError::Io`].
pub fn write_whole(path: &Path, bytes: &[u8]) -> Result<(), ArchiveError> {
    write_with(path, |out| {
        let written = out.write_all(bytes);
        written.map_err(|source| ArchiveError::Io { action: "write", path: path.to_owned(), source })
    })
}

/// A file on its way, which keeps the first failure of the system: formats tell of theirs in words of their own.
#[derive(Debug)]
struct Written {
    file: std::fs::File,
    failure: Option<std::io::Error>,
}

impl Written {
    fn noted<T>(&mut self, done: std::io::Result<T>) -> std::io::Result<T> {
        done.map_err(|error| {
            let same =
                error.raw_os_error().map_or_else(|| error.kind().into(), std::io::Error::from_raw_os_error);
            self.failure.get_or_insert(error);
            same
        })
    }
}

impl Write for Written {
    fn write(&mut self, bytes: &[u8]) -> std::io::Result<usize> {
        let done = self.file.write(bytes);
        self.noted(done)
    }
    fn flush(&mut self) -> std::io::Result<()> {
        let done = self.file.flush();
        self.noted(done)
    }
}

impl Seek for Written {
    fn seek(&mut self, to: std::io::SeekFrom) -> std::io::Result<u64> {
        let done = self.file.seek(to);
        self.noted(done)
    }
}

/// A file that is written from its beginning on.
type Out = BufWriter<Written>;

/// As [`write_whole`], of what `fill` writes.
fn write_with(
    path: &Path,
    fill: impl FnOnce(&mut Out) -> Result<(), ArchiveError>,
) -> Result<(), ArchiveError> {
    let failed = |source| ArchiveError::Io { action: "write", path: path.to_owned(), source };
    // A pipe or a terminal is written to, not replaced; the folder of temporary files holds what comes first.
    if path.metadata().is_ok_and(|about| !about.is_file()) {
        let beside = std::env::temp_dir().join(format!("epiloom-export-{}", std::process::id()));
        let written = filled(&beside, fill, failed).and_then(|()| {
            let copied = std::fs::File::open(&beside).and_then(|mut made| {
                let mut out = std::fs::OpenOptions::new().write(true).open(path)?;
                std::io::copy(&mut made, &mut out)
            });
            copied.map(|_| ()).map_err(failed)
        });
        let _ = Disk.remove(&beside);
        return written;
    }
    let mut beside = path.as_os_str().to_owned();
    beside.push(".exporting");
    let beside = PathBuf::from(beside);
    let moved = filled(&beside, fill, failed).and_then(|()| Disk.rename(&beside, path).map_err(failed));
    if moved.is_err() {
        // The first failure is the one to report.
        let _ = Disk.remove(&beside);
        return moved;
    }
    Disk.sync_folder(path).map_err(failed)
}

/// A file with what `fill` writes, durable.
fn filled(
    path: &Path,
    fill: impl FnOnce(&mut Out) -> Result<(), ArchiveError>,
    failed: impl Fn(std::io::Error) -> ArchiveError,
) -> Result<(), ArchiveError> {
    let file = std::fs::File::create(path).map_err(&failed)?;
    let mut out = BufWriter::with_capacity(1 << 16, Written { file, failure: None });
    let done = fill(&mut out);
    if let Some(source) = out.get_mut().failure.take() {
        return Err(failed(source));
    }
    done?;
    out.flush().and_then(|()| out.get_ref().file.sync_all()).map_err(&failed)
}

/// A name that can stand in a file name or as a key: path separators and control characters become `_`.
fn plain_name(name: &str) -> String {
    let plain: String =
        name.chars().map(|c| if c.is_control() || "/\\:*?\"<>|".contains(c) { '_' } else { c }).collect();
    if plain.trim_matches('.').is_empty() { "_".to_owned() } else { plain }
}

/// `name`, or `name_2`, `name_3` and so on where it is taken.
fn unique_name(name: String, taken: &mut std::collections::BTreeSet<String>) -> String {
    let mut candidate = name.clone();
    let mut number = 2_u64;
    while !taken.insert(candidate.clone()) {
        candidate = format!("{name}_{number}");
        number += 1;
    }
    candidate
}
