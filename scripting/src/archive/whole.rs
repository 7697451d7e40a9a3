//! The finished whole: everything of a run in order, with its index and footer, written beside its place and renamed.

use std::path::{Path, PathBuf};

use super::blocks::{BLOCK_BYTES, BLOCK_POINTS, BlockCache, PointPlace, sort_places, weight};
use super::claim::with_suffix;
use super::encoding::{Index, IndexEntry, SweepPlace, sections};
use super::error::ArchiveError;
use super::frames::{Batch, label_weight, record_sections};
use super::layout::{Digest, FOOTER_LENGTH, Footer, HEADER_LENGTH, Header, Kind, digest, start_bytes};
use super::model::RunHeader;
use super::reader::{Bytes, Source};
use super::storage::{Opening, Storage, StoredFile};
use super::stored::{Sweep, read_block};
use super::sweep::{SnapshotPlace, StoredPoint, SweepStart};

/// What the whole is made of: snapshots and sweeps in an unfinished file.
pub(crate) struct Parts<'a> {
    pub source: Box<dyn Source>,
    pub path: &'a Path,
    /// The run that the frames of the unfinished file belong to.
    pub run: Digest,
    pub header: &'a RunHeader,
    pub snapshots: Vec<&'a SnapshotPlace>,
    pub sweeps: Vec<&'a Sweep>,
}

