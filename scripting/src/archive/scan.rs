//! Finding the frames of an archive that has no usable index, by reading through it.

use std::collections::BTreeMap;

use super::blocks::{Block, BlockLabel, PointPlace, sort_places};
use super::encoding::{BlockPlace, decode, decode_snapshot};
use super::error::{ArchiveError, ArchiveWarning};
use super::layout::{Digest, FRAME_MAGIC, HEADER_LENGTH, Kind, START_LENGTH};
use super::model::{Label, RunHeader};
use super::reader::{Bytes, Entry, Placed, known_kind};
use super::stored::Sweep;
use super::sweep::{SweepRecord, point_of_name};

/// What reading through has found.
#[derive(Debug, Default)]
pub(crate) struct Found {
    pub run: Option<RunHeader>,
    pub run_digest: Option<Digest>,
    /// Every snapshot whose label could be read, damaged or not; reading it tells.
    pub entries: Vec<Entry>,
    pub warnings: Vec<ArchiveWarning>,
    pub whole_frames: usize,
    pub whole_snapshots: usize,
    /// The sweeps with their points, in the order in which they began.
    pub sweeps: Vec<Sweep>,
    /// Where the last whole frame ends.
    pub end: u64,
    /// The number that the next frame would have.
    pub next_ordinal: u64,
}

/// How much is searched at first for the next frame after damage, and at most at a time: the stretch
/// doubles, so that many small damages do not each cost a large read.
const STRIDE: std::ops::RangeInclusive<u64> = 1 << 12..=1 << 20;

/// Reads every frame between the start of the file and `end`, past damage where there is any.
///
/// Time and memory are linear in the length of the file, whatever its bytes claim.
pub(crate) fn scan(bytes: Bytes<'_>, end: u64) -> Result<Found, ArchiveError> {
    let mut found = Found::default();
    let mut seen = Seen::default();
    let mut expected: u64 = 0;
    let mut gap_explained = false;
    let mut at = START_LENGTH as u64;
    found.end = at;
    while at < end {
        let placed = match bytes.header(at, end)? {
            Some(placed) => placed,
            None => match next_header(bytes, at + 1, end)? {
                Some(next) => {
                    found.warnings.push(ArchiveWarning::DamagedBytes {
                        offset: at,
                        bytes: next - at,
                        after: seen.after.clone(),
                    });
                    gap_explained = true;
                    at = next;
                    continue;
                }
                None => {
                    torn(&mut found, at, end);
                    break;
                }
            },
        };
        let Some(next) = at.checked_add(placed.length).filter(|next| *next <= end) else {
            torn(&mut found, at, end);
            break;
        };
        let run = *found.run_digest.get_or_insert(placed.header.run);
        if placed.header.ordinal > expected && !gap_explained {
            found
                .warnings
                .push(ArchiveWarning::MissingFrames { count: placed.header.ordinal - expected, offset: at });
        }
        let in_place = placed.header.run == run && placed.header.ordinal >= expected;
        let whole = in_place && accept(bytes, &placed, &mut found, &mut seen)?;
        if whole {
            found.whole_frames += 1;
            found.end = next;
        } else if !found.warnings.last().is_some_and(|last| names_frame(last, at)) {
            found.warnings.push(ArchiveWarning::DamagedBytes {
                offset: at,
                bytes: placed.length,
                after: seen.after.clone(),
            });
        }
        if in_place {
            expected = placed.header.ordinal.saturating_add(1);
            gap_explained = false;
        }
        at = next;
    }
    found.next_ordinal = expected;
    for sweep in &mut found.sweeps {
        sort_places(&mut sweep.places);
    }
    Ok(found)
}

/// Whether the warning names the damaged frame at that byte already.
fn names_frame(warning: &ArchiveWarning, at: u64) -> bool {
    match warning {
        ArchiveWarning::DamagedSnapshot { offset, .. }
        | ArchiveWarning::DamagedPoints { offset, .. }
        | ArchiveWarning::DamagedSweep { offset, .. } => *offset == at,
        _ => false,
    }
}

/// What must be remembered while reading through.
#[derive(Default)]
struct Seen {
    /// Of every snapshot that no point stored, whether it is whole.
    names: BTreeMap<String, bool>,
    /// The last whole snapshot.
    after: Option<String>,
    /// The whole snapshots of points since the last whole block, which is to name them: place and header digest.
    waiting: BTreeMap<u64, Digest>,
}

/// Takes one frame whose header is undamaged and whose bytes are all there; false when it is damaged.
fn accept(
    bytes: Bytes<'_>,
    placed: &Placed,
    found: &mut Found,
    seen: &mut Seen,
) -> Result<bool, ArchiveError> {
    match known_kind(&placed.header, || format!("the frame at byte {}", placed.offset))? {
        Kind::Run => {
            let Some(run) = bytes.body(placed)?.and_then(|(payload, _)| decode(&payload, Kind::Run)) else {
                return Ok(false);
            };
            found.run = Some(run);
            Ok(true)
        }
        Kind::Index => Ok(bytes.body(placed)?.is_some()),
        Kind::Sweep => accept_sweep(bytes, placed, found),
        Kind::Points => accept_points(bytes, placed, found, seen),
        Kind::Snapshot => {
            let Some(label) = bytes.label::<Label>(placed)? else { return Ok(false) };
            let of_point = of_point(found, &label);
            // A snapshot whose first frame is damaged may have been stored again by a later run.
            if !of_point && seen.names.get(&label.name) == Some(&true) {
                return Ok(false);
            }
            let body = bytes.body(placed)?;
            let whole = body
                .and_then(|(payload, numbers)| decode_snapshot(&payload, &numbers))
                .is_some_and(|snapshot| snapshot.label == label);
            if !whole {
                found.warnings.push(ArchiveWarning::DamagedSnapshot {
                    name: label.name.clone(),
                    offset: placed.offset,
                });
            } else {
                seen.after = Some(label.name.clone());
            }
            if of_point {
                if whole {
                    seen.waiting.insert(placed.offset, placed.header.own_digest());
                }
                return Ok(whole);
            }
            found.whole_snapshots += usize::from(whole);
            if seen.names.insert(label.name.clone(), whole).is_some() {
                found.entries.retain(|entry| entry.label.name != label.name);
            }
            found.entries.push(Entry {
                label,
                offset: placed.offset,
                length: placed.length,
                header_digest: placed.header.own_digest(),
            });
            Ok(whole)
        }
    }
}

