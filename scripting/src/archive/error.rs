//! What can go wrong with an archive, and what a reader warns of, for whoever shows it to a person.

use std::path::PathBuf;

use thiserror::Error;

use super::blocks::BlockLabel;

/// Why an archive could not be written or read.
#[derive(Debug, Error)]
#[non_exhaustive]
pub enum ArchiveError {
    /// The file system refused.
    #[error("cannot {action} `{}`: {source}", path.display())]
    Io {
        /// What was tried.
        action: &'static str,
        /// On which file.
        path: PathBuf,
        /// What the system said.
        source: std::io::Error,
    },
    /// The file does not begin as an archive does.
    #[error("`{}` is not an Epiloom archive", path.display())]
    Foreign {
        /// The file.
        path: PathBuf,
    },
    /// A part was written by a later version of the program.
    #[error("{part} has format {found}, and this program reads up to {known}")]
    Newer {
        /// The file or the frame.
        part: String,
        /// The number found.
        found: u32,
        /// The highest number that this program reads.
        known: u32,
    },
    /// The first bytes of the file are damaged.
    #[error("the first 32 bytes of `{}` are damaged", path.display())]
    DamagedStart {
        /// The file.
        path: PathBuf,
    },
    /// A file cut off before the end of its first frame.
    #[error("`{}` is cut off after {length} bytes, before its first whole frame", path.display())]
    NoWholeFrame {
        /// The file.
        path: PathBuf,
        /// Its length in bytes.
        length: u64,
    },
    /// A frame whose bytes are not those that were written.
    #[error("snapshot `{name}` is damaged (frame at byte {offset})")]
    DamagedSnapshot {
        /// Name of the snapshot.
        name: String,
        /// Where its frame begins.
        offset: u64,
    },
    /// A block of points whose bytes are not those that were written.
    #[error("points {first} to {last} of the sweep `{sweep}` are damaged (frame at byte {offset})")]
    DamagedPoints {
        /// Name of the sweep.
        sweep: String,
        /// Index of the first point of the block.
        first: u64,
        /// Index of its last point.
        last: u64,
        /// Where its frame begins.
        offset: u64,
    },
    /// No sweep has that name.
    #[error("no sweep is called `{name}`")]
    NoSuchSweep {
        /// The name asked for.
        name: String,
        /// The sweeps that there are.
        there: Vec<String>,
    },
    /// The sweep does not hold that point.
    #[error("the sweep `{sweep}` holds no point {index}{}", points.map(|points| format!(": its plan has {points}, counted from 0")).unwrap_or_default())]
    NoSuchPoint {
        /// Name of the sweep.
        sweep: String,
        /// The point asked for.
        index: u64,
        /// How many points the plan has.
        points: Option<u64>,
    },
    /// What a script stores is not what the earlier run of the same script stored under that name.
    #[error(
        "`{name}` came out differently from what the unfinished archive of the earlier run holds: {place}"
    )]
    NotAsStored {
        /// Name of the snapshot or the sweep.
        name: String,
        /// The first place where they differ.
        place: String,
    },
    /// The description of the run is damaged or missing.
    #[error("the description of the run (script, inputs, version) is damaged or missing")]
    DamagedRun,
    /// No snapshot has that name.
    #[error("no snapshot is called `{name}`")]
    NoSuchSnapshot {
        /// The name asked for.
        name: String,
        /// The nearest names, best first.
        near: Vec<String>,
    },
    /// No snapshot has that number.
    #[error("there is no snapshot number {index}: the archive holds {count}, counted from 0")]
    NoSuchIndex {
        /// The number asked for.
        index: usize,
        /// How many there are.
        count: usize,
    },
    /// Another run is writing the same archive.
    #[error("another run is writing `{}`", path.display())]
    HeldByAnotherRun {
        /// The locked unfinished file.
        path: PathBuf,
    },
    /// Two snapshots of one archive may not share a name.
    #[error("a snapshot called `{name}` is already stored")]
    NameTaken {
        /// The name.
        name: String,
    },
    /// The columns of a table differ in length.
    #[error("column `{column}` of table `{table}` holds {found} numbers where the table has {expected} rows")]
    RaggedTable {
        /// The table.
        table: String,
        /// The column.
        column: String,
        /// The length of the column.
        found: u64,
        /// The rows of the table.
        expected: u64,
    },
    /// Something is larger than the format allows.
    #[error("{what} takes {bytes} bytes; the format allows {limit}")]
    TooLarge {
        /// What is too large.
        what: String,
        /// Its size in bytes.
        bytes: u64,
        /// The limit in bytes.
        limit: u64,
    },
    /// Nothing more can be written since an earlier write failed.
    #[error("nothing more can be written to `{}`: an earlier write or sync failed", path.display())]
    WriterBroken {
        /// The unfinished file.
        path: PathBuf,
    },
    /// A record could not be put into bytes.
    #[error("cannot encode {what}: {reason}")]
    Encoding {
        /// What was being encoded.
        what: String,
        /// What the encoder said.
        reason: String,
    },
}

