//! Flipped, cut, spliced and hostile files through the public reader: damage is reported, and what is
//! returned is exactly what was written.

use super::sample;
use crate::archive::blocks::BlockLabel;
use crate::archive::encoding::{
    Index, IndexEntry, decode_label, decode_snapshot, sections, snapshot_sections,
};
use crate::archive::layout::{
    FOOTER_LENGTH, Footer, HEADER_LENGTH, Header, Kind, START_LENGTH, digest, start_bytes,
};
use crate::archive::*;

fn finished() -> Vec<u8> {
    let folder = tempfile::tempdir().unwrap();
    std::fs::read(sample::write_finished(folder.path())).unwrap()
}

fn unfinished() -> Vec<u8> {
    let folder = tempfile::tempdir().unwrap();
    std::fs::read(sample::write_unfinished(folder.path())).unwrap()
}

/// Everything of an archive with a sweep, as bytes of text, held against what was written: the points that were read,
/// the snapshots of points among them, and whether anything at all was reported as amiss.
fn check_swept(bytes: Vec<u8>, what: &str) -> (usize, usize, bool) {
    let Ok(archive) = Archive::from_bytes(bytes) else { return (0, 0, true) };
    let mut reported = archive.is_damaged() || archive.run().is_err();
    for index in 0..archive.entries().len() {
        match archive.snapshot_at(index) {
            Ok(snapshot) => {
                let original = [sample::snapshot("light J-V", 0), sample::failed("bands", 2)]
                    .into_iter()
                    .find(|each| each.name() == snapshot.name());
                assert_eq!(compare_bits(&original.unwrap(), &snapshot), [], "{what}");
            }
            Err(_) => reported = true,
        }
    }
    let (mut points, mut snapshots) = (0, 0);
    for sweep in archive.sweeps() {
        assert_eq!(sweep.name, "map", "{what}");
        if let Some(record) = sweep.record() {
            assert_eq!(record.start, sample::sweep_start(), "{what}");
        }
        for stored in archive.points(sweep) {
            let Ok(stored) = stored else {
                reported = true;
                continue;
            };
            let original =
                sample::points().into_iter().find(|each| each.index == stored.point.index).unwrap();
            let written = Point { snapshots: Vec::new(), ..original.clone() };
            assert_eq!(format!("{:?}", stored.point), format!("{written:?}"), "{what}");
            points += 1;
            for (place, original) in stored.snapshots.iter().zip(&original.snapshots) {
                match archive.point_snapshot(place) {
                    Ok(snapshot) => {
                        assert_eq!(compare_bits(original, &snapshot), [], "{what}");
                        snapshots += 1;
                    }
                    Err(_) => reported = true,
                }
            }
        }
    }
    (points, snapshots, reported)
}

/// Every byte of an archive with a sweep matters: each flip is reported, nothing wrong is read, and no more is lost than
/// the block or the snapshot that the byte belongs to.
#[test]
fn every_flipped_byte_of_an_archive_with_a_sweep_is_reported() {
    let folder = tempfile::tempdir().unwrap();
    let finished = std::fs::read(sample::write_swept_finished(folder.path())).unwrap();
    let unfinished = std::fs::read(sample::write_swept_unfinished(folder.path())).unwrap();
    for (bytes, least) in [(finished, 0), (unfinished, 4)] {
        assert_eq!(check_swept(bytes.clone(), "untouched"), (7, 4, false));
        for place in 0..bytes.len() {
            for pattern in [0x01, 0x80] {
                let mut flipped = bytes.clone();
                flipped[place] ^= pattern;
                let what = format!("byte {place} ^ {pattern:#x}");
                let (points, snapshots, reported) = check_swept(flipped, &what);
                assert!(reported, "{what} went unnoticed");
                // a damaged block loses its points, a damaged snapshot itself, and each nothing else
                let lost_one = points == 7 && snapshots >= 3 || points >= least;
                assert!(
                    place < START_LENGTH || lost_one,
                    "{what}: {points} points, {snapshots} snapshots left"
                );
            }
        }
    }
}