/// One thing that has its place in the order of the whole.
enum Part<'a> {
    Snapshot(&'a SnapshotPlace),
    Sweep(&'a Sweep),
}

/// Bytes that are gathered before they are written.
const BUFFER: usize = 1 << 20;

/// The file that becomes the archive.
struct Target {
    file: Box<dyn StoredFile>,
    path: PathBuf,
    /// Where the batch will stand.
    at: u64,
    batch: Batch,
}

impl Target {
    /// Writes the batch if it is long enough.
    fn flush(&mut self, least: usize) -> Result<(), ArchiveError> {
        if self.batch.bytes.len() < least {
            return Ok(());
        }
        let written = self.file.write_at(self.at, &self.batch.bytes);
        written.map_err(|source| ArchiveError::Io { action: "write", path: self.path.clone(), source })?;
        self.at += self.batch.bytes.len() as u64;
        self.batch.start_again(self.at);
        Ok(())
    }
}

/// Writes the whole beside `path`, syncs it, renames it there and syncs the folder.
pub(crate) fn write(storage: &dyn Storage, parts: &Parts<'_>, path: &Path) -> Result<(), ArchiveError> {
    let beside = with_suffix(path, ".finishing");
    let failed = |action, source| ArchiveError::Io { action, path: beside.clone(), source };
    let file = storage.open(&beside, Opening::Emptied).map_err(|source| failed("create", source))?;
    let first = sections(Kind::Run, "the description of the run", parts.header)?;
    let batch = Batch::new(0, 0, first.body_digest());
    let mut target = Target { file, path: beside.clone(), at: 0, batch };
    target.batch.bytes.extend_from_slice(&start_bytes());
    target.batch.frame(&first);
    let index = put_parts(parts, &mut target)?;
    let made = sections(Kind::Index, "the index", &index)?;
    let (index_at, _, index_digest) = target.batch.frame(&made);
    let length = target.at + (target.batch.bytes.len() + FOOTER_LENGTH) as u64;
    let snapshots = index.entries.len() as u64;
    let footer = Footer { index: index_at, length, snapshots, index_digest };
    target.batch.bytes.extend_from_slice(&footer.to_bytes());
    target.flush(0)?;
    target.file.sync().map_err(|source| failed("sync", source))?;
    drop(target);
    storage.rename(&beside, path).map_err(|source| failed("rename", source))?;
    storage.sync_folder(path).map_err(|source| failed("sync the folder of", source))
}

/// Copies everything in order; the index of it.
fn put_parts(parts: &Parts<'_>, target: &mut Target) -> Result<Index, ArchiveError> {
    let mut order: Vec<(u64, u64, &str, Part<'_>)> = Vec::new();
    for place in &parts.snapshots {
        let key = place.label.order;
        order.push((key.step, key.point, &place.label.name, Part::Snapshot(place)));
    }
    order.extend(parts.sweeps.iter().map(|sweep| (sweep.step, 0, sweep.name.as_str(), Part::Sweep(sweep))));
    order.sort_by(|a, b| (a.0, a.1, a.2).cmp(&(b.0, b.1, b.2)));
    let mut index = Index::default();
    for (.., part) in order {
        match part {
            Part::Snapshot(place) => {
                let moved = copy_snapshot(parts, place, target)?;
                let SnapshotPlace { label, offset, length, header_digest } = moved;
                index.entries.push(IndexEntry { label, offset, length, header_digest });
            }
            Part::Sweep(sweep) => index.sweeps.extend(put_sweep(parts, sweep, target)?),
        }
    }
    Ok(index)
}

/// Copies a frame of the unfinished file under its new number and run, after checking every byte of it.
fn copy_snapshot(
    parts: &Parts<'_>,
    place: &SnapshotPlace,
    target: &mut Target,
) -> Result<SnapshotPlace, ArchiveError> {
    let damaged = || ArchiveError::DamagedSnapshot { name: place.label.name.clone(), offset: place.offset };
    let bytes = Bytes { source: &*parts.source, path: parts.path };
    let frame = bytes.take(place.offset, place.length)?;
    let header: Option<[u8; HEADER_LENGTH]> =
        frame.get(..HEADER_LENGTH).and_then(|bytes| bytes.try_into().ok());
    let header = header.and_then(|bytes| Header::from_bytes(&bytes)).ok_or_else(damaged)?;
    let body = HEADER_LENGTH + header.label_length() as usize;
    let intact = header.own_digest() == place.header_digest
        && header.frame_length() == Some(place.length)
        && frame.get(HEADER_LENGTH..body).is_some_and(|label| digest(label) == header.label_digest)
        && frame.get(body..).is_some_and(|body| digest(body) == header.body_digest);
    if !intact {
        return Err(damaged());
    }
    let (offset, header_digest) = target.batch.resealed(header, &frame[HEADER_LENGTH..]);
    target.flush(BUFFER)?;
    Ok(SnapshotPlace { label: place.label.clone(), offset, length: place.length, header_digest })
}

/// Writes a sweep: its description, and its points in order of index, each block after the snapshots of its points.
fn put_sweep(
    parts: &Parts<'_>,
    sweep: &Sweep,
    target: &mut Target,
) -> Result<Option<SweepPlace>, ArchiveError> {
    // A sweep that this run has begun has its description.
    let Some(record) = sweep.record() else { return Ok(None) };
    let (offset, length, header_digest) = target.batch.frame(&record_sections(record)?);
    let (name, step) = (sweep.name.clone(), sweep.step);
    let mut placed = SweepPlace { name, step, offset, length, header_digest, blocks: Vec::new() };
    let mut places: Vec<PointPlace> = sweep.places.clone();
    sort_places(&mut places);
    let mut cache = BlockCache::default();
    let mut waiting: Vec<StoredPoint> = Vec::new();
    let mut weighed = 0;
    for place in places {
        let bytes = Bytes { source: &*parts.source, path: parts.path };
        // Every place names a block of its sweep.
        let Some(block) = sweep.blocks.get(place.block as usize) else { continue };
        let read = || read_block(bytes, Some(parts.run), &sweep.name, block);
        let StoredPoint { point, snapshots } = cache.get(place.block, read)?.point(place.row as usize);
        let weight = weight(&point, snapshots.iter().map(|each| label_weight(&each.label)).sum());
        if !waiting.is_empty() && (waiting.len() >= BLOCK_POINTS || weighed + weight > BLOCK_BYTES) {
            put_block(&record.start, &mut waiting, &mut placed, target)?;
            weighed = 0;
        }
        weighed += weight;
        let moved: Result<Vec<SnapshotPlace>, ArchiveError> =
            snapshots.iter().map(|each| copy_snapshot(parts, each, target)).collect();
        waiting.push(StoredPoint { point, snapshots: moved? });
    }
    if !waiting.is_empty() {
        put_block(&record.start, &mut waiting, &mut placed, target)?;
    }
    Ok(Some(placed))
}

fn put_block(
    start: &SweepStart,
    waiting: &mut Vec<StoredPoint>,
    placed: &mut SweepPlace,
    target: &mut Target,
) -> Result<(), ArchiveError> {
    let (block, _) = target.batch.block(start, std::mem::take(waiting))?;
    placed.blocks.push(block);
    target.flush(BUFFER)
}
