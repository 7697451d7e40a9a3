//! Writing an archive: frames in completion order while the run lasts, then the sorted whole.

use std::path::{Path, PathBuf};

use super::claim::{Held, Left, claim, set_aside, with_suffix};
use super::compare::compare_bits;
use super::encoding::{Sections, sections, snapshot_sections};
use super::error::ArchiveError;
use super::layout::{Digest, Kind, START_LENGTH, start_bytes};
use super::model::{RunHeader, Snapshot};
use super::reader::Archive;
use super::resume::{another_run, changed, says_nothing_new};
use super::storage::{Disk, Storage};
use super::stored::Sweep;
use super::sweep::{Share, SnapshotPlace, point_of_name};
use super::whole;

mod points;

/// The name under which an archive stands while it is being written: `NAME.epiloom.unfinished`.
pub fn unfinished_path(path: &Path) -> PathBuf {
    with_suffix(path, ".unfinished")
}

/// One snapshot that stands in the unfinished file.
#[derive(Debug)]
pub(crate) struct Written {
    pub place: SnapshotPlace,
    /// Whether this run has stored it, or found it as it would store it.
    pub current: bool,
}

/// One sweep that stands in the unfinished file.
#[derive(Debug)]
pub(crate) struct WrittenSweep {
    pub sweep: Sweep,
    /// Whether this run has begun it.
    pub current: bool,
}

/// What became of the unfinished file of an earlier run.
#[derive(Clone, Debug, PartialEq, Eq)]
pub enum Earlier {
    /// It was renamed, and why.
    SetAside {
        /// Where it is now.
        path: PathBuf,
        /// Why it could not be gone on with.
        why: String,
    },
    /// This run goes on with it.
    TakenOver {
        /// How many snapshots it holds.
        snapshots: usize,
        /// How many points of sweeps it holds.
        points: u64,
    },
}

/// An archive being written.
///
/// A snapshot that [`append`](Writer::append) has accepted survives a kill of the process at once, and a
/// power cut from the next sync on: after every append, or after every `n` (see
/// [`sync_every`](Writer::sync_every)), so that a power cut loses at most the last `n - 1` snapshots.
/// Points that [`append_points`](Writer::append_points) has accepted survive both.
/// Dropping the writer keeps the unfinished file.
#[derive(Debug)]
pub struct Writer<'a> {
    storage: &'a dyn Storage,
    pub(crate) path: PathBuf,
    pub(crate) unfinished: PathBuf,
    held: Held,
    length: u64,
    ordinal: u64,
    run: Digest,
    /// As it stands in the unfinished file.
    pub(crate) run_header: RunHeader,
    /// As this run knows it so far.
    known: RunHeader,
    share: Option<Share>,
    written: Vec<Written>,
    sweeps: Vec<WrittenSweep>,
    /// What an earlier run has left, until it is known whether this is the same run.
    undecided: Option<Box<Archive>>,
    /// The same once this run goes on with it.
    taken_over: Option<Box<Archive>>,
    sync_every: u32,
    unsynced: u32,
    broken: bool,
    earlier: Option<Earlier>,
}

impl Writer<'static> {
    /// Begins the archive that will stand at `path`, in the locked file beside it.
    ///
    /// An unfinished file of an earlier run that holds anything is renamed, never overwritten; see
    /// [`earlier`](Writer::earlier).
    ///
    /// # Errors
    /// [`ArchiveError::HeldByAnotherRun`] while another run writes there, [`ArchiveError::Io`].
    pub fn create(path: &Path, header: &RunHeader) -> Result<Self, ArchiveError> {
        no_folder(path)?;
        Writer::create_in(&Disk, path, header)
    }

    /// As [`create`](Writer::create), but goes on with the unfinished file of an earlier run where that was the
    /// same run: script, version, tolerances, share, inputs and data files. The last two are compared when
    /// something is first stored, when they are known; until then nothing is written or renamed.
    ///
    /// # Errors
    /// As [`create`](Writer::create).
    pub fn resume(path: &Path, header: &RunHeader, share: Option<Share>) -> Result<Self, ArchiveError> {
        no_folder(path)?;
        Writer::resume_in(&Disk, path, header, share)
    }
}

/// Known now rather than when the run is over.
fn no_folder(path: &Path) -> Result<(), ArchiveError> {
    if path.is_dir() {
        let source = std::io::ErrorKind::IsADirectory.into();
        return Err(ArchiveError::Io { action: "write", path: path.to_owned(), source });
    }
    Ok(())
}

