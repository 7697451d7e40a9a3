//! Reading an archive: finished, unfinished, cut off or damaged, never a wrong number.

use std::fs::File;
use std::io::{self, Read, Seek, SeekFrom};
use std::path::{Path, PathBuf};
use std::sync::{Mutex, PoisonError};

use serde::de::DeserializeOwned;

use super::encoding::{FirstIndex, Index, SweepPlace, decode};
use super::error::{ArchiveError, ArchiveWarning};
use super::layout::{
    CONTAINER_VERSION, Digest, FOOTER_LENGTH, Footer, HEADER_LENGTH, Header, Kind, LABEL_LIMIT, MAGIC,
    START_LENGTH, digest, start_version,
};
use super::model::{Label, RunHeader, Snapshot};
use super::scan;
use super::stored::{Sweep, read_snapshot};
use super::sweep::{SnapshotPlace, SweepRecord, point_of_name};

/// Something that bytes can be read from at any place.
pub(crate) trait Source: std::fmt::Debug + Send + Sync {
    /// How many bytes there are.
    fn length(&self) -> u64;
    /// Fills the buffer from that place.
    fn read_at(&self, offset: u64, buffer: &mut [u8]) -> io::Result<()>;
}

impl Source for Vec<u8> {
    fn length(&self) -> u64 {
        self.len() as u64
    }

    fn read_at(&self, offset: u64, buffer: &mut [u8]) -> io::Result<()> {
        let begin = usize::try_from(offset).map_err(|_| io::ErrorKind::UnexpectedEof)?;
        let end = begin.checked_add(buffer.len()).ok_or(io::ErrorKind::UnexpectedEof)?;
        buffer.copy_from_slice(self.get(begin..end).ok_or(io::ErrorKind::UnexpectedEof)?);
        Ok(())
    }
}

#[derive(Debug)]
struct FileSource {
    file: Mutex<File>,
    length: u64,
}

impl Source for FileSource {
    fn length(&self) -> u64 {
        self.length
    }

    fn read_at(&self, offset: u64, buffer: &mut [u8]) -> io::Result<()> {
        // The file has no state but its position, which is set anew here.
        let mut file = self.file.lock().unwrap_or_else(PoisonError::into_inner);
        file.seek(SeekFrom::Start(offset))?;
        file.read_exact(buffer)
    }
}

/// One line of the listing of an archive.
#[derive(Clone, Debug, PartialEq)]
pub struct Entry {
    /// Name, kind, place and status of the snapshot.
    pub label: Label,
    /// Where its frame begins.
    pub offset: u64,
    /// Length of its frame in bytes.
    pub length: u64,
    pub(crate) header_digest: Digest,
}

/// An archive opened for reading.
///
/// A snapshot is read and checked when it is asked for. What came out once is exactly what was
/// written: every byte of a frame stands under a digest of 128 bits.
#[derive(Debug)]
pub struct Archive {
    source: Box<dyn Source>,
    path: PathBuf,
    run: Option<RunHeader>,
    run_digest: Option<Digest>,
    entries: Vec<Entry>,
    pub(crate) sweeps: Vec<Sweep>,
    warnings: Vec<ArchiveWarning>,
    finished: bool,
    /// Where the last whole frame ends and the number of the next one, of a file that was read through.
    pub(crate) end: (u64, u64),
    indexed: Vec<SweepPlace>,
}

/// A checked frame header with its label bytes still unread.
#[derive(Clone, Debug)]
pub(crate) struct Placed {
    pub offset: u64,
    pub header: Header,
    /// Length of the whole frame.
    pub length: u64,
}

/// Reads through a source and says which file it was when that fails.
#[derive(Clone, Copy, Debug)]
pub(crate) struct Bytes<'a> {
    pub source: &'a dyn Source,
    pub path: &'a Path,
}

