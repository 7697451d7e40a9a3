//! Frames that are made to be written at once: blocks of points, snapshots, descriptions of sweeps.

use super::blocks::block_sections;
use super::encoding::{BlockPlace, Sections, labelled_sections};
use super::error::ArchiveError;
use super::layout::{Digest, Header, Kind};
use super::model::{Label, Status};
use super::sweep::{StoredPoint, SweepRecord, SweepStart};

/// The sections of the description of a sweep.
pub(crate) fn record_sections(record: &SweepRecord) -> Result<Sections, ArchiveError> {
    let what = format!("the sweep `{}`", record.start.name);
    labelled_sections(Kind::Sweep, &what, &record.start.name, record)
}

/// Bytes that the label of a point's snapshot takes in its block, about.
pub(crate) fn label_weight(label: &Label) -> usize {
    label.name.len() + label.kind.len() + 96
}

/// Frames that are written at once.
pub(crate) struct Batch {
    pub bytes: Vec<u8>,
    pub ordinal: u64,
    begin: u64,
    run: Digest,
}

impl Batch {
    /// None yet; the first will stand there and have that number.
    pub(crate) fn new(begin: u64, ordinal: u64, run: Digest) -> Self {
        Batch { bytes: Vec::new(), ordinal, begin, run }
    }

    /// Adds a frame: its place, length and header digest.
    pub(crate) fn frame(&mut self, made: &Sections) -> (u64, u64, Digest) {
        let header = made.header(self.ordinal, self.run);
        let offset = self.begin + self.bytes.len() as u64;
        let frame = made.frame(&header);
        self.bytes.extend_from_slice(&frame);
        self.ordinal += 1;
        (offset, frame.len() as u64, header.own_digest())
    }

    /// Everything so far is written: the next frame will stand there.
    pub(crate) fn start_again(&mut self, begin: u64) {
        self.bytes.clear();
        self.begin = begin;
    }

    /// Adds a frame of another file under its new number and run: its place and header digest.
    pub(crate) fn resealed(&mut self, header: Header, rest: &[u8]) -> (u64, Digest) {
        let header = Header { ordinal: self.ordinal, run: self.run, ..header };
        let offset = self.begin + self.bytes.len() as u64;
        self.bytes.extend_from_slice(&header.to_bytes());
        self.bytes.extend_from_slice(rest);
        self.ordinal += 1;
        (offset, header.own_digest())
    }

    /// Adds the block of these points: its place and their indices.
    pub(crate) fn block(
        &mut self,
        start: &SweepStart,
        points: Vec<StoredPoint>,
    ) -> Result<(BlockPlace, Vec<u64>), ArchiveError> {
        let indices: Vec<u64> = points.iter().map(|each| each.point.index).collect();
        let failed = points.iter().filter(|each| each.point.status != Status::Solved).count();
        let (offset, length, header_digest) = self.frame(&block_sections(start, &points)?);
        let place = BlockPlace {
            first: indices.first().copied().unwrap_or(0),
            last: indices.last().copied().unwrap_or(0),
            count: indices.len() as u64,
            failed: failed as u64,
            offset,
            length,
            header_digest,
        };
        Ok((place, indices))
    }
}
