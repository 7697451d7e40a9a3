//! What a page is made from: an archive read whole, with what is damaged in it by name.

use crate::archive::{Archive, ArchiveWarning, Label, RunHeader, Snapshot, Status};

use super::sweeps::HeldSweep;

/// An archive for a page.
#[derive(Clone, Debug, Default)]
pub struct Contents {
    /// Name of the file, without its folder.
    pub file: String,
    /// The description of the run; none where it is damaged.
    pub run: Option<RunHeader>,
    /// The snapshots in the order of the archive.
    pub snapshots: Vec<Held>,
    /// The sweeps, by their step.
    pub sweeps: Vec<HeldSweep>,
    /// The snapshots that the points of sweeps stored.
    pub inner: Vec<Held>,
    /// Whether the run has ended well.
    pub finished: bool,
    /// What is amiss in the file, in words.
    pub troubles: Vec<String>,
}

/// A snapshot, or what is left of it.
#[derive(Clone, Debug)]
pub enum Held {
    /// It is whole.
    Whole(Box<Snapshot>),
    /// It cannot be read.
    Damaged {
        /// What the listing says of it.
        label: Label,
        /// What is wrong.
        reason: String,
    },
}

impl Held {
    /// Its label.
    pub fn label(&self) -> &Label {
        match self {
            Held::Whole(snapshot) => &snapshot.label,
            Held::Damaged { label, .. } => label,
        }
    }

    /// Whether it holds a solution.
    pub fn status(&self) -> Status {
        self.label().status.clone()
    }

    /// The snapshot, where it is whole.
    pub fn snapshot(&self) -> Option<&Snapshot> {
        match self {
            Held::Whole(snapshot) => Some(snapshot),
            Held::Damaged { .. } => None,
        }
    }
}

impl Contents {
    /// Reads an archive whole. `file` is its name as a person will look for it.
    pub fn of(archive: &Archive, file: &str) -> Contents {
        let snapshots =
            archive.entries().iter().enumerate().map(|(index, entry)| match archive.snapshot_at(index) {
                Ok(snapshot) => Held::Whole(Box::new(snapshot)),
                Err(error) => Held::Damaged { label: entry.label.clone(), reason: error.to_string() },
            });
        // that the run has not ended is said once, in the page's own words
        let amiss = |warning: &&ArchiveWarning| !matches!(warning, ArchiveWarning::NotFinished { .. });
        let mut inner = Vec::new();
        let sweeps = archive.sweeps().iter().map(|sweep| HeldSweep::of(archive, sweep, &mut inner)).collect();
        Contents {
            file: file.to_string(),
            run: archive.run().ok().cloned(),
            snapshots: snapshots.collect(),
            sweeps,
            inner,
            finished: archive.is_finished(),
            troubles: archive.warnings().iter().filter(amiss).map(ToString::to_string).collect(),
        }
    }

    /// The snapshots that are whole, without those of points.
    pub fn whole(&self) -> impl Iterator<Item = &Snapshot> {
        self.snapshots.iter().filter_map(Held::snapshot)
    }

    /// What could not be read, in words.
    pub fn damage(&self) -> Vec<&str> {
        let damaged = self.snapshots.iter().chain(&self.inner).filter_map(|held| match held {
            Held::Whole(_) => None,
            Held::Damaged { reason, .. } => Some(reason.as_str()),
        });
        damaged
            .chain(self.sweeps.iter().flat_map(|sweep| sweep.troubles.iter().map(String::as_str)))
            .collect()
    }
}