/// A file with a sweep cut anywhere opens to the points of its whole blocks and says so.
#[test]
fn a_sweep_cut_at_any_length_keeps_its_whole_blocks() {
    let folder = tempfile::tempdir().unwrap();
    for bytes in [sample::write_swept_unfinished(folder.path()), {
        sample::write_swept_finished(&tempfile::tempdir_in(folder.path()).unwrap().keep())
    }]
    .map(|file| std::fs::read(file).unwrap())
    {
        let ends = frame_ends(&bytes);
        let blocks: Vec<(usize, usize)> = ends
            .windows(2)
            .filter_map(|pair| {
                let header =
                    Header::from_bytes(bytes[pair[0]..pair[0] + HEADER_LENGTH].try_into().unwrap()).unwrap();
                let label = HEADER_LENGTH + pair[0]..HEADER_LENGTH + pair[0] + header.label as usize;
                let label: BlockLabel =
                    (header.kind == Kind::Points.number()).then(|| decode_label(&bytes[label]).unwrap())?;
                Some((pair[1], label.count as usize))
            })
            .collect();
        assert_eq!(blocks.iter().map(|block| block.1).sum::<usize>(), 7);
        for length in 0..bytes.len() {
            let what = format!("cut at {length}");
            let archive = Archive::from_bytes(bytes[..length].to_vec());
            let read = archive.map_or(0, |archive| {
                assert!(!archive.warnings().is_empty());
                archive.sweeps().iter().map(Sweep::count).sum::<u64>()
            });
            let whole: usize = blocks.iter().filter(|block| block.0 <= length).map(|block| block.1).sum();
            assert_eq!(read, whole as u64, "{what}");
            check_swept(bytes[..length].to_vec(), &what);
        }
    }
}

/// Opens the bytes and holds everything that comes out against what was written. Returns the names of the
/// snapshots that were read, and whether anything at all was reported as amiss.
fn check(bytes: Vec<u8>, what: &str) -> (Vec<String>, bool) {
    let written = sample::snapshots();
    let archive = match Archive::from_bytes(bytes) {
        Ok(archive) => archive,
        Err(_) => return (Vec::new(), true),
    };
    let mut reported = !archive.warnings().is_empty();
    match archive.run() {
        Ok(run) => assert!(*run == sample::run() || reported, "{what}: another run, unreported"),
        Err(_) => reported = true,
    }
    let mut read = Vec::new();
    for index in 0..archive.entries().len() {
        match archive.snapshot_at(index) {
            Ok(snapshot) => {
                let original = written.iter().find(|each| each.name() == snapshot.name());
                let original = original.unwrap_or_else(|| panic!("{what}: invented {}", snapshot.name()));
                assert_eq!(compare_bits(original, &snapshot), [], "{what}");
                read.push(snapshot.name().to_owned());
            }
            Err(_) => reported = true,
        }
    }
    read.sort();
    read.dedup();
    (read, reported)
}

/// Every byte of a finished archive matters, so each flip must be reported; at most one snapshot is lost.
#[test]
fn every_flipped_byte_of_a_finished_archive_is_reported() {
    let bytes = finished();
    assert_eq!(
        check(bytes.clone(), "untouched"),
        (vec!["bands".into(), "dark J-V".into(), "light J-V".into()], false)
    );
    for place in 0..bytes.len() {
        for pattern in [0x01, 0x80, 0xff] {
            let mut flipped = bytes.clone();
            flipped[place] ^= pattern;
            let (read, reported) = check(flipped, &format!("byte {place} ^ {pattern:#x}"));
            assert!(reported, "byte {place} ^ {pattern:#x} went unnoticed");
            assert!(place < START_LENGTH || read.len() >= 2, "byte {place}: only {read:?} left");
        }
    }
}

/// The same for the unfinished file of a killed run: there the reader must say `not finished` and more.
#[test]
fn every_flipped_byte_of_an_unfinished_archive_is_reported() {
    let bytes = unfinished();
    assert_eq!(Archive::from_bytes(bytes.clone()).unwrap().warnings().len(), 1);
    for place in 0..bytes.len() {
        for pattern in [0x01, 0x80, 0xff] {
            let mut flipped = bytes.clone();
            flipped[place] ^= pattern;
            let (read, _) = check(flipped.clone(), &format!("byte {place} ^ {pattern:#x}"));
            assert!(place < START_LENGTH || read.len() >= 2, "byte {place}: only {read:?} left");
            let damaged = Archive::from_bytes(flipped).map_or(true, |archive| archive.is_damaged());
            assert!(damaged, "byte {place} ^ {pattern:#x} went unnoticed");
        }
    }
}

