//! What is read is what was written.

use std::path::Path;
use std::sync::Arc;
use std::sync::atomic::{AtomicU64, Ordering};

use proptest::prelude::*;

use super::sample;
use crate::archive::encoding::{decode_snapshot, snapshot_sections};
use crate::archive::layout::{HEADER_LENGTH, Header, MAGIC};
use crate::archive::reader::Source;
use crate::archive::*;

/// The snapshots handed to the writer are the source of truth; bits are compared, so there is no tolerance.
#[test]
fn a_finished_archive_gives_back_every_bit_in_order() {
    let folder = tempfile::tempdir().unwrap();
    let archive = Archive::open(&sample::write_finished(folder.path())).unwrap();
    assert!(archive.is_finished());
    assert_eq!(archive.warnings(), []);
    assert_eq!(archive.run().unwrap(), &sample::run());
    let names: Vec<&str> = archive.entries().iter().map(|entry| entry.label.name.as_str()).collect();
    assert_eq!(names, ["light J-V", "bands", "dark J-V"]);
    for written in sample::snapshots() {
        let read = archive.snapshot(written.name()).unwrap();
        assert_eq!(compare_bits(&written, &read), []);
    }
    assert_eq!(archive.verify().unwrap(), []);
    assert!(!unfinished_path(&folder.path().join("run.epiloom")).exists());
}

/// The order of completion must not show in the finished bytes (the promise of the format).
#[test]
fn the_finished_bytes_do_not_depend_on_the_order_of_completion_or_of_header_updates() {
    let folder = tempfile::tempdir().unwrap();
    let bytes = std::fs::read(sample::write_finished(folder.path())).unwrap();
    let other = folder.path().join("other.epiloom");
    let mut writer = Writer::create(&other, &RunHeader::default()).unwrap().sync_every(2);
    for snapshot in sample::snapshots().into_iter().rev() {
        writer.append(&snapshot).unwrap();
        writer.update_run(&sample::run()).unwrap();
    }
    writer.finish(&sample::run()).unwrap();
    assert_eq!(std::fs::read(other).unwrap(), bytes);
}

/// Names near a mistyped one are offered; an unknown one gets none.
#[test]
fn a_name_that_is_not_there_is_answered_with_near_ones() {
    let folder = tempfile::tempdir().unwrap();
    let archive = Archive::open(&sample::write_finished(folder.path())).unwrap();
    match archive.snapshot("ligth j-v") {
        Err(ArchiveError::NoSuchSnapshot { near, .. }) => assert_eq!(near.first().unwrap(), "light J-V"),
        other => panic!("{other:?}"),
    }
    match archive.snapshot("zzz") {
        Err(ArchiveError::NoSuchSnapshot { near, .. }) => assert!(near.is_empty(), "{near:?}"),
        other => panic!("{other:?}"),
    }
    assert!(matches!(archive.snapshot_at(3), Err(ArchiveError::NoSuchIndex { index: 3, count: 3 })));
}

/// One bit of one number is one difference, and it is named.
#[test]
fn comparing_names_the_number_that_moved() {
    let first = sample::snapshot("light J-V", 0);
    assert_eq!(compare_bits(&first, &first.clone()), []);
    let mut second = first.clone();
    second.tables[0].columns[0].values[2] = 0.0; // was -0.0
    second.figures[0].value = Some(1.0421000000000002);
    second.materials[0].source = "the script".to_owned();
    let places: Vec<String> = compare_bits(&first, &second).into_iter().map(|each| each.place).collect();
    assert_eq!(
        places,
        [
            "figure voc, value",
            "table points, column voltage_V, row 2",
            "material value gap of GaAs in layer base, source",
        ]
    );
}

/// Bytes that count how many of them were read.
#[derive(Debug)]
struct Counted(Vec<u8>, Arc<AtomicU64>);

impl Source for Counted {
    fn length(&self) -> u64 {
        self.0.length()
    }

    fn read_at(&self, offset: u64, buffer: &mut [u8]) -> std::io::Result<()> {
        self.1.fetch_add(buffer.len() as u64, Ordering::Relaxed);
        self.0.read_at(offset, buffer)
    }
}