impl Bytes<'_> {
    /// `length` bytes from `offset`; the caller has checked them against the length of the file.
    pub(crate) fn take(&self, offset: u64, length: u64) -> Result<Vec<u8>, ArchiveError> {
        let failed = |source| ArchiveError::Io { action: "read", path: self.path.to_owned(), source };
        let within = offset.checked_add(length).is_some_and(|end| end <= self.source.length());
        let size = usize::try_from(length).ok().filter(|_| within);
        let mut buffer = vec![0; size.ok_or_else(|| failed(io::ErrorKind::UnexpectedEof.into()))?];
        self.source.read_at(offset, &mut buffer).map_err(failed)?;
        Ok(buffer)
    }

    fn array<const N: usize>(&self, offset: u64) -> Result<[u8; N], ArchiveError> {
        let mut out = [0; N];
        out.copy_from_slice(&self.take(offset, N as u64)?);
        Ok(out)
    }

    /// The undamaged frame header there, if there is one; its frame may reach past `end`.
    pub(crate) fn header(&self, offset: u64, end: u64) -> Result<Option<Placed>, ArchiveError> {
        if end.saturating_sub(offset) < HEADER_LENGTH as u64 {
            return Ok(None);
        }
        let Some(header) = Header::from_bytes(&self.array(offset)?) else { return Ok(None) };
        // A frame of 2^64 bytes was never written: a header that claims one is no header.
        let Some(length) = header.frame_length() else { return Ok(None) };
        Ok(Some(Placed { offset, header, length }))
    }

    /// The label of the frame, if it is undamaged.
    pub(crate) fn label<T: DeserializeOwned>(&self, placed: &Placed) -> Result<Option<T>, ArchiveError> {
        if placed.header.label as usize > LABEL_LIMIT {
            return Ok(None);
        }
        let bytes = self.take(placed.offset + HEADER_LENGTH as u64, placed.header.label_length())?;
        if digest(&bytes) != placed.header.label_digest {
            return Ok(None);
        }
        Ok(super::encoding::decode_label(&bytes[..placed.header.label as usize]))
    }

    /// Payload and number block of the frame, if they are undamaged.
    pub(crate) fn body(&self, placed: &Placed) -> Result<Option<(Vec<u8>, Vec<u8>)>, ArchiveError> {
        let before = HEADER_LENGTH as u64 + placed.header.label_length();
        let mut bytes = self.take(placed.offset + before, placed.length - before)?;
        if digest(&bytes) != placed.header.body_digest {
            return Ok(None);
        }
        // The payload is no longer than the body, whose length is that of a vector.
        let payload = placed.header.payload as usize;
        let numbers = bytes.split_off(payload.next_multiple_of(8));
        bytes.truncate(payload);
        Ok(Some((bytes, numbers)))
    }
}

/// The kind of a frame of a schema that this program reads.
pub(crate) fn known_kind(header: &Header, part: impl Fn() -> String) -> Result<Kind, ArchiveError> {
    let Some(kind) = Kind::from_number(header.kind) else {
        let known = Kind::ALL.into_iter().map(Kind::number).max().unwrap_or(0);
        return Err(ArchiveError::Newer { part: part(), found: header.kind.into(), known: known.into() });
    };
    if header.schema > kind.schema() {
        return Err(ArchiveError::Newer {
            part: part(),
            found: header.schema.into(),
            known: kind.schema().into(),
        });
    }
    Ok(kind)
}

impl Archive {
    /// Opens a finished, unfinished, cut-off or damaged archive.
    ///
    /// What could not be read is in [`warnings`](Archive::warnings). The index of a finished archive is read;
    /// an unfinished one is read through and every frame checked.
    ///
    /// # Errors
    /// [`ArchiveError::Foreign`], [`ArchiveError::Newer`], [`ArchiveError::DamagedStart`],
    /// [`ArchiveError::NoWholeFrame`], [`ArchiveError::Io`].
    pub fn open(path: &Path) -> Result<Archive, ArchiveError> {
        let failed = |source| ArchiveError::Io { action: "open", path: path.to_owned(), source };
        // Looked at before it is opened: opening a pipe would wait for somebody to write to it.
        if !std::fs::metadata(path).map_err(failed)?.is_file() {
            return Err(ArchiveError::Foreign { path: path.to_owned() });
        }
        let file = File::open(path).map_err(failed)?;
        let about = file.metadata().map_err(failed)?;
        Self::from_source(Box::new(FileSource { file: Mutex::new(file), length: about.len() }), path)
    }

