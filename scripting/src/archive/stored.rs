//! The sweeps of an archive as they are read: one point, or all of them in order.

use std::collections::BTreeSet;

use super::blocks::{Block, BlockCache, BlockLabel, PointPlace};
use super::encoding::{BlockPlace, decode_snapshot};
use super::error::ArchiveError;
use super::layout::{Digest, Kind};
use super::model::{Label, Snapshot};
use super::reader::{Archive, Bytes, known_kind};
use super::sweep::{SnapshotPlace, StoredPoint, SweepRecord};

/// A sweep of an archive.
#[derive(Clone, Debug, Default)]
pub struct Sweep {
    /// Its name.
    pub name: String,
    /// Its step.
    pub step: u64,
    pub(crate) record: Option<SweepRecord>,
    pub(crate) blocks: Vec<BlockPlace>,
    /// Where each point stands, by index, in a file whose blocks came as they were done; empty where they stand in
    /// order.
    pub(crate) places: Vec<PointPlace>,
    /// Points a snapshot of which is missing: they are solved again.
    pub(crate) incomplete: BTreeSet<u64>,
    pub(crate) in_order: bool,
    /// Its first description is damaged, so that it is not certain which plan its points are of.
    pub(crate) in_doubt: bool,
}

impl Sweep {
    pub(crate) fn of(record: SweepRecord) -> Self {
        let start = &record.start;
        Sweep { name: start.name.clone(), step: start.step, record: Some(record), ..Sweep::default() }
    }

    pub(crate) fn unknown(name: String, step: u64) -> Self {
        Sweep { name, step, in_doubt: true, ..Sweep::default() }
    }

    /// Its description; absent when that is damaged, which its points survive.
    pub fn record(&self) -> Option<&SweepRecord> {
        self.record.as_ref()
    }

    /// How many points are stored.
    pub fn count(&self) -> u64 {
        if self.in_order {
            self.blocks.iter().map(|block| block.count).sum()
        } else {
            self.places.len() as u64
        }
    }

    /// How many of them failed, as the blocks count them; a point that was stored twice counts twice.
    pub fn failed(&self) -> u64 {
        self.blocks.iter().map(|block| block.failed).sum()
    }

    /// The block that holds the point of that index, if one does.
    fn block_of(&self, index: u64) -> Option<usize> {
        if self.in_order {
            let at = self.blocks.partition_point(|block| block.last < index);
            return self.blocks.get(at).filter(|block| block.first <= index).map(|_| at);
        }
        let at = self.places.binary_search_by_key(&index, |place| place.index).ok()?;
        Some(self.places[at].block as usize)
    }
}

/// Reads the block at that place.
pub(crate) fn read_block(
    bytes: Bytes<'_>,
    run: Option<Digest>,
    sweep: &str,
    place: &BlockPlace,
) -> Result<Block, ArchiveError> {
    let damaged = || ArchiveError::DamagedPoints {
        sweep: sweep.to_owned(),
        first: place.first,
        last: place.last,
        offset: place.offset,
    };
    let end = place.offset.checked_add(place.length).ok_or_else(damaged)?;
    let placed = bytes.header(place.offset, end)?.ok_or_else(damaged)?;
    if placed.length != place.length
        || placed.header.own_digest() != place.header_digest
        || Some(placed.header.run) != run
    {
        return Err(damaged());
    }
    let part = || format!("points of the sweep `{sweep}`");
    if known_kind(&placed.header, part)? != Kind::Points {
        return Err(damaged());
    }
    let label: BlockLabel = bytes.label(&placed)?.ok_or_else(damaged)?;
    let (payload, numbers) = bytes.body(&placed)?.ok_or_else(damaged)?;
    let block = Block::decode(&payload, &numbers).ok_or_else(damaged)?;
    let agrees = *block.label() == label
        && label.sweep == sweep
        && (label.first, label.last) == (place.first, place.last)
        && (label.count, label.failed) == (place.count, place.failed);
    if agrees { Ok(block) } else { Err(damaged()) }
}