/// Where each frame ends, by the lengths in the headers alone.
fn frame_ends(bytes: &[u8]) -> Vec<usize> {
    let mut at = START_LENGTH;
    let mut ends = Vec::new();
    while let Some(header) = bytes.get(at..at + HEADER_LENGTH) {
        let Some(header) = Header::from_bytes(header.try_into().unwrap()) else { break };
        at += header.frame_length().unwrap() as usize;
        ends.push(at);
    }
    ends
}

/// A file cut anywhere opens to exactly the frames that lie whole before the cut, and says so.
#[test]
fn a_file_cut_at_any_length_gives_its_whole_frames_and_a_warning() {
    for (bytes, before) in [(finished(), 1), (unfinished(), 2)] {
        let ends = frame_ends(&bytes);
        for length in 0..bytes.len() {
            let what = format!("cut at {length}");
            let (read, reported) = check(bytes[..length].to_vec(), &what);
            assert!(reported, "{what}");
            let whole = ends.iter().filter(|end| **end <= length).count();
            assert_eq!(read.len(), whole.saturating_sub(before).min(3), "{what}");
            match Archive::from_bytes(bytes[..length].to_vec()) {
                Ok(archive) => {
                    let at_end = ends.contains(&length);
                    let torn = archive
                        .warnings()
                        .iter()
                        .any(|each| matches!(each, ArchiveWarning::TornTail { whole_frames, .. } if *whole_frames == whole));
                    assert_ne!(at_end, torn, "{what}: {:?}", archive.warnings());
                }
                Err(ArchiveError::NoWholeFrame { .. }) => assert_eq!(whole, 0, "{what}"),
                Err(error) => panic!("{what}: {error}"),
            }
        }
    }
}

/// A damaged snapshot is refused by its name, from the index and from its label.
#[test]
fn a_damaged_frame_is_refused_by_name() {
    for bytes in [finished(), unfinished()] {
        let archive = Archive::from_bytes(bytes.clone()).unwrap();
        let entry = archive.entries().iter().find(|entry| entry.label.name == "light J-V").unwrap();
        let mut damaged = bytes.clone();
        damaged[(entry.offset + entry.length) as usize - 3] ^= 4;
        let archive = Archive::from_bytes(damaged).unwrap();
        match archive.snapshot("light J-V") {
            Err(ArchiveError::DamagedSnapshot { name, .. }) => assert_eq!(name, "light J-V"),
            other => panic!("{other:?}"),
        }
        assert!(archive.snapshot("dark J-V").is_ok());
        assert_eq!(archive.verify().unwrap().len(), 1);
    }
}

/// A power cut can leave a tail of zeros or old blocks after the last sync: it is a torn tail.
#[test]
fn a_tail_of_zeros_or_rubbish_is_a_torn_tail() {
    for tail in [vec![0_u8; 5000], b"\xE7frame\r\n".repeat(600)] {
        let mut bytes = unfinished();
        bytes.extend(&tail);
        let archive = Archive::from_bytes(bytes).unwrap();
        assert_eq!(archive.entries().len(), 3);
        let torn = ArchiveWarning::TornTail {
            offset: unfinished().len() as u64,
            bytes: tail.len() as u64,
            whole_frames: 5,
        };
        assert!(archive.warnings().contains(&torn), "{:?}", archive.warnings());
    }
}

/// Frames taken out, doubled, or brought in from another run are seen: each carries its number and its run.
#[test]
fn frames_taken_out_doubled_or_foreign_are_seen() {
    let bytes = unfinished();
    let ends = frame_ends(&bytes);
    let without = [&bytes[..ends[2]], &bytes[ends[3]..]].concat();
    let archive = Archive::from_bytes(without).unwrap();
    assert_eq!(archive.entries().len(), 2);
    assert!(archive.warnings().contains(&ArchiveWarning::MissingFrames { count: 1, offset: ends[2] as u64 }));

    let doubled = [&bytes[..], &bytes[ends[3]..]].concat();
    let archive = Archive::from_bytes(doubled).unwrap();
    assert_eq!(archive.entries().len(), 3);
    assert!(archive.is_damaged());

    let other = finished();
    let foreign = [&bytes[..], &other[frame_ends(&other)[0]..frame_ends(&other)[1]]].concat();
    let archive = Archive::from_bytes(foreign).unwrap();
    assert_eq!(archive.entries().len(), 3);
    assert!(archive.is_damaged());
}

