//! Sweeps and their points in an archive that is being written.

use crate::archive::blocks::{BLOCK_BYTES, BLOCK_POINTS, PointPlace, sort_places, weight};
use crate::archive::encoding::{sections, snapshot_sections};
use crate::archive::error::ArchiveError;
use crate::archive::frames::{Batch, label_weight, record_sections};
use crate::archive::layout::Kind;
use crate::archive::resume::EarlierPoints;
use crate::archive::stored::Sweep;
use crate::archive::sweep::{
    Point, SnapshotPlace, StoredPoint, SweepRecord, SweepStart, point_of_name, point_order,
    point_snapshot_name,
};

use super::{Writer, Written, WrittenSweep};

impl Writer<'_> {
    /// Begins a sweep, and gives those of its points that an earlier run has stored.
    ///
    /// # Errors
    /// [`ArchiveError::NameTaken`] and those of [`append`](Writer::append).
    pub fn begin_sweep(&mut self, start: &SweepStart) -> Result<EarlierPoints, ArchiveError> {
        self.check()?;
        self.settle()?;
        let of_point = point_snapshot_name(&start.name, 0, "");
        if point_of_name(&of_point).is_none_or(|(sweep, ..)| sweep != start.name) {
            return Err(ArchiveError::Encoding {
                what: format!("the sweep `{}`", start.name),
                reason: "its name reads as that of a point of a sweep".to_owned(),
            });
        }
        let of_its_points = |each: &Written| {
            each.current && point_of_name(&each.place.label.name).is_some_and(|(of, ..)| of == start.name)
        };
        if self.name_taken(&start.name) || self.written.iter().any(of_its_points) {
            return Err(ArchiveError::NameTaken { name: start.name.clone() });
        }
        let run = sections(Kind::Run, "the description of the run", &self.known)?.body_digest();
        self.begin(SweepRecord { start: start.clone(), share: self.share, run, left_out: None })
    }

    /// Begins a sweep as another archive of the same run describes it.
    pub(crate) fn adopt_sweep(&mut self, record: &SweepRecord) -> Result<EarlierPoints, ArchiveError> {
        self.check()?;
        self.settle()?;
        self.begin(record.clone())
    }

    fn begin(&mut self, record: SweepRecord) -> Result<EarlierPoints, ArchiveError> {
        let known = self.sweeps.iter().position(|each| each.sweep.name == record.start.name);
        let same = |each: &WrittenSweep| {
            !each.sweep.in_doubt && each.sweep.record().is_some_and(|known| known.same_points(&record))
        };
        let at = match known {
            Some(at) if same(&self.sweeps[at]) => {
                self.sweeps[at].current = true;
                at
            }
            other => {
                self.append_record(&record)?;
                let begun = WrittenSweep { sweep: Sweep::of(record), current: true };
                match other {
                    Some(at) => {
                        self.sweeps[at] = begun;
                        at
                    }
                    None => {
                        self.sweeps.push(begun);
                        self.sweeps.len() - 1
                    }
                }
            }
        };
        EarlierPoints::of(&self.held, &self.unfinished, self.run, &self.sweeps[at].sweep)
    }

    /// Stores points of a sweep that was begun, with what they stored, and syncs: they survive a power cut from here
    /// on. A power cut before loses these points and no others.
    ///
    /// # Errors
    /// As [`append`](Writer::append).
    pub fn append_points(&mut self, sweep: &str, mut points: Vec<Point>) -> Result<(), ArchiveError> {
        self.check()?;
        let begun = self.sweeps.iter().position(|each| each.current && each.sweep.name == sweep);
        let start = begun.and_then(|at| self.sweeps[at].sweep.record().map(|record| record.start.clone()));
        let (Some(at), Some(start)) = (begun, start) else {
            return Err(ArchiveError::NoSuchSweep { name: sweep.to_owned(), there: Vec::new() });
        };
        points.sort_by_key(|point| point.index);
        let mut batch = Batch::new(self.length, self.ordinal, self.run);
        let mut waiting: Vec<StoredPoint> = Vec::new();
        let mut weighed = 0;
        let mut blocks = Vec::new();
        for mut point in points {
            let snapshots = std::mem::take(&mut point.snapshots);
            let labels: usize = snapshots.iter().map(|snapshot| label_weight(&snapshot.label)).sum();
            let weight = weight(&point, labels);
            if !waiting.is_empty() && (waiting.len() >= BLOCK_POINTS || weighed + weight > BLOCK_BYTES) {
                blocks.push(batch.block(&start, std::mem::take(&mut waiting))?);
                weighed = 0;
            }
            weighed += weight;
            let mut places: Vec<SnapshotPlace> = Vec::new();
            for snapshot in &snapshots {
                let name = snapshot.name();
                let inside = point_of_name(name).and_then(|(_, _, inside)| inside).unwrap_or_default();
                let expected = point_snapshot_name(sweep, point.index, inside);
                if name != expected || snapshot.label.order != point_order(start.step, point.index) {
                    return Err(ArchiveError::Encoding {
                        what: format!("snapshot `{name}` of point {} of the sweep `{sweep}`", point.index),
                        reason: "it is not named and ordered as a point's".to_owned(),
                    });
                }
                if places.iter().any(|place| place.label.name == name) {
                    return Err(ArchiveError::NameTaken { name: name.to_owned() });
                }
                let (offset, length, header_digest) = batch.frame(&snapshot_sections(snapshot)?);
                places.push(SnapshotPlace { label: snapshot.label.clone(), offset, length, header_digest });
            }
            waiting.push(StoredPoint { point, snapshots: places });
        }
        if !waiting.is_empty() {
            blocks.push(batch.block(&start, waiting)?);
        }
        self.put(&batch.bytes)?;
        self.ordinal = batch.ordinal;
        self.sync()?;
        let sweep = &mut self.sweeps[at].sweep;
        for (place, indices) in blocks {
            // Fewer than 2^32 blocks: each takes more than a hundred bytes.
            let block = sweep.blocks.len() as u32;
            sweep.blocks.push(place);
            for (row, index) in indices.into_iter().enumerate() {
                sweep.places.push(PointPlace { index, block, row: row as u32 });
                sweep.incomplete.remove(&index);
            }
        }
        Ok(())
    }

    /// All points of this run's share of the sweep are done; `left_out` counts the indices of the share that the
    /// filter of its plan leaves out.
    ///
    /// # Errors
    /// As [`append`](Writer::append).
    pub fn finish_sweep(&mut self, sweep: &str, left_out: u64) -> Result<(), ArchiveError> {
        self.check()?;
        let begun = self.sweeps.iter().position(|each| each.current && each.sweep.name == sweep);
        let record = begun.and_then(|at| self.sweeps[at].sweep.record.clone().map(|record| (at, record)));
        let Some((at, record)) = record else {
            return Err(ArchiveError::NoSuchSweep { name: sweep.to_owned(), there: Vec::new() });
        };
        sort_places(&mut self.sweeps[at].sweep.places);
        if record.left_out == Some(left_out) {
            return Ok(());
        }
        let record = SweepRecord { left_out: Some(left_out), ..record };
        self.append_record(&record)?;
        self.sweeps[at].sweep.record = Some(record);
        self.sync()
    }

    fn append_record(&mut self, record: &SweepRecord) -> Result<(), ArchiveError> {
        let made = record_sections(record)?;
        self.append_frame(&made).map(|_| ())
    }
}