/// Reads the snapshot at that place.
pub(crate) fn read_snapshot(
    bytes: Bytes<'_>,
    run: Option<Digest>,
    place: &SnapshotPlace,
) -> Result<Snapshot, ArchiveError> {
    let name = &place.label.name;
    let damaged = || ArchiveError::DamagedSnapshot { name: name.clone(), offset: place.offset };
    let end = place.offset.checked_add(place.length).ok_or_else(damaged)?;
    let placed = bytes.header(place.offset, end)?.ok_or_else(damaged)?;
    if placed.length != place.length
        || placed.header.own_digest() != place.header_digest
        || Some(placed.header.run) != run
    {
        return Err(damaged());
    }
    if known_kind(&placed.header, || format!("snapshot `{name}`"))? != Kind::Snapshot {
        return Err(damaged());
    }
    if bytes.label::<Label>(&placed)?.as_ref() != Some(&place.label) {
        return Err(damaged());
    }
    let (payload, numbers) = bytes.body(&placed)?.ok_or_else(damaged)?;
    match decode_snapshot(&payload, &numbers) {
        Some(snapshot) if snapshot.label == place.label => Ok(snapshot),
        _ => Err(damaged()),
    }
}

/// The points of a sweep in order of index, read block by block.
#[derive(Debug)]
pub struct Points<'a> {
    archive: &'a Archive,
    sweep: &'a Sweep,
    cache: BlockCache,
    /// The next place, or in a file with its blocks in order the next block and row.
    next: (usize, usize),
}

impl Points<'_> {
    fn read(&mut self, number: usize, row: usize) -> Option<Result<(StoredPoint, bool), ArchiveError>> {
        let place = self.sweep.blocks.get(number)?;
        let (archive, name) = (self.archive, &self.sweep.name);
        let read = || read_block(archive.bytes(), archive.run_digest(), name, place);
        // Fewer than 2^32 blocks.
        Some(self.cache.get(number as u32, read).map(|block| {
            let last = row + 1 >= block.indices().len();
            (block.point(row), last)
        }))
    }
}

impl Iterator for Points<'_> {
    type Item = Result<StoredPoint, ArchiveError>;

    fn next(&mut self) -> Option<Self::Item> {
        if !self.sweep.in_order {
            let place = *self.sweep.places.get(self.next.0)?;
            self.next.0 += 1;
            let read = self.read(place.block as usize, place.row as usize)?;
            return Some(read.map(|(point, _)| point));
        }
        let (number, row) = self.next;
        match self.read(number, row)? {
            Ok((point, last)) => {
                self.next = if last { (number + 1, 0) } else { (number, row + 1) };
                Some(Ok(point))
            }
            // A damaged block is named once; its neighbours are readable.
            Err(error) => {
                self.next = (number + 1, 0);
                Some(Err(error))
            }
        }
    }
}

impl Archive {
    /// The sweeps, by their step.
    pub fn sweeps(&self) -> &[Sweep] {
        &self.sweeps
    }

    /// The sweep of that name.
    ///
    /// # Errors
    /// [`ArchiveError::NoSuchSweep`] with the names of those that there are.
    pub fn sweep(&self, name: &str) -> Result<&Sweep, ArchiveError> {
        self.sweeps.iter().find(|sweep| sweep.name == name).ok_or_else(|| ArchiveError::NoSuchSweep {
            name: name.to_owned(),
            there: self.sweeps.iter().map(|sweep| sweep.name.clone()).collect(),
        })
    }

    /// Reads one point of a sweep: its block and nothing else.
    ///
    /// # Errors
    /// [`ArchiveError::NoSuchSweep`], [`ArchiveError::NoSuchPoint`], [`ArchiveError::DamagedPoints`],
    /// [`ArchiveError::Newer`], [`ArchiveError::Io`].
    pub fn point(&self, sweep: &str, index: u64) -> Result<StoredPoint, ArchiveError> {
        let found = self.sweep(sweep)?;
        let missing = || ArchiveError::NoSuchPoint {
            sweep: sweep.to_owned(),
            index,
            points: found.record.as_ref().map(|record| record.start.points),
        };
        let number = found.block_of(index).ok_or_else(missing)?;
        let place = found.blocks.get(number).ok_or_else(missing)?;
        let block = read_block(self.bytes(), self.run_digest(), sweep, place)?;
        let row = block.row(index).ok_or_else(missing)?;
        Ok(block.point(row))
    }

    /// The points of a sweep in order of index, without their snapshots. A damaged block gives one error.
    pub fn points<'a>(&'a self, sweep: &'a Sweep) -> Points<'a> {
        Points { archive: self, sweep, cache: BlockCache::default(), next: (0, 0) }
    }

    /// Reads a snapshot that a point stored.
    ///
    /// # Errors
    /// [`ArchiveError::DamagedSnapshot`], [`ArchiveError::Newer`], [`ArchiveError::Io`].
    pub fn point_snapshot(&self, place: &SnapshotPlace) -> Result<Snapshot, ArchiveError> {
        read_snapshot(self.bytes(), self.run_digest(), place)
    }
}