/// An older description of the run, appended again, must not replace the later one: its number is too low.
#[test]
fn a_frame_that_comes_again_does_not_count() {
    let bytes = unfinished();
    let again = [&bytes[..], &bytes[START_LENGTH..frame_ends(&bytes)[0]]].concat();
    let archive = Archive::from_bytes(again).unwrap();
    assert!(archive.is_damaged());
    assert_eq!(archive.run().unwrap(), &sample::run());
}

/// The frame of that header with other bytes for a header, which leaves every other digest valid.
fn resealed(bytes: &[u8], at: usize, change: impl Fn(Header) -> Header) -> Vec<u8> {
    let header = Header::from_bytes(bytes[at..at + HEADER_LENGTH].try_into().unwrap()).unwrap();
    let mut out = bytes.to_vec();
    out[at..at + HEADER_LENGTH].copy_from_slice(&change(header).to_bytes());
    out
}

/// A frame that is whole in itself but of another run, or not the one that the index or the footer means, is
/// refused: each names the next by its digest.
#[test]
fn whole_frames_in_the_wrong_place_are_refused() {
    let bytes = unfinished();
    let last = frame_ends(&bytes)[3];
    let foreign = resealed(&bytes, last, |header| Header { run: [9; 16], ..header });
    let archive = Archive::from_bytes(foreign).unwrap();
    assert_eq!(archive.entries().len(), 2);
    assert!(archive.is_damaged());

    let bytes = finished();
    let ends = frame_ends(&bytes);
    let other = resealed(&bytes, ends[1], |header| Header { ordinal: 40, ..header });
    let archive = Archive::from_bytes(other).unwrap();
    assert!(matches!(archive.snapshot("bands"), Err(ArchiveError::DamagedSnapshot { .. })));
    assert!(archive.snapshot("light J-V").is_ok());

    let index = resealed(&bytes, ends[3], |header| Header { ordinal: 40, ..header });
    let archive = Archive::from_bytes(index).unwrap();
    assert!(archive.warnings().contains(&ArchiveWarning::DamagedIndex));
    assert_eq!(archive.verify().unwrap(), []);
}

/// Numbers that no column claims, or too few for the columns, make no snapshot.
#[test]
fn the_number_block_must_fit_the_tables_exactly() {
    let made = snapshot_sections(&sample::snapshot("light J-V", 0)).unwrap();
    let header = made.header(0, [0; 16]);
    let frame = made.frame(&header);
    let body = &frame[HEADER_LENGTH + header.label_length() as usize..];
    let (payload, numbers) = body.split_at((header.payload as usize).next_multiple_of(8));
    let payload = &payload[..header.payload as usize];
    assert!(decode_snapshot(payload, numbers).is_some());
    assert!(decode_snapshot(payload, &[numbers, &[0; 8]].concat()).is_none());
    assert!(decode_snapshot(payload, &numbers[8..]).is_none());
}

/// Files of other kinds are foreign, and text is not taken for an archive.
#[test]
fn other_files_are_foreign() {
    for bytes in [b"let x = 1;".to_vec(), b"PK\x03\x04".to_vec(), vec![0; 4096]] {
        assert!(matches!(Archive::from_bytes(bytes), Err(ArchiveError::Foreign { .. })));
    }
    let folder = tempfile::tempdir().unwrap();
    assert!(matches!(Archive::open(folder.path()), Err(ArchiveError::Foreign { .. })));
    assert!(matches!(
        Archive::open(&folder.path().join("none.epiloom")),
        Err(ArchiveError::Io { action: "open", .. })
    ));
}

fn resealed_start(version: u32) -> Vec<u8> {
    let mut bytes = finished();
    bytes[8..12].copy_from_slice(&version.to_le_bytes());
    let sum = digest(&bytes[..16]);
    bytes[16..32].copy_from_slice(&sum);
    bytes
}

/// A later container, kind or schema is named with both numbers and not guessed at.
#[test]
fn newer_formats_are_refused_with_both_numbers() {
    match Archive::from_bytes(resealed_start(9)) {
        Err(ArchiveError::Newer { found: 9, known: 1, .. }) => {}
        other => panic!("{other:?}"),
    }
    let bytes = unfinished();
    let at = frame_ends(&bytes)[1];
    let header = Header::from_bytes(bytes[at..at + HEADER_LENGTH].try_into().unwrap()).unwrap();
    for changed in [Header { schema: 9, ..header.clone() }, Header { kind: 77, ..header }] {
        let mut newer = bytes.clone();
        newer[at..at + HEADER_LENGTH].copy_from_slice(&changed.to_bytes());
        assert!(matches!(Archive::from_bytes(newer), Err(ArchiveError::Newer { .. })));
    }
}