/// The layout's own sizes are the source of truth: opening one snapshot of many reads the start, the run, the
/// index, the footer and that one frame.
#[test]
fn one_snapshot_of_many_is_read_without_the_others() {
    let folder = tempfile::tempdir().unwrap();
    let path = folder.path().join("many.epiloom");
    let mut writer = Writer::create(&path, &sample::run()).unwrap().sync_every(1000);
    for step in 0..100 {
        writer.append(&sample::snapshot(&format!("point {step}"), step)).unwrap();
    }
    let bytes = std::fs::read(writer.finish(&sample::run()).unwrap()).unwrap();
    let length = bytes.len() as u64;
    let read = Arc::new(AtomicU64::new(0));
    let archive = Archive::from_source(Box::new(Counted(bytes, read.clone())), Path::new("many")).unwrap();
    let snapshots: u64 = archive.entries().iter().map(|entry| entry.length).sum();
    let one = archive.snapshot("point 57").map(|_| archive.entries()[57].length).unwrap();
    // The magic once more, and nothing else twice.
    let most = length - snapshots + one + MAGIC.len() as u64;
    assert!(read.load(Ordering::Relaxed) <= most, "{read:?} of {length}, {most} allowed");
}

/// Kept true by the compiler: runs and readers on several threads share them.
#[test]
fn writers_move_between_threads_and_readers_are_shared() {
    fn moves<T: Send>() {}
    fn shared<T: Send + Sync>() {}
    moves::<Writer<'static>>();
    shared::<Archive>();
}

fn numbers() -> impl Strategy<Value = f64> {
    any::<u64>().prop_map(f64::from_bits)
}

fn values() -> impl Strategy<Value = crate::archive::Value> {
    use crate::archive::Value;
    prop_oneof![
        (numbers(), ".{0,6}").prop_map(|(value, unit)| Value::Number { value, unit }),
        ".{0,12}".prop_map(Value::Text),
        any::<bool>().prop_map(Value::Flag),
    ]
}

fn conditions() -> impl Strategy<Value = Vec<Condition>> {
    prop::collection::vec((".{0,8}", values()).prop_map(|(name, value)| Condition { name, value }), 0..4)
}

fn figures() -> impl Strategy<Value = Vec<Figure>> {
    let figure = (
        ".{0,8}",
        prop::option::of(numbers()),
        prop::option::of(numbers()),
        prop::option::of(".{0,8}"),
        prop::collection::vec((any::<u64>(), numbers()), 0..3),
    )
        .prop_map(|(name, value, error, reason, meshes)| Figure {
            name,
            value,
            error,
            unit: "V".to_owned(),
            reason,
            meshes: meshes.into_iter().map(|(nodes, value)| MeshValue { nodes, value }).collect(),
        });
    prop::collection::vec(figure, 0..4)
}

fn tables() -> impl Strategy<Value = Vec<Table>> {
    let table = (0_usize..6, 0_usize..4, ".{0,8}").prop_flat_map(|(rows, columns, name)| {
        let column = prop::collection::vec(numbers(), rows..=rows);
        prop::collection::vec(column, columns..=columns).prop_map(move |columns| {
            let columns = columns.into_iter().map(|values| Column::new("depth_um", "um", values)).collect();
            Table::new(name.clone(), columns)
        })
    });
    prop::collection::vec(table, 0..3)
}

proptest! {
    #![proptest_config(ProptestConfig { cases: 200, failure_persistence: None, ..ProptestConfig::default() })]

    /// Any snapshot at all, NaN payloads included, comes back to the bit: encoding is its own inverse.
    #[test]
    fn every_snapshot_survives_encoding(
        name in ".{0,20}",
        step in any::<u64>(),
        conditions in conditions(),
        figures in figures(),
        tables in tables(),
        warnings in prop::collection::vec(".{0,20}", 0..3),
    ) {
        let written = Snapshot { conditions, figures, tables, warnings, ..sample::snapshot(&name, step) };
        let made = snapshot_sections(&written).unwrap();
        let header = made.header(7, [3; 16]);
        let frame = made.frame(&header);
        prop_assert_eq!(Header::from_bytes(frame[..HEADER_LENGTH].try_into().unwrap()), Some(header.clone()));
        prop_assert_eq!(frame.len() as u64, header.frame_length().unwrap());
        let body = &frame[HEADER_LENGTH + header.label_length() as usize..];
        let payload = header.payload as usize;
        let read = decode_snapshot(&body[..payload], &body[payload.next_multiple_of(8)..]).unwrap();
        prop_assert_eq!(compare_bits(&written, &read), vec![]);
    }

    /// Bytes that nobody wrote decode to an error or to a record, never to a panic or a large allocation.
    #[test]
    fn hostile_payloads_are_refused_quietly(bytes in prop::collection::vec(any::<u8>(), 0..400)) {
        let _ = decode_snapshot(&bytes, &[]);
        let _ = crate::archive::encoding::decode_label::<Label>(&bytes);
        let _ = crate::archive::blocks::Block::decode(&bytes, &[]);
        let _ = Archive::from_bytes(bytes);
    }
}