/// Whether a point of a sweep that has begun stored the snapshot of that label.
fn of_point(found: &Found, label: &Label) -> bool {
    point_of_name(&label.name).is_some_and(|(sweep, index, _)| {
        label.order.point == index
            && found.sweeps.iter().any(|each| each.name == sweep && each.step == label.order.step)
    })
}

/// Takes the description of a sweep: of a new one, of one whose points are all done now, or of one that begins anew.
fn accept_sweep(bytes: Bytes<'_>, placed: &Placed, found: &mut Found) -> Result<bool, ArchiveError> {
    let label: Option<String> = bytes.label(placed)?;
    let record = bytes.body(placed)?.and_then(|(payload, _)| decode::<SweepRecord>(&payload, Kind::Sweep));
    let Some(record) = record.filter(|record| Some(&record.start.name) == label.as_ref()) else {
        if let Some(name) = label {
            found.warnings.push(ArchiveWarning::DamagedSweep { name, offset: placed.offset });
        }
        return Ok(false);
    };
    let known = found.sweeps.iter_mut().find(|each| each.name == record.start.name);
    match known {
        Some(sweep) if sweep.record.as_ref().is_some_and(|known| known.same_points(&record)) => {
            sweep.record = Some(record);
        }
        // Its first description is damaged, and this is the one that follows its last point.
        Some(sweep)
            if sweep.record.is_none() && sweep.step == record.start.step && record.left_out.is_some() =>
        {
            sweep.record = Some(record);
        }
        Some(sweep) => *sweep = Sweep::of(record),
        None => found.sweeps.push(Sweep::of(record)),
    }
    Ok(true)
}

/// Takes a block of points.
fn accept_points(
    bytes: Bytes<'_>,
    placed: &Placed,
    found: &mut Found,
    seen: &mut Seen,
) -> Result<bool, ArchiveError> {
    let Some(label) = bytes.label::<BlockLabel>(placed)? else { return Ok(false) };
    let block = bytes.body(placed)?.and_then(|(payload, numbers)| Block::decode(&payload, &numbers));
    let Some(block) = block.filter(|block| *block.label() == label) else {
        found.warnings.push(ArchiveWarning::damaged_points(&label, placed.offset));
        return Ok(false);
    };
    let sweep = match found.sweeps.iter_mut().position(|each| each.name == label.sweep) {
        Some(at) => at,
        None => {
            // Its description is damaged: its points are readable all the same.
            found.sweeps.push(Sweep::unknown(label.sweep.clone(), label.step));
            found.sweeps.len() - 1
        }
    };
    let sweep = &mut found.sweeps[sweep];
    if sweep.step != label.step {
        return Ok(false);
    }
    // Fewer than 2^32 blocks: each takes more than a hundred bytes.
    let number = sweep.blocks.len() as u32;
    for (row, index) in block.indices().iter().enumerate() {
        sweep.places.push(PointPlace { index: *index, block: number, row: row as u32 });
        sweep.incomplete.remove(index);
    }
    for each in block.snapshots() {
        if seen.waiting.get(&each.offset) != Some(&each.header_digest) {
            sweep.incomplete.insert(block.indices()[each.row as usize]);
        }
    }
    seen.waiting.clear();
    sweep.blocks.push(BlockPlace {
        first: label.first,
        last: label.last,
        count: label.count,
        failed: label.failed,
        offset: placed.offset,
        length: placed.length,
        header_digest: placed.header.own_digest(),
    });
    Ok(true)
}

fn torn(found: &mut Found, at: u64, end: u64) {
    found.warnings.push(ArchiveWarning::TornTail {
        offset: at,
        bytes: end - at,
        whole_frames: found.whole_frames,
    });
}

/// Where the next undamaged frame header begins, from `at` on.
fn next_header(bytes: Bytes<'_>, mut at: u64, end: u64) -> Result<Option<u64>, ArchiveError> {
    let mut stride = *STRIDE.start();
    while end.saturating_sub(at) >= HEADER_LENGTH as u64 {
        // Overlaps the next stretch by one magic less a byte, so that none is cut in two.
        let length = (end - at).min(stride + FRAME_MAGIC.len() as u64 - 1);
        let stretch = bytes.take(at, length)?;
        for (position, window) in stretch.windows(FRAME_MAGIC.len()).enumerate() {
            let here = at + position as u64;
            if window == FRAME_MAGIC && bytes.header(here, end)?.is_some() {
                return Ok(Some(here));
            }
        }
        at += stride;
        stride = (stride * 2).min(*STRIDE.end());
    }
    Ok(None)
}
