//! Finding the frames of an archive that has no usable index, by reading through it.

use std::collections::BTreeSet;

use super::encoding::{decode, decode_snapshot};
use super::error::{ArchiveError, ArchiveWarning};
use super::layout::{Digest, FRAME_MAGIC, HEADER_LENGTH, Kind, START_LENGTH};
use super::model::RunHeader;
use super::reader::{Bytes, Entry, Placed, known_kind};

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
}

/// How much is searched at first for the next frame after damage, and at most at a time: the stretch
/// doubles, so that many small damages do not each cost a large read.
const STRIDE: std::ops::RangeInclusive<u64> = 1 << 12..=1 << 20;

/// Reads every frame between the start of the file and `end`, past damage where there is any.
///
/// Time and memory are linear in the length of the file, whatever its bytes claim.
pub(crate) fn scan(bytes: Bytes<'_>, end: u64) -> Result<Found, ArchiveError> {
    let mut found = Found::default();
    let mut names = BTreeSet::new();
    let mut after = None;
    let mut expected: u64 = 0;
    let mut gap_explained = false;
    let mut at = START_LENGTH as u64;
    while at < end {
        let placed = match bytes.header(at, end)? {
            Some(placed) => placed,
            None => match next_header(bytes, at + 1, end)? {
                Some(next) => {
                    found.warnings.push(ArchiveWarning::DamagedBytes {
                        offset: at,
                        bytes: next - at,
                        after: after.clone(),
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
        let whole = in_place && accept(bytes, &placed, &mut found, &mut names, &mut after)?;
        if whole {
            found.whole_frames += 1;
        } else if !matches!(found.warnings.last(), Some(ArchiveWarning::DamagedSnapshot { offset, .. }) if *offset == at)
        {
            found.warnings.push(ArchiveWarning::DamagedBytes {
                offset: at,
                bytes: placed.length,
                after: after.clone(),
            });
        }
        if in_place {
            expected = placed.header.ordinal.saturating_add(1);
            gap_explained = false;
        }
        at = next;
    }
    Ok(found)
}

/// Takes one frame whose header is undamaged and whose bytes are all there; false when it is damaged.
fn accept(
    bytes: Bytes<'_>,
    placed: &Placed,
    found: &mut Found,
    names: &mut BTreeSet<String>,
    after: &mut Option<String>,
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
        Kind::Snapshot => {
            let Some(label) = bytes.label(placed)? else { return Ok(false) };
            if !names.insert(label.name.clone()) {
                return Ok(false);
            }
            let body = bytes.body(placed)?;
            let whole = body
                .and_then(|(payload, numbers)| decode_snapshot(&payload, &numbers))
                .is_some_and(|snapshot| snapshot.label == label);
            if whole {
                found.whole_snapshots += 1;
                *after = Some(label.name.clone());
            } else {
                found.warnings.push(ArchiveWarning::DamagedSnapshot {
                    name: label.name.clone(),
                    offset: placed.offset,
                });
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