/// Lengths that were sealed by an attacker must neither allocate nor overflow: the file is a few kilobytes.
#[test]
fn sealed_hostile_lengths_are_refused() {
    let bytes = unfinished();
    let at = frame_ends(&bytes)[1];
    let header = Header::from_bytes(bytes[at..at + HEADER_LENGTH].try_into().unwrap()).unwrap();
    for big in [1 << 40, u64::MAX / 8, u64::MAX - 7, u64::MAX] {
        for changed in [
            Header { payload: big, ..header.clone() },
            Header { numbers: big, ..header.clone() },
            Header { payload: big, numbers: big, ..header.clone() },
            Header { label: u32::MAX, ..header.clone() },
            Header { ordinal: big, ..header.clone() },
        ] {
            let mut hostile = bytes.clone();
            hostile[at..at + HEADER_LENGTH].copy_from_slice(&changed.to_bytes());
            let (read, _) = check(hostile.clone(), "hostile header");
            assert!(read.len() <= 3);
            assert!(Archive::from_bytes(hostile).map_or(true, |archive| archive.is_damaged()));
        }
    }
}

/// A sealed frame whose payload claims a vector of 2^60 entries, or leaves bytes over, is damaged.
#[test]
fn sealed_hostile_payloads_are_refused() {
    let run = sections(Kind::Run, "run", &sample::run()).unwrap();
    let id = run.body_digest();
    let start = [&start_bytes()[..], &run.frame(&run.header(0, id))].concat();
    let claim = (1_u64 << 60, [0_u8; 32]);
    let trailing = (sample::run(), 1_u8);
    let hostile =
        [sections(Kind::Run, "claim", &claim).unwrap(), sections(Kind::Run, "trailing", &trailing).unwrap()];
    for made in hostile {
        let bytes = [&start[..], &made.frame(&made.header(1, id))].concat();
        let archive = Archive::from_bytes(bytes).unwrap();
        assert!(archive.is_damaged());
        assert_eq!(archive.run().unwrap(), &sample::run());
    }
}

/// An index that points outside, or to another snapshot than it names, gives an error, never that snapshot.
#[test]
fn a_lying_index_gives_errors() {
    let bytes = finished();
    let at = bytes.len() - FOOTER_LENGTH;
    let footer = Footer::from_bytes(bytes[at..].try_into().unwrap()).unwrap();
    let archive = Archive::from_bytes(bytes.clone()).unwrap();
    let honest: Vec<IndexEntry> = archive
        .entries()
        .iter()
        .map(|entry| IndexEntry {
            label: entry.label.clone(),
            offset: entry.offset,
            length: entry.length,
            header_digest: entry.header_digest,
        })
        .collect();
    let run = Header::from_bytes(bytes[START_LENGTH..START_LENGTH + HEADER_LENGTH].try_into().unwrap())
        .unwrap()
        .run;
    let with = |entries: Vec<IndexEntry>| {
        let made =
            sections(Kind::Index, "index", &Index { entries: entries.clone(), sweeps: Vec::new() }).unwrap();
        let header = made.header(4, run);
        let mut lying = bytes[..footer.index as usize].to_vec();
        lying.extend(made.frame(&header));
        let end = Footer {
            index: footer.index,
            length: (lying.len() + FOOTER_LENGTH) as u64,
            snapshots: entries.len() as u64,
            index_digest: header.own_digest(),
        };
        lying.extend(end.to_bytes());
        lying
    };
    assert_eq!(check(with(honest.clone()), "honest").0.len(), 3);
    let mut swapped = honest.clone();
    swapped[0].label.name = "dark J-V".to_owned();
    let archive = Archive::from_bytes(with(swapped)).unwrap();
    assert!(matches!(archive.snapshot_at(0), Err(ArchiveError::DamagedSnapshot { .. })));
    for offset in [0, 31, footer.index - 1, u64::MAX - 3, u64::MAX] {
        let mut outside = honest.clone();
        outside[1].offset = offset;
        let (_, reported) = check(with(outside), "outside");
        assert!(reported, "offset {offset}");
    }
}
