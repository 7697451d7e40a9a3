//! Writing an archive: frames in completion order while the run lasts, then the sorted whole.

use std::collections::BTreeSet;
use std::ffi::OsString;
use std::path::{Path, PathBuf};

use super::encoding::{Index, IndexEntry, Sections, sections, snapshot_sections};
use super::error::ArchiveError;
use super::layout::{
    Digest, FOOTER_LENGTH, Footer, HEADER_LENGTH, Header, Kind, START_LENGTH, digest, start_bytes,
};
use super::model::{Label, RunHeader, Snapshot};
use super::reader::Archive;
use super::storage::{Disk, Opening, Storage, StoredFile};

/// The name under which an archive stands while it is being written: `NAME.epiloom.unfinished`.
pub fn unfinished_path(path: &Path) -> PathBuf {
    with_suffix(path, ".unfinished")
}

fn with_suffix(path: &Path, suffix: &str) -> PathBuf {
    let mut name: OsString = path.as_os_str().to_owned();
    name.push(suffix);
    PathBuf::from(name)
}

/// One snapshot that stands in the unfinished file.
#[derive(Debug)]
struct Written {
    label: Label,
    offset: u64,
    header: Header,
    length: u64,
}

/// An archive being written.
///
/// A snapshot that [`append`](Writer::append) has accepted survives a kill of the process at once, and a
/// power cut from the next sync on: after every append, or after every `n` (see
/// [`sync_every`](Writer::sync_every)), so that a power cut loses at most the last `n - 1` snapshots.
/// Dropping the writer keeps the unfinished file.
#[derive(Debug)]
pub struct Writer<'a> {
    storage: &'a dyn Storage,
    path: PathBuf,
    unfinished: PathBuf,
    file: Box<dyn StoredFile>,
    length: u64,
    ordinal: u64,
    run: Digest,
    run_header: RunHeader,
    written: Vec<Written>,
    names: BTreeSet<String>,
    sync_every: u32,
    unsynced: u32,
    broken: bool,
    set_aside: Option<PathBuf>,
}