    /// Opens an archive that is already in memory.
    ///
    /// # Errors
    /// As [`open`](Archive::open).
    pub fn from_bytes(bytes: Vec<u8>) -> Result<Archive, ArchiveError> {
        Self::from_source(Box::new(bytes), Path::new("(in memory)"))
    }

    pub(crate) fn from_source(source: Box<dyn Source>, path: &Path) -> Result<Archive, ArchiveError> {
        let bytes = Bytes { source: &*source, path };
        let length = source.length();
        let magic = bytes.take(0, length.min(MAGIC.len() as u64))?;
        if !MAGIC.starts_with(&magic) {
            return Err(ArchiveError::Foreign { path: path.to_owned() });
        }
        if length < START_LENGTH as u64 {
            return Err(ArchiveError::NoWholeFrame { path: path.to_owned(), length });
        }
        match start_version(&bytes.array::<START_LENGTH>(0)?) {
            None => return Err(ArchiveError::DamagedStart { path: path.to_owned() }),
            Some(CONTAINER_VERSION) => {}
            Some(found) => {
                let part = format!("`{}`", path.display());
                return Err(ArchiveError::Newer { part, found, known: CONTAINER_VERSION });
            }
        }

        let footer_at = length.saturating_sub(FOOTER_LENGTH as u64);
        let footer = if footer_at >= START_LENGTH as u64 {
            Footer::from_bytes(&bytes.array(footer_at)?).filter(|footer| footer.length == length)
        } else {
            None
        };
        let mut archive = Archive {
            run: None,
            run_digest: None,
            entries: Vec::new(),
            sweeps: Vec::new(),
            warnings: Vec::new(),
            finished: footer.is_some(),
            end: (START_LENGTH as u64, 0),
            indexed: Vec::new(),
            path: path.to_owned(),
            source,
        };
        match &footer {
            Some(footer) if archive.read_index(footer)? => {
                archive.read_run()?;
                archive.read_sweeps()?;
            }
            _ => archive.read_through(if footer.is_some() { footer_at } else { length })?,
        }
        Ok(archive)
    }