impl ArchiveError {
    /// A sentence that tells the person how to mend it, where there is one.
    pub fn help(&self) -> Option<String> {
        let text = match self {
            ArchiveError::NoSuchSnapshot { near, .. } if !near.is_empty() => {
                let names: Vec<String> = near.iter().map(|name| format!("`{name}`")).collect();
                format!("did you mean {}?", names.join(" or "))
            }
            ArchiveError::NoSuchSnapshot { .. } => "`epiloom show FILE` lists the snapshots".to_owned(),
            ArchiveError::NoSuchSweep { there, .. } if there.is_empty() => {
                "the archive holds no sweep".to_owned()
            }
            ArchiveError::NoSuchSweep { there, .. } => {
                let names: Vec<String> = there.iter().map(|name| format!("`{name}`")).collect();
                format!("there is {}", names.join(" and "))
            }
            ArchiveError::NotAsStored { .. } => {
                "begin anew with --anew, which sets the unfinished archive aside".to_owned()
            }
            ArchiveError::DamagedPoints { .. } => {
                "all other points are still readable; run the script again to get these back".to_owned()
            }
            ArchiveError::Newer { .. } => {
                "read it with the version of Epiloom that wrote it, or a later one".to_owned()
            }
            ArchiveError::HeldByAnotherRun { .. } => {
                "wait until it has finished, or give this run another file with --out".to_owned()
            }
            ArchiveError::NameTaken { .. } => "give each stored snapshot its own name".to_owned(),
            ArchiveError::Foreign { .. } => {
                "give a file that `epiloom run` wrote, ending in .epiloom or .epiloom.unfinished".to_owned()
            }
            ArchiveError::DamagedSnapshot { .. } => {
                "its neighbours are still readable; run the script again to get this one back".to_owned()
            }
            ArchiveError::DamagedStart { .. }
            | ArchiveError::DamagedRun
            | ArchiveError::NoWholeFrame { .. } => "run the script again".to_owned(),
            ArchiveError::WriterBroken { path } => {
                format!(
                    "free space or mend the folder; the snapshots stored so far are in `{}`",
                    path.display()
                )
            }
            _ => return None,
        };
        Some(text)
    }
}

/// What a reader found amiss in an archive that it could nevertheless open.
#[derive(Clone, Debug, Error, PartialEq, Eq)]
#[non_exhaustive]
pub enum ArchiveWarning {
    /// The file was never finished, or its end is gone.
    #[error("the archive is not finished: it holds {snapshots} whole snapshot{}{}", if *snapshots == 1 { "" } else { "s" }, if *points == 0 { String::new() } else { format!(" and {points} points of sweeps") })]
    NotFinished {
        /// How many whole snapshots there are.
        snapshots: usize,
        /// How many points of sweeps.
        points: u64,
    },
    /// Bytes at the end that make no whole frame.
    #[error(
        "cut off: {bytes} bytes from byte {offset} on make no whole frame; {whole_frames} whole frames precede them"
    )]
    TornTail {
        /// Where they begin.
        offset: u64,
        /// How many there are.
        bytes: u64,
        /// How many whole frames precede them.
        whole_frames: usize,
    },
    /// A snapshot whose frame is damaged.
    #[error("snapshot `{name}` is damaged (frame at byte {offset})")]
    DamagedSnapshot {
        /// Its name.
        name: String,
        /// Where its frame begins.
        offset: u64,
    },
    /// A block of points whose frame is damaged.
    #[error("points {first} to {last} of the sweep `{sweep}` are damaged (frame at byte {offset})")]
    DamagedPoints {
        /// Name of the sweep.
        sweep: String,
        /// Index of the first point of the block.
        first: u64,
        /// Index of its last point.
        last: u64,
        /// Where it begins.
        offset: u64,
    },
    /// The description of a sweep is damaged.
    #[error("the description of the sweep `{name}` is damaged (frame at byte {offset})")]
    DamagedSweep {
        /// Name of the sweep.
        name: String,
        /// Where its frame begins.
        offset: u64,
    },
    /// Damaged bytes between frames whose owner cannot be told.
    #[error("{bytes} bytes from byte {offset} on are damaged{}", after.as_ref().map(|name| format!(" (after snapshot `{name}`)")).unwrap_or_default())]
    DamagedBytes {
        /// Where they begin.
        offset: u64,
        /// How many there are.
        bytes: u64,
        /// The last whole snapshot before them.
        after: Option<String>,
    },
    /// Frames that the numbering says were there are not.
    #[error("{count} frames are missing before byte {offset}")]
    MissingFrames {
        /// How many.
        count: u64,
        /// Where the next frame begins.
        offset: u64,
    },
    /// The description of the run is damaged.
    #[error("the description of the run (script, inputs, version) is damaged")]
    DamagedRun,
    /// The index of a finished archive is damaged; the snapshots were found by reading through.
    #[error("the index is damaged; the snapshots were found by reading through the file")]
    DamagedIndex,
}

impl ArchiveWarning {
    /// The warning for a damaged block of that label.
    pub(crate) fn damaged_points(label: &BlockLabel, offset: u64) -> Self {
        let BlockLabel { sweep, first, last, .. } = label.clone();
        ArchiveWarning::DamagedPoints { sweep, first, last, offset }
    }
}