impl Writer<'static> {
    /// Begins the archive that will stand at `path`, in the locked file beside it.
    ///
    /// An unfinished file of an earlier run that holds snapshots is renamed, never overwritten; see
    /// [`set_aside`](Writer::set_aside).
    ///
    /// # Errors
    /// [`ArchiveError::HeldByAnotherRun`] while another run writes there, [`ArchiveError::Io`].
    pub fn create(path: &Path, header: &RunHeader) -> Result<Self, ArchiveError> {
        if path.is_dir() {
            // Known now rather than when the run is over.
            let source = std::io::ErrorKind::IsADirectory.into();
            return Err(ArchiveError::Io { action: "write", path: path.to_owned(), source });
        }
        Writer::create_in(&Disk, path, header)
    }
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
        let unfinished = unfinished_path(path);
        let first = sections(Kind::Run, "the description of the run", header)?;
        let run = first.body_digest();
        let (file, set_aside) = claim(storage, &unfinished)?;
        let mut writer = Writer {
            storage,
            path: path.to_owned(),
            unfinished,
            file,
            length: 0,
            ordinal: 0,
            run,
            run_header: header.clone(),
            written: Vec::new(),
            names: BTreeSet::new(),
            sync_every: 1,
            unsynced: 0,
            broken: false,
            set_aside,
        };
        writer.file.cut(0).map_err(|source| writer.io("empty", source))?;
        let start = start_bytes();
        writer.file.write_at(0, &start).map_err(|source| writer.io("write", source))?;
        writer.length = START_LENGTH as u64;
        writer.append_frame(&first)?;
        writer.sync()?;
        writer
            .storage
            .sync_folder(&writer.unfinished)
            .map_err(|source| writer.io("sync the folder of", source))?;
        Ok(writer)
    }

    /// Syncs after every `snapshots` appends (at least 1) instead of after each.
    pub fn sync_every(mut self, snapshots: u32) -> Self {
        self.sync_every = snapshots.max(1);
        self
    }

    /// Where the unfinished file of an earlier run was moved to, if there was one.
    pub fn set_aside(&self) -> Option<&Path> {
        self.set_aside.as_deref()
    }

    /// The file that is being written.
    pub fn unfinished(&self) -> &Path {
        &self.unfinished
    }

    /// How many snapshots are stored.
    pub fn count(&self) -> usize {
        self.written.len()
    }

    /// Whether a snapshot of that name is stored.
    pub fn contains(&self, name: &str) -> bool {
        self.names.contains(name)
    }

    /// Replaces the description of the run, which grows as the script declares inputs and reads data.
    ///
    /// Writes nothing when it is the same as before.
    ///
    /// # Errors
    /// As [`append`](Writer::append).
    pub fn update_run(&mut self, header: &RunHeader) -> Result<(), ArchiveError> {
        if self.run_header == *header {
            return Ok(());
        }
        let made = sections(Kind::Run, "the description of the run", header)?;
        self.append_frame(&made)?;
        self.run_header = header.clone();
        Ok(())
    }

    /// Stores one snapshot.
    ///
    /// # Errors
    /// [`ArchiveError::NameTaken`], [`ArchiveError::RaggedTable`] and [`ArchiveError::TooLarge`] leave the
    /// archive as it was; so does [`ArchiveError::Io`] where the half-written frame could be cut off again.
    /// Where it could not, and after a failed sync, every later call is [`ArchiveError::WriterBroken`]; the
    /// snapshots stored before stay readable in the unfinished file.
    pub fn append(&mut self, snapshot: &Snapshot) -> Result<(), ArchiveError> {
        self.check()?;
        if self.names.contains(snapshot.name()) {
            return Err(ArchiveError::NameTaken { name: snapshot.name().to_owned() });
        }
        let made = snapshot_sections(snapshot)?;
        let offset = self.length;
        let header = self.append_frame(&made)?;
        let length = self.length - offset;
        self.written.push(Written { label: snapshot.label.clone(), offset, header, length });
        self.names.insert(snapshot.name().to_owned());
        self.unsynced += 1;
        if self.unsynced >= self.sync_every { self.sync() } else { Ok(()) }
    }

    /// Makes every snapshot stored so far survive a power cut.
    ///
    /// # Errors
    /// [`ArchiveError::Io`]; the writer is broken afterwards, since what a failed sync has kept is unknown.
    pub fn sync(&mut self) -> Result<(), ArchiveError> {
        self.check()?;
        if let Err(source) = self.file.sync() {
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

    /// Writes the whole in order beside the unfinished file, syncs it, renames it to its name, syncs the
    /// folder and removes the unfinished file. An archive of that name is replaced.
    ///
    /// Should the unfinished file refuse to be removed, it is left: the archive is whole without that.
    ///
    /// # Errors
    /// [`ArchiveError::Io`], [`ArchiveError::DamagedSnapshot`] when the unfinished file no longer holds what
    /// was written. The unfinished file is kept whatever fails.
    pub fn finish(mut self, header: &RunHeader) -> Result<PathBuf, ArchiveError> {
        self.check()?;
        self.update_run(header)?;
        self.sync()?;
        let beside = with_suffix(&self.path, ".finishing");
        let failed = |action, source| ArchiveError::Io { action, path: beside.clone(), source };
        {
            let mut whole =
                self.storage.open(&beside, Opening::Emptied).map_err(|source| failed("create", source))?;
            self.write_whole(&mut *whole, &beside)?;
            whole.sync().map_err(|source| failed("sync", source))?;
        }
        self.storage.rename(&beside, &self.path).map_err(|source| failed("rename", source))?;
        self.storage.sync_folder(&self.path).map_err(|source| failed("sync the folder of", source))?;
        let Writer { storage, path, unfinished, file, .. } = self;
        if cfg!(unix) {
            // Removed while the lock is held, so that no other run can have claimed it in between.
            let _ = storage.remove(&unfinished);
            drop(file);
        } else {
            drop(file);
            let _ = storage.remove(&unfinished);
        }
        Ok(path)
    }

    /// Copies everything in order into the file that becomes the archive.
    fn write_whole(&mut self, whole: &mut dyn StoredFile, beside: &Path) -> Result<(), ArchiveError> {
        let failed = |source| ArchiveError::Io { action: "write", path: beside.to_owned(), source };
        let first = sections(Kind::Run, "the description of the run", &self.run_header)?;
        let run = first.body_digest();
        let mut at = START_LENGTH as u64;
        whole.write_at(0, &start_bytes()).map_err(failed)?;
        let mut put = |bytes: &[u8], at: &mut u64| -> Result<(), ArchiveError> {
            whole.write_at(*at, bytes).map_err(failed)?;
            *at += bytes.len() as u64;
            Ok(())
        };
        put(&first.frame(&first.header(0, run)), &mut at)?;

        let mut order: Vec<usize> = (0..self.written.len()).collect();
        order.sort_by(|&a, &b| {
            let (a, b) = (&self.written[a].label, &self.written[b].label);
            a.order.cmp(&b.order).then_with(|| a.name.cmp(&b.name))
        });
        let mut index = Index::default();
        for (position, which) in order.into_iter().enumerate() {
            let Written { label, offset, header, length } = &self.written[which];
            let damaged = || ArchiveError::DamagedSnapshot { name: label.name.clone(), offset: *offset };
            let mut frame = vec![0; usize::try_from(*length).map_err(|_| damaged())?];
            self.file.read_at(*offset, &mut frame).map_err(|source| ArchiveError::Io {
                action: "read",
                path: self.unfinished.clone(),
                source,
            })?;
            let body = HEADER_LENGTH + header.label_length() as usize;
            let intact = frame[..HEADER_LENGTH] == header.to_bytes()
                && digest(&frame[HEADER_LENGTH..body]) == header.label_digest
                && digest(&frame[body..]) == header.body_digest;
            if !intact {
                return Err(damaged());
            }
            let sealed = Header { ordinal: position as u64 + 1, run, ..header.clone() };
            frame[..HEADER_LENGTH].copy_from_slice(&sealed.to_bytes());
            index.entries.push(IndexEntry {
                label: label.clone(),
                offset: at,
                length: *length,
                header_digest: sealed.own_digest(),
            });
            put(&frame, &mut at)?;
        }

        let made = sections(Kind::Index, "the index", &index)?;
        let header = made.header(index.entries.len() as u64 + 1, run);
        let index_at = at;
        put(&made.frame(&header), &mut at)?;
        let footer = Footer {
            index: index_at,
            length: at + FOOTER_LENGTH as u64,
            snapshots: index.entries.len() as u64,
            index_digest: header.own_digest(),
        };
        put(&footer.to_bytes(), &mut at)
    }

    fn check(&self) -> Result<(), ArchiveError> {
        if self.broken { Err(ArchiveError::WriterBroken { path: self.unfinished.clone() }) } else { Ok(()) }
    }

    fn io(&self, action: &'static str, source: std::io::Error) -> ArchiveError {
        ArchiveError::Io { action, path: self.unfinished.clone(), source }
    }

    /// Appends one frame; on a failed write cuts what was half written, or breaks.
    fn append_frame(&mut self, made: &Sections) -> Result<Header, ArchiveError> {
        self.check()?;
        let header = made.header(self.ordinal, self.run);
        let frame = made.frame(&header);
        if let Err(source) = self.file.write_at(self.length, &frame) {
            self.broken = self.file.cut(self.length).is_err();
            return Err(self.io("write", source));
        }
        self.length += frame.len() as u64;
        self.ordinal += 1;
        Ok(header)
    }
}

/// Opens and locks the unfinished file; moves one that holds snapshots out of the way first.
fn claim(
    storage: &dyn Storage,
    unfinished: &Path,
) -> Result<(Box<dyn StoredFile>, Option<PathBuf>), ArchiveError> {
    let failed = |action, source| ArchiveError::Io { action, path: unfinished.to_owned(), source };
    let mut set_aside = None;
    // Each turn either claims the file, or finds that another run has just claimed or finished it.
    for _ in 0..100 {
        let mut file = storage.open(unfinished, Opening::AsItIs).map_err(|source| failed("open", source))?;
        if !file.try_lock().map_err(|source| failed("lock", source))? {
            return Err(ArchiveError::HeldByAnotherRun { path: unfinished.to_owned() });
        }
        if !file.stands_at(unfinished).map_err(|source| failed("open", source))? {
            continue;
        }
        if !holds_anything(&mut *file).map_err(|source| failed("read", source))? {
            return Ok((file, set_aside));
        }
        let aside = free_name(storage, unfinished)?;
        storage.rename(unfinished, &aside).map_err(|source| failed("set aside", source))?;
        set_aside = Some(aside);
    }
    Err(ArchiveError::HeldByAnotherRun { path: unfinished.to_owned() })
}

/// Whether there is more in the file than the description of a run that stored nothing.
fn holds_anything(file: &mut dyn StoredFile) -> std::io::Result<bool> {
    let length = file.length()?;
    if length == 0 {
        return Ok(false);
    }
    // A file of ours that holds no snapshot is small; a large one is kept without looking.
    if length > (1 << 24) {
        return Ok(true);
    }
    // Bounded by 16 MiB just above.
    let mut bytes = vec![0; length as usize];
    file.read_at(0, &mut bytes)?;
    Ok(match Archive::from_bytes(bytes) {
        Ok(archive) => !archive.entries().is_empty() || archive.is_damaged(),
        // Neither ours nor readable: somebody's file, kept. A torn first frame holds nothing.
        Err(ArchiveError::NoWholeFrame { .. }) => false,
        Err(_) => true,
    })
}

fn free_name(storage: &dyn Storage, unfinished: &Path) -> Result<PathBuf, ArchiveError> {
    let mut number = 1_u32;
    loop {
        let aside = with_suffix(unfinished, &format!("-{number}"));
        let taken = storage.exists(&aside).map_err(|source| ArchiveError::Io {
            action: "look for",
            path: aside.clone(),
            source,
        })?;
        match number.checked_add(1) {
            Some(next) if taken => number = next,
            _ => return Ok(aside),
        }
    }
}