    pub(crate) fn bytes(&self) -> Bytes<'_> {
        Bytes { source: &*self.source, path: &self.path }
    }

    pub(crate) fn run_digest(&self) -> Option<Digest> {
        self.run_digest
    }

    /// Takes the entries from the index; false when it is damaged.
    fn read_index(&mut self, footer: &Footer) -> Result<bool, ArchiveError> {
        let end = footer.length - FOOTER_LENGTH as u64;
        let bytes = self.bytes();
        let Some(placed) = bytes.header(footer.index, end)? else { return Ok(false) };
        let fits = placed.offset.checked_add(placed.length) == Some(end);
        if !fits || placed.header.own_digest() != footer.index_digest {
            return Ok(false);
        }
        if known_kind(&placed.header, || "the index".to_owned())? != Kind::Index {
            return Ok(false);
        }
        let Some((payload, _)) = bytes.body(&placed)? else { return Ok(false) };
        let decoded = match placed.header.schema {
            1 => decode::<FirstIndex>(&payload, Kind::Index)
                .map(|first| Index { entries: first.entries, sweeps: Vec::new() }),
            _ => decode::<Index>(&payload, Kind::Index),
        };
        let Some(index) = decoded else { return Ok(false) };
        let inside = |offset: u64, length: u64| {
            offset >= START_LENGTH as u64
                && length >= HEADER_LENGTH as u64
                && offset.checked_add(length).is_some_and(|end| end <= footer.index)
        };
        if index.entries.len() as u64 != footer.snapshots
            || !index.entries.iter().all(|entry| inside(entry.offset, entry.length))
            || !index.sweeps.iter().all(|sweep| {
                inside(sweep.offset, sweep.length)
                    && sweep.blocks.iter().all(|block| inside(block.offset, block.length))
                    && sweep.blocks.is_sorted_by(|a, b| a.last < b.first)
                    && sweep.blocks.len() < u32::MAX as usize
            })
        {
            return Ok(false);
        }
        self.indexed = index.sweeps;
        self.run_digest = Some(placed.header.run);
        self.entries = index
            .entries
            .into_iter()
            .map(|entry| Entry {
                label: entry.label,
                offset: entry.offset,
                length: entry.length,
                header_digest: entry.header_digest,
            })
            .collect();
        Ok(true)
    }

    /// Reads the descriptions of the sweeps at their places in a finished archive.
    fn read_sweeps(&mut self) -> Result<(), ArchiveError> {
        for place in std::mem::take(&mut self.indexed) {
            let SweepPlace { name, step, offset, length, header_digest, blocks } = place;
            let bytes = self.bytes();
            let mut record = None;
            if let Some(placed) = bytes.header(offset, offset.saturating_add(length))?
                && placed.length == length
                && placed.header.own_digest() == header_digest
                && Some(placed.header.run) == self.run_digest
                && known_kind(&placed.header, || format!("the sweep `{name}`"))? == Kind::Sweep
                && bytes.label::<String>(&placed)?.as_ref() == Some(&name)
                && let Some((payload, _)) = bytes.body(&placed)?
            {
                record = decode::<SweepRecord>(&payload, Kind::Sweep)
                    .filter(|record| record.start.name == name && record.start.step == step);
            }
            if record.is_none() {
                self.warnings.push(ArchiveWarning::DamagedSweep { name: name.clone(), offset });
            }
            self.sweeps.push(Sweep { name, step, record, blocks, in_order: true, ..Sweep::default() });
        }
        Ok(())
    }

    /// Reads the description of the run at its place in a finished archive.
    fn read_run(&mut self) -> Result<(), ArchiveError> {
        let bytes = self.bytes();
        let mut run = None;
        if let Some(placed) = bytes.header(START_LENGTH as u64, bytes.source.length())?
            && placed.offset.checked_add(placed.length).is_some_and(|end| end <= bytes.source.length())
            && Some(placed.header.body_digest) == self.run_digest
            && known_kind(&placed.header, || "the description of the run".to_owned())? == Kind::Run
            && let Some((payload, _)) = bytes.body(&placed)?
        {
            run = decode(&payload, Kind::Run);
        }
        if run.is_none() {
            self.warnings.push(ArchiveWarning::DamagedRun);
        }
        self.run = run;
        Ok(())
    }

    /// Finds the frames by reading through the file up to `end`.
    fn read_through(&mut self, end: u64) -> Result<(), ArchiveError> {
        let found = scan::scan(self.bytes(), end)?;
        if found.whole_frames == 0 && found.entries.is_empty() && !self.finished {
            let only_torn = found.warnings.iter().all(|w| matches!(w, ArchiveWarning::TornTail { .. }));
            if only_torn {
                return Err(ArchiveError::NoWholeFrame {
                    path: self.path.clone(),
                    length: self.source.length(),
                });
            }
        }
        self.warnings = if self.finished {
            vec![ArchiveWarning::DamagedIndex]
        } else {
            let points = found.sweeps.iter().map(Sweep::count).sum();
            vec![ArchiveWarning::NotFinished { snapshots: found.whole_snapshots, points }]
        };
        self.warnings.extend(found.warnings);
        if found.run.is_none() {
            self.warnings.push(ArchiveWarning::DamagedRun);
        }
        self.run = found.run;
        self.run_digest = found.run_digest;
        self.end = (found.end, found.next_ordinal);
        self.sweeps = found.sweeps;
        self.sweeps.sort_by(|a, b| a.step.cmp(&b.step).then_with(|| a.name.cmp(&b.name)));
        self.entries = found.entries;
        self.entries
            .sort_by(|a, b| a.label.order.cmp(&b.label.order).then_with(|| a.label.name.cmp(&b.label.name)));
        Ok(())
    }

    /// Whether the archive has its index and footer: it is the sorted whole that `finish` wrote.
    pub fn is_finished(&self) -> bool {
        self.finished
    }

    /// Whether anything but the missing end of an unfinished archive is amiss.
    pub fn is_damaged(&self) -> bool {
        self.warnings.iter().any(|warning| !matches!(warning, ArchiveWarning::NotFinished { .. }))
    }

    /// What was found amiss on opening. A program that reads on says so and exits with a failure.
    pub fn warnings(&self) -> &[ArchiveWarning] {
        &self.warnings
    }

    /// The description of the run: in an unfinished archive the last one that was written.
    ///
    /// # Errors
    /// [`ArchiveError::DamagedRun`].
    pub fn run(&self) -> Result<&RunHeader, ArchiveError> {
        self.run.as_ref().ok_or(ArchiveError::DamagedRun)
    }

    /// The snapshots, by their order key.
    pub fn entries(&self) -> &[Entry] {
        &self.entries
    }

    /// Reads the snapshot of that name.
    ///
    /// # Errors
    /// [`ArchiveError::NoSuchSnapshot`] with the nearest names, and those of
    /// [`snapshot_at`](Archive::snapshot_at).
    pub fn snapshot(&self, name: &str) -> Result<Snapshot, ArchiveError> {
        match self.entries.iter().position(|entry| entry.label.name == name) {
            Some(index) => self.snapshot_at(index),
            None => match self.stored_by_point(name)? {
                Some(place) => self.point_snapshot(&place),
                None => Err(ArchiveError::NoSuchSnapshot { name: name.to_owned(), near: self.near(name) }),
            },
        }
    }

    /// Reads the snapshot of that place in [`entries`](Archive::entries).
    ///
    /// # Errors
    /// [`ArchiveError::NoSuchIndex`], [`ArchiveError::DamagedSnapshot`], [`ArchiveError::Newer`],
    /// [`ArchiveError::Io`].
    pub fn snapshot_at(&self, index: usize) -> Result<Snapshot, ArchiveError> {
        let entry =
            self.entries.get(index).ok_or(ArchiveError::NoSuchIndex { index, count: self.entries.len() })?;
        let place = SnapshotPlace {
            label: entry.label.clone(),
            offset: entry.offset,
            length: entry.length,
            header_digest: entry.header_digest,
        };
        read_snapshot(self.bytes(), self.run_digest, &place)
    }

    /// Where the snapshot of that name stands that a point stored.
    fn stored_by_point(&self, name: &str) -> Result<Option<SnapshotPlace>, ArchiveError> {
        let Some((sweep, index, Some(_))) = point_of_name(name) else { return Ok(None) };
        if !self.sweeps.iter().any(|each| each.name == sweep) {
            return Ok(None);
        }
        let point = self.point(sweep, index)?;
        Ok(point.snapshots.into_iter().find(|place| place.label.name == name))
    }

    /// Reads every snapshot and every point and says which are damaged.
    ///
    /// # Errors
    /// [`ArchiveError::Newer`], [`ArchiveError::Io`].
    pub fn verify(&self) -> Result<Vec<ArchiveWarning>, ArchiveError> {
        let mut found = Vec::new();
        let mut keep = |error| match error {
            ArchiveError::DamagedSnapshot { name, offset } => {
                found.push(ArchiveWarning::DamagedSnapshot { name, offset });
                Ok(())
            }
            ArchiveError::DamagedPoints { sweep, first, last, offset } => {
                found.push(ArchiveWarning::DamagedPoints { sweep, first, last, offset });
                Ok(())
            }
            error => Err(error),
        };
        for index in 0..self.entries.len() {
            self.snapshot_at(index).map(|_| ()).or_else(&mut keep)?;
        }
        for sweep in &self.sweeps {
            for point in self.points(sweep) {
                let read = point.and_then(|point| {
                    point.snapshots.iter().try_for_each(|place| self.point_snapshot(place).map(|_| ()))
                });
                read.or_else(&mut keep)?;
            }
        }
        Ok(found)
    }

    /// The names nearest to one that is not there, best first, at most three.
    fn near(&self, name: &str) -> Vec<String> {
        let wanted = name.to_lowercase();
        let mut scored: Vec<(f64, &str)> = self
            .entries
            .iter()
            .map(|entry| entry.label.name.as_str())
            .map(|candidate| {
                let lower = candidate.to_lowercase();
                let inside = !wanted.is_empty() && lower.contains(&wanted);
                (if inside { 1.0 } else { strsim::jaro_winkler(&wanted, &lower) }, candidate)
            })
            .filter(|(score, _)| *score >= 0.7)
            .collect();
        scored.sort_by(|a, b| b.0.total_cmp(&a.0));
        scored.into_iter().take(3).map(|(_, name)| name.to_owned()).collect()
    }
}