impl<'a> Writer<'a> {
    /// As [`create`](Writer::create), with the file operations of that storage.
    ///
    /// # Errors
    /// As [`create`](Writer::create).
    pub fn create_in(
        storage: &'a dyn Storage,
        path: &Path,
        header: &RunHeader,
    ) -> Result<Self, ArchiveError> {
        let mut writer = Writer::resume_in(storage, path, header, None)?;
        if writer.undecided.take().is_some() {
            writer.start_beside("this run begins anew".to_owned())?;
        }
        Ok(writer)
    }

    /// As [`resume`](Writer::resume), with the file operations of that storage.
    ///
    /// # Errors
    /// As [`resume`](Writer::resume).
    pub fn resume_in(
        storage: &'a dyn Storage,
        path: &Path,
        header: &RunHeader,
        share: Option<Share>,
    ) -> Result<Self, ArchiveError> {
        let unfinished = unfinished_path(path);
        let first = sections(Kind::Run, "the description of the run", header)?;
        let (held, left) = claim(storage, &unfinished)?;
        let mut writer = Writer {
            storage,
            path: path.to_owned(),
            unfinished,
            held,
            length: 0,
            ordinal: 0,
            run: first.body_digest(),
            run_header: header.clone(),
            known: header.clone(),
            share,
            written: Vec::new(),
            sweeps: Vec::new(),
            undecided: None,
            taken_over: None,
            sync_every: 1,
            unsynced: 0,
            broken: false,
            earlier: None,
        };
        match left {
            Left::Nothing => writer.start()?,
            Left::Other(why) => writer.start_beside(why)?,
            Left::Archive(archive) => match another_run(&archive, header, share) {
                Some(why) => writer.start_beside(why)?,
                None => writer.undecided = Some(archive),
            },
        }
        Ok(writer)
    }

    /// Empties the file and writes the description of the run.
    fn start(&mut self) -> Result<(), ArchiveError> {
        let first = sections(Kind::Run, "the description of the run", &self.known)?;
        self.run = first.body_digest();
        self.run_header = self.known.clone();
        let start = start_bytes();
        let emptied = self.held.file().cut(0);
        emptied.map_err(|source| self.io("empty", source))?;
        let written = self.held.file().write_at(0, &start);
        written.map_err(|source| self.io("write", source))?;
        self.length = START_LENGTH as u64;
        self.ordinal = 0;
        self.append_frame(&first)?;
        self.sync()?;
        self.storage.sync_folder(&self.unfinished).map_err(|source| self.io("sync the folder of", source))
    }

    /// Renames what is there and begins a new file.
    fn start_beside(&mut self, why: String) -> Result<(), ArchiveError> {
        let path = set_aside(self.storage, &self.unfinished)?;
        self.earlier = Some(Earlier::SetAside { path, why });
        let (held, left) = claim(self.storage, &self.unfinished)?;
        self.held = held;
        match left {
            Left::Nothing => self.start(),
            // Another run has claimed the name in between and stored something already.
            _ => Err(ArchiveError::HeldByAnotherRun { path: self.unfinished.clone() }),
        }
    }

    /// Settles whether the earlier run was this one, now that something is to be stored.
    fn settle(&mut self) -> Result<(), ArchiveError> {
        let Some(left) = self.undecided.take() else { return Ok(()) };
        if let Some(why) = another_run(&left, &self.known, self.share) {
            return self.start_beside(why);
        }
        let (end, ordinal) = left.end;
        let cut = self.held.file().cut(end);
        cut.map_err(|source| self.io("cut off the torn end of", source))?;
        self.length = end;
        self.ordinal = ordinal;
        // Both are there, or it would be another run.
        self.run = left.run_digest().unwrap_or(self.run);
        self.run_header = left.run()?.clone();
        // What a killed run has written but not synced counts as stored from here on.
        self.sync()?;
        self.written = left
            .entries()
            .iter()
            .map(|entry| Written {
                place: SnapshotPlace {
                    label: entry.label.clone(),
                    offset: entry.offset,
                    length: entry.length,
                    header_digest: entry.header_digest,
                },
                current: false,
            })
            .collect();
        self.sweeps =
            left.sweeps().iter().map(|sweep| WrittenSweep { sweep: sweep.clone(), current: false }).collect();
        self.earlier = Some(Earlier::TakenOver {
            snapshots: self.written.len(),
            points: left.sweeps().iter().map(Sweep::count).sum(),
        });
        self.taken_over = Some(left);
        Ok(())
    }

