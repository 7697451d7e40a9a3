//! The ways out: one snapshot as CSV, NPZ or JSON, with the same bytes each time.

mod csv;
mod json;
mod npz;
#[cfg(feature = "parquet")]
mod parquet;
mod sheet;

use std::path::{Path, PathBuf};

pub use self::csv::{CsvDocument, csv_documents, csv_names, csv_sheet};
pub use self::json::{json_listing, json_point, json_sheet, json_snapshot};
pub use self::npz::{npz, npz_sheet};
pub use self::sheet::{Sheet, SheetCells, SheetColumn};

use super::error::ArchiveError;
use super::model::Snapshot;
use super::storage::{Disk, Opening, Storage};

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

/// Writes the sweep in that form to one file, beside its place and renamed.
///
/// # Errors
/// [`ArchiveError::Io`], [`ArchiveError::Encoding`].
pub fn export_sheet(sheet: &Sheet, format: Format, path: &Path) -> Result<(), ArchiveError> {
    let bytes = match format {
        Format::Csv => csv_sheet(sheet)?,
        Format::Npz => npz_sheet(sheet)?,
        Format::Json => json_sheet(sheet)?,
        #[cfg(feature = "parquet")]
        Format::Parquet => self::parquet::parquet(sheet)?,
        #[cfg(not(feature = "parquet"))]
        Format::Parquet => {
            let reason =
                "this program was built without it: cargo build --release --features parquet".to_owned();
            return Err(ArchiveError::Encoding { what: "Parquet".to_owned(), reason });
        }
    };
    write_whole(path, &bytes)
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
    let failed = |source| ArchiveError::Io { action: "write", path: path.to_owned(), source };
    // A pipe or a terminal is written to, not replaced.
    if path.metadata().is_ok_and(|about| !about.is_file()) {
        return std::fs::write(path, bytes).map_err(failed);
    }
    let mut beside = path.as_os_str().to_owned();
    beside.push(".exporting");
    let beside = PathBuf::from(beside);
    let mut file = Disk.open(&beside, Opening::Emptied).map_err(failed)?;
    let written = file.write_at(0, bytes).and_then(|()| file.sync());
    drop(file);
    let moved = written.and_then(|()| Disk.rename(&beside, path));
    if let Err(source) = moved {
        // The first failure is the one to report.
        let _ = Disk.remove(&beside);
        return Err(failed(source));
    }
    Disk.sync_folder(path).map_err(failed)
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
