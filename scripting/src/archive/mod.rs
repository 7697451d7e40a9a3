//! The archive: one file that holds one run, for whoever stores, shows, exports or replays results.
//!
//! Knows neither the script language nor the command line nor the solver. `FORMAT.md` beside this crate
//! describes the file to the byte.
//!
//! ```no_run
//! use epiloom::archive::{Archive, RunHeader, Snapshot, Writer};
//! # fn example(run: &RunHeader, snapshot: &Snapshot) -> Result<(), epiloom::archive::ArchiveError> {
//! let path = std::path::Path::new("window_and_bsf.epiloom");
//! let mut writer = Writer::create(path, run)?;
//! writer.append(snapshot)?;
//! writer.finish(run)?;
//! let again = Archive::open(path)?.snapshot(snapshot.name())?;
//! # Ok(()) }
//! ```

#[macro_use]
mod model;
mod blocks;
mod claim;
mod compare;
mod encoding;
mod error;
pub mod export;
mod frames;
mod gather;
mod layout;
mod reader;
mod resume;
mod scan;
pub mod storage;
mod stored;
mod sweep;
mod whole;
mod writer;

#[cfg(test)]
mod tests;

pub use compare::{Difference, compare_bits, compare_point};
pub use error::{ArchiveError, ArchiveWarning};
pub use gather::{NotParts, Parts};
pub use model::{
    Column, Condition, DataFile, Figure, Input, Label, Layer, Ledger, LedgerLine, MaterialValue, MeshValue,
    OrderKey, RunHeader, Snapshot, Stack, Status, Table, Value,
};
pub use reader::{Archive, Entry};
pub use resume::EarlierPoints;
pub use stored::{Points, Sweep};
pub use sweep::{
    Cell, Point, PointOutput, Share, SnapshotPlace, StoredPoint, SweepColumn, SweepRecord, SweepStart,
    point_of_name, point_snapshot_name,
};
pub use writer::{Earlier, Writer, unfinished_path};