    /// Syncs after every `snapshots` appends (at least 1) instead of after each.
    pub fn sync_every(mut self, snapshots: u32) -> Self {
        self.sync_every = snapshots.max(1);
        self
    }

    /// What became of the unfinished file of an earlier run, as far as that is settled.
    pub fn earlier(&self) -> Option<&Earlier> {
        self.earlier.as_ref()
    }

    /// The file that is being written.
    pub fn unfinished(&self) -> &Path {
        &self.unfinished
    }

    /// How many snapshots this run has stored, those of points not counted.
    pub fn count(&self) -> usize {
        self.written.iter().filter(|written| written.current).count()
    }

    /// Whether this run has stored anything, or an earlier one whose file is kept.
    pub fn holds_anything(&self) -> bool {
        self.undecided.is_some()
            || !self.written.is_empty()
            || self.sweeps.iter().any(|each| each.current || each.sweep.count() > 0)
    }

    /// How many points of sweeps stand in the file.
    pub fn points(&self) -> u64 {
        let left = self.undecided.iter().flat_map(|archive| archive.sweeps()).map(Sweep::count);
        self.sweeps.iter().map(|each| each.sweep.count()).chain(left).sum()
    }

    /// Replaces the description of the run, which grows as the script declares inputs and reads data.
    ///
    /// Writes nothing when it says nothing new.
    ///
    /// # Errors
    /// [`ArchiveError::NotAsStored`] where it contradicts that of the earlier run whose file is gone on with, and as
    /// [`append`](Writer::append).
    pub fn update_run(&mut self, header: &RunHeader) -> Result<(), ArchiveError> {
        self.known = header.clone();
        if self.undecided.is_some() {
            return self.settle();
        }
        if self.taken_over.is_some() {
            if let Some(place) = changed(&self.run_header, header) {
                return Err(ArchiveError::NotAsStored { name: header.script_name.clone(), place });
            }
            // It may well say more, which the script has not come to yet.
            if says_nothing_new(&self.run_header, header) {
                return Ok(());
            }
        }
        if self.run_header == *header {
            return Ok(());
        }
        let made = sections(Kind::Run, "the description of the run", header)?;
        self.append_frame(&made)?;
        self.run_header = header.clone();
        Ok(())
    }

    /// Whether this run has used the name.
    fn name_taken(&self, name: &str) -> bool {
        let sweep_of_point = point_of_name(name).map(|(sweep, ..)| sweep);
        self.written.iter().any(|each| each.current && each.place.label.name == name)
            || self.sweeps.iter().filter(|each| each.current).any(|each| {
                each.sweep.name == name || sweep_of_point.is_some_and(|sweep| sweep == each.sweep.name)
            })
    }

    /// Stores one snapshot. One that an earlier run has stored, whose file is gone on with, must be the same to the
    /// last bit, and is not written again.
    ///
    /// # Errors
    /// [`ArchiveError::NameTaken`], [`ArchiveError::RaggedTable`], [`ArchiveError::TooLarge`] and
    /// [`ArchiveError::NotAsStored`] leave the archive as it was; so does [`ArchiveError::Io`] where the
    /// half-written frame could be cut off again. Where it could not, and after a failed sync, every later call is
    /// [`ArchiveError::WriterBroken`]; what was stored before stays readable in the unfinished file.
    pub fn append(&mut self, snapshot: &Snapshot) -> Result<(), ArchiveError> {
        self.check()?;
        self.settle()?;
        let name = snapshot.name();
        if self.name_taken(name) {
            return Err(ArchiveError::NameTaken { name: name.to_owned() });
        }
        let made = snapshot_sections(snapshot)?;
        if let Some(at) = self.written.iter().position(|each| each.place.label.name == name) {
            let stored = match &self.taken_over {
                Some(left) => left.point_snapshot(&self.written[at].place),
                None => Err(ArchiveError::DamagedRun),
            };
            match stored {
                Ok(stored) => {
                    if let Some(difference) = compare_bits(&stored, snapshot).into_iter().next() {
                        let place = format!(
                            "{}: then {}, now {}",
                            difference.place, difference.first, difference.second
                        );
                        return Err(ArchiveError::NotAsStored { name: name.to_owned(), place });
                    }
                    self.written[at].current = true;
                    return Ok(());
                }
                // Damaged there: it is stored again.
                Err(_) => drop(self.written.remove(at)),
            }
        }
        let offset = self.length;
        let header_digest = self.append_frame(&made)?;
        let place = SnapshotPlace {
            label: snapshot.label.clone(),
            offset,
            length: self.length - offset,
            header_digest,
        };
        self.written.push(Written { place, current: true });
        self.unsynced += 1;
        if self.unsynced >= self.sync_every { self.sync() } else { Ok(()) }
    }

    /// Makes everything stored so far survive a power cut.
    ///
    /// # Errors
    /// [`ArchiveError::Io`]; the writer is broken afterwards, since what a failed sync has kept is unknown.
    pub fn sync(&mut self) -> Result<(), ArchiveError> {
        self.check()?;
        let synced = self.held.file().sync();
        if let Err(source) = synced {
            self.broken = true;
            return Err(self.io("sync", source));
        }
        self.unsynced = 0;
        Ok(())
    }

    /// Syncs, closes and keeps the unfinished file, and says where it is.
    ///
    /// # Errors
    /// As [`sync`](Writer::sync); the file is kept all the same.
    pub fn abandon(mut self) -> Result<PathBuf, ArchiveError> {
        self.sync()?;
        Ok(self.unfinished)
    }

    /// Removes the unfinished file of a run that stored nothing. What an earlier run has stored there is kept.
    ///
    /// # Errors
    /// [`ArchiveError::Io`]; the next run takes the file over.
    pub fn discard(self) -> Result<(), ArchiveError> {
        if self.holds_anything() {
            return Ok(());
        }
        self.storage.remove(&self.unfinished).map_err(|source| self.io("remove", source))
    }

    /// Writes the whole in order beside the unfinished file, syncs it, renames it to its name, syncs the
    /// folder and removes the unfinished file. An archive of that name is replaced.
    ///
    /// Should the unfinished file refuse to be removed, it is left: the archive is whole without that.
    ///
    /// # Errors
    /// [`ArchiveError::Io`], [`ArchiveError::DamagedSnapshot`] and [`ArchiveError::DamagedPoints`] when the
    /// unfinished file no longer holds what was written. The unfinished file is kept whatever fails.
    pub fn finish(mut self, header: &RunHeader) -> Result<PathBuf, ArchiveError> {
        self.check()?;
        self.update_run(header)?;
        self.settle()?;
        self.sync()?;
        let parts = whole::Parts {
            source: self.held.source().map_err(|source| self.io("read", source))?,
            path: &self.unfinished,
            run: self.run,
            header,
            snapshots: self.written.iter().filter(|each| each.current).map(|each| &each.place).collect(),
            sweeps: self.sweeps.iter().filter(|each| each.current).map(|each| &each.sweep).collect(),
        };
        whole::write(self.storage, &parts, &self.path)?;
        drop(parts);
        let Writer { storage, path, unfinished, held, taken_over, .. } = self;
        drop(taken_over);
        if cfg!(unix) {
            // Removed while the lock is held, so that no other run can have claimed it in between.
            let _ = storage.remove(&unfinished);
            drop(held);
        } else {
            drop(held);
            let _ = storage.remove(&unfinished);
        }
        Ok(path)
    }

    fn check(&self) -> Result<(), ArchiveError> {
        if self.broken { Err(ArchiveError::WriterBroken { path: self.unfinished.clone() }) } else { Ok(()) }
    }

    fn io(&self, action: &'static str, source: std::io::Error) -> ArchiveError {
        ArchiveError::Io { action, path: self.unfinished.clone(), source }
    }

    /// Appends bytes; on a failed write cuts what was half written, or breaks.
    fn put(&mut self, bytes: &[u8]) -> Result<(), ArchiveError> {
        self.check()?;
        let written = self.held.file().write_at(self.length, bytes);
        if let Err(source) = written {
            self.broken = self.held.file().cut(self.length).is_err();
            return Err(self.io("write", source));
        }
        self.length += bytes.len() as u64;
        Ok(())
    }

    /// Appends one frame; the digest of its header.
    fn append_frame(&mut self, made: &Sections) -> Result<Digest, ArchiveError> {
        let header = made.header(self.ordinal, self.run);
        self.put(&made.frame(&header))?;
        self.ordinal += 1;
        Ok(header.own_digest())
    }
}
