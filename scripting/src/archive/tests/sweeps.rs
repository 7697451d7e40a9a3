//! Sweeps in archives: what is read is what was written, whatever the order and the batches; and what is left by a run
//! that was stopped is gone on with.

use std::path::Path;

use super::sample;
use crate::archive::gather::ranges;
use crate::archive::*;

/// The points of a sweep as they are read, with their snapshots.
pub(super) fn read_points(archive: &Archive, sweep: &str) -> Vec<Point> {
    archive.points(archive.sweep(sweep).unwrap()).map(|stored| whole(archive, &stored.unwrap())).collect()
}

fn whole(archive: &Archive, stored: &StoredPoint) -> Point {
    let snapshots = stored.snapshots.iter().map(|place| archive.point_snapshot(place).unwrap()).collect();
    Point { snapshots, ..stored.point.clone() }
}

/// Points compared by the bits of their numbers: NaN is equal to itself.
fn same(a: &[Point], b: &[Point]) -> bool {
    format!("{a:?}") == format!("{b:?}")
}

fn in_order() -> Vec<Point> {
    let mut points = sample::points();
    points.sort_by_key(|point| point.index);
    points
}

/// The points handed over are the source of truth.
#[test]
fn points_come_back_as_they_were_written() {
    let folder = tempfile::tempdir().unwrap();
    for (file, finished) in [
        (sample::write_swept_unfinished(folder.path()), false),
        (sample::write_swept_finished(&tempfile::tempdir_in(folder.path()).unwrap().keep()), true),
    ] {
        let archive = Archive::open(&file).unwrap();
        assert_eq!(archive.is_finished(), finished);
        assert_eq!(archive.warnings().len(), usize::from(!finished), "{:?}", archive.warnings());
        assert_eq!(archive.verify().unwrap(), []);
        assert_eq!(archive.entries().len(), 2);
        let sweep = archive.sweep("map").unwrap();
        assert_eq!((sweep.count(), sweep.failed()), (7, 1));
        let record = sweep.record().unwrap();
        assert_eq!((&record.start, record.left_out, record.share), (&sample::sweep_start(), Some(2), None));
        assert!(same(&read_points(&archive, "map"), &in_order()));
        for point in in_order() {
            let one = whole(&archive, &archive.point("map", point.index).unwrap());
            assert!(same(&[one], std::slice::from_ref(&point)));
            for snapshot in &point.snapshots {
                let read = archive.snapshot(snapshot.name()).unwrap();
                assert_eq!(compare_bits(snapshot, &read), []);
            }
        }
        for missing in [1, 4, 9, u64::MAX] {
            assert!(matches!(archive.point("map", missing), Err(ArchiveError::NoSuchPoint { .. })));
        }
        assert!(matches!(archive.sweep("mop"), Err(ArchiveError::NoSuchSweep { .. })));
        assert!(matches!(archive.snapshot("map/6/nothing"), Err(ArchiveError::NoSuchSnapshot { .. })));
    }
}

/// Names of what points store, written and read by hand.
#[test]
fn names_of_points_are_read_back() {
    assert_eq!(point_of_name("map/12"), Some(("map", 12, None)));
    assert_eq!(point_of_name(&point_snapshot_name("a/b c", 7, "d/2/e")), Some(("a/b c", 7, Some("d/2/e"))));
    for plain in ["map", "map/", "map/x", "/3", "map/01", "map/1x", "map/-1", "map/99999999999999999999"] {
        assert_eq!(point_of_name(plain), None, "{plain}");
    }
}

/// Indices of shares counted one by one.
#[test]
fn shares_hold_every_point_once() {
    for (points, of) in [(0, 3), (1, 3), (7, 3), (9, 3), (5, 1), (2, 5)] {
        let shares: Vec<Share> = (1..=of).map(|number| Share { number, of }).collect();
        for index in 0..points {
            assert_eq!(shares.iter().filter(|share| share.holds(index)).count(), 1);
        }
        for share in &shares {
            let counted = (0..points).filter(|index| share.holds(*index)).count();
            assert_eq!(share.count(points), counted as u64, "{share} of {points}");
        }
    }
}

/// Many points in blocks, with `extra` bytes of text each; handed over in a scattered order.
fn write_many(folder: &Path, batch: usize, extra: usize) -> Vec<u8> {
    let path = folder.join("many.epiloom");
    let mut writer = Writer::create(&path, &sample::run()).unwrap();
    let start = SweepStart { points: 2500, ..sample::sweep_start() };
    let _ = writer.begin_sweep(&start).unwrap();
    let mut points: Vec<Point> = (0..2500_u64).map(|k| many_point(k * 701 % 2500, extra)).collect();
    if batch.is_multiple_of(2) {
        points.reverse();
    }
    for batch in points.chunks(batch) {
        writer.append_points("map", batch.to_vec()).unwrap();
    }
    writer.finish_sweep("map", 0).unwrap();
    std::fs::read(writer.finish(&sample::run()).unwrap()).unwrap()
}

fn many_point(index: u64, extra: usize) -> Point {
    let column = SweepColumn { name: "power".to_owned(), unit: "mW_per_cm2".to_owned() };
    let value = (index as f64).sqrt();
    Point {
        index,
        coordinates: vec![Cell::Number { value, error: None }, Cell::Flag(true)],
        outputs: vec![PointOutput { column, cell: Cell::Number { value, error: Some(1e-12) } }],
        printed: vec![format!("{index:0extra$}")],
        ..Point::default()
    }
}

/// The promise of the format: the finished bytes depend on the points alone; blocks end by count and by bytes.
#[test]
fn the_finished_bytes_do_not_depend_on_batches_or_order() {
    let folder = tempfile::tempdir().unwrap();
    for (extra, blocks) in [(1, 3), (9000, 6)] {
        let first = write_many(folder.path(), 97, extra);
        for batch in [64, 1000, 2500] {
            assert!(write_many(folder.path(), batch, extra) == first, "batches of {batch}");
        }
        let archive = Archive::from_bytes(first).unwrap();
        assert_eq!(archive.sweep("map").unwrap().blocks.len(), blocks);
        let read = read_points(&archive, "map");
        assert!(same(&read, &(0..2500).map(|k| many_point(k, extra)).collect::<Vec<_>>()));
        assert_eq!(archive.point("map", 1024).unwrap().point.index, 1024);
    }
}

/// A run stopped anywhere and gone on with gives the bytes of one that was never stopped: the promise.
#[test]
fn a_run_that_is_gone_on_with_gives_the_same_bytes() {
    let folder = tempfile::tempdir().unwrap();
    let whole = std::fs::read(sample::write_swept_finished(folder.path())).unwrap();
    let left = std::fs::read(sample::write_swept_unfinished(folder.path())).unwrap();
    let path = folder.path().join("swept.epiloom");
    // A step that is no divisor of anything, so that cuts fall in all parts of frames.
    for cut in (40..=left.len()).step_by(61).chain([left.len()]) {
        std::fs::write(unfinished_path(&path), &left[..cut]).unwrap();
        let mut writer = Writer::resume(&path, &sample::run(), None).unwrap();
        writer.append(&sample::snapshot("light J-V", 0)).unwrap();
        let stored: Vec<Point> =
            writer.begin_sweep(&sample::sweep_start()).unwrap().map(Result::unwrap).collect();
        let mut rest = sample::points();
        for point in &stored {
            let at = rest.iter().position(|each| each.index == point.index).unwrap();
            let known = Point { snapshots: Vec::new(), ..rest.remove(at) };
            assert!(same(std::slice::from_ref(point), &[known]), "cut at {cut}");
        }
        match writer.earlier() {
            Some(Earlier::TakenOver { points, .. }) => assert_eq!(*points, stored.len() as u64),
            other => assert!(other.is_none() && stored.is_empty(), "{other:?}"),
        }
        if cut == left.len() {
            assert_eq!(stored.len(), 7);
        }
        for point in rest {
            writer.append_points("map", vec![point]).unwrap();
        }
        writer.finish_sweep("map", 2).unwrap();
        writer.append(&sample::failed("bands", 2)).unwrap();
        writer.finish(&sample::run()).unwrap();
        assert!(std::fs::read(&path).unwrap() == whole, "cut at {cut}");
        assert!(!unfinished_path(&path).exists());
    }
}

/// What must not be gone on with is set aside, whole, with the reason in words.
#[test]
fn another_runs_points_are_set_aside_with_the_reason() {
    let mut text = sample::run();
    text.script_text.push(' ');
    let mut input = sample::run();
    input.inputs.get_mut("bsf").unwrap().used = Value::number(51.0, "nm");
    let mut data = sample::run();
    data.data_files.get_mut("sun.csv").unwrap().length = 78;
    let version = RunHeader { program_version: "9".to_owned(), ..sample::run() };
    let tolerances = RunHeader { tolerances: Vec::new(), ..sample::run() };
    let name = RunHeader { script_name: "other.rhai".to_owned(), ..sample::run() };
    let share = Some(Share { number: 1, of: 2 });
    for (header, share, word) in [
        (&text, None, "script has changed"),
        (&input, None, "`bsf` was 50.0 nm and is now 51.0 nm"),
        (&data, None, "`sun.csv` has changed"),
        (&version, None, "version 0.1.0"),
        (&tolerances, None, "tolerances"),
        (&name, None, "another script, `larch_bay.rhai`"),
        (&sample::run(), share, "part 1/2"),
    ] {
        let folder = tempfile::tempdir().unwrap();
        let left = std::fs::read(sample::write_swept_unfinished(folder.path())).unwrap();
        let path = folder.path().join("swept.epiloom");
        let begun =
            RunHeader { inputs: Default::default(), data_files: Default::default(), ..header.clone() };
        let mut writer = Writer::resume(&path, &begun, share).unwrap();
        writer.update_run(header).unwrap();
        assert_eq!(writer.begin_sweep(&sample::sweep_start()).unwrap().count(), 0, "{word}");
        match writer.earlier() {
            Some(Earlier::SetAside { path, why }) => {
                assert!(why.contains(word), "{why}");
                assert!(std::fs::read(path).unwrap() == left);
            }
            other => panic!("{word}: {other:?}"),
        }
    }
}

/// A run that stores nothing leaves what an earlier one has stored as it is.
#[test]
fn what_is_left_is_untouched_until_something_is_stored() {
    let folder = tempfile::tempdir().unwrap();
    let left = sample::write_swept_unfinished(folder.path());
    let before = std::fs::read(&left).unwrap();
    let writer = Writer::resume(&folder.path().join("swept.epiloom"), &sample::run(), None).unwrap();
    assert!(writer.holds_anything());
    assert_eq!(writer.points(), 7);
    writer.discard().unwrap();
    assert!(std::fs::read(&left).unwrap() == before);
}

/// The same script cannot give another result: it stops before anything is mixed.
#[test]
fn a_snapshot_that_comes_out_differently_stops_the_run() {
    let folder = tempfile::tempdir().unwrap();
    sample::write_swept_unfinished(folder.path());
    let mut writer = Writer::resume(&folder.path().join("swept.epiloom"), &sample::run(), None).unwrap();
    let mut other = sample::snapshot("light J-V", 0);
    other.figures[0].value = other.figures[0].value.map(f64::next_up);
    match writer.append(&other) {
        Err(ArchiveError::NotAsStored { name, place }) => {
            assert!(name == "light J-V" && place.contains("figure voc"), "{place}");
        }
        other => panic!("{other:?}"),
    }
    writer.append(&sample::snapshot("light J-V", 0)).unwrap();
}

/// A plan that changed with what stands before it is solved anew, and only what is new counts.
#[test]
fn a_sweep_of_another_plan_begins_anew() {
    let folder = tempfile::tempdir().unwrap();
    let left = sample::write_swept_unfinished(folder.path());
    let path = folder.path().join("swept.epiloom");
    let mut writer = Writer::resume(&path, &sample::run(), None).unwrap();
    let other = SweepStart { plan: "list of 9".to_owned(), ..sample::sweep_start() };
    assert_eq!(writer.begin_sweep(&other).unwrap().count(), 0);
    let one = sample::points().remove(1);
    writer.append_points("map", vec![one.clone()]).unwrap();
    assert_eq!(read_points(&Archive::open(&left).unwrap(), "map").len(), 1);
    writer.finish_sweep("map", 8).unwrap();
    let archive = Archive::open(&writer.finish(&sample::run()).unwrap()).unwrap();
    assert!(same(&read_points(&archive, "map"), &[one]));
    assert!(archive.entries().is_empty());
}

/// Names are shared by snapshots, sweeps and what points store; points are refused that do not fit.
#[test]
fn names_and_points_that_do_not_fit_are_refused() {
    let folder = tempfile::tempdir().unwrap();
    let mut writer = Writer::create(&folder.path().join("run.epiloom"), &sample::run()).unwrap();
    writer.append(&sample::snapshot("taken", 0)).unwrap();
    let taken = SweepStart { name: "taken".to_owned(), ..sample::sweep_start() };
    assert!(matches!(writer.begin_sweep(&taken), Err(ArchiveError::NameTaken { .. })));
    let as_a_point = SweepStart { name: "a/1".to_owned(), ..sample::sweep_start() };
    assert!(matches!(writer.begin_sweep(&as_a_point), Err(ArchiveError::Encoding { .. })));
    assert!(matches!(writer.append_points("map", sample::points()), Err(ArchiveError::NoSuchSweep { .. })));
    let _ = writer.begin_sweep(&sample::sweep_start()).unwrap();
    for name in ["map", "map/3/bands"] {
        assert!(matches!(writer.append(&sample::snapshot(name, 5)), Err(ArchiveError::NameTaken { .. })));
    }
    let point = |change: fn(&mut Point)| {
        let mut point = sample::points().pop().unwrap();
        change(&mut point);
        vec![point]
    };
    for bad in [
        point(|point| drop(point.coordinates.pop())),
        point(|point| point.outputs.reverse()),
        point(|point| point.snapshots[0].label.name = "bands".to_owned()),
        point(|point| point.snapshots[0].label.order.point = 5),
        [point(|_| {}), point(|_| {})].concat(),
    ] {
        assert!(matches!(writer.append_points("map", bad), Err(ArchiveError::Encoding { .. })));
    }
    let twice = point(|point| point.snapshots[1] = point.snapshots[0].clone());
    assert!(matches!(writer.append_points("map", twice), Err(ArchiveError::NameTaken { .. })));
    writer.append_points("map", point(|_| {})).unwrap();
    let archive = Archive::open(&writer.abandon().unwrap()).unwrap();
    assert_eq!((archive.sweep("map").unwrap().count(), archive.is_damaged()), (1, false));
}

/// The archives of the two halves of the sample's sweep, with its snapshots left to the gathering.
fn halves(folder: &Path) -> Vec<(std::path::PathBuf, Archive)> {
    (1..=2)
        .map(|number| {
            let share = Share { number, of: 2 };
            let path = folder.join(format!("half-{number}.epiloom"));
            let mut writer = Writer::resume(&path, &sample::run(), Some(share)).unwrap();
            let _ = writer.begin_sweep(&sample::sweep_start()).unwrap();
            let points: Vec<Point> =
                sample::points().into_iter().filter(|point| share.holds(point.index)).collect();
            // of nine indices 1 and 4 are left out by the filter: one in each half
            let left_out = share.count(9) - points.len() as u64;
            writer.append_points("map", points).unwrap();
            writer.finish_sweep("map", left_out).unwrap();
            let file = writer.finish(&sample::run()).unwrap();
            let archive = Archive::open(&file).unwrap();
            (file, archive)
        })
        .collect()
}

/// A single run is the source of truth: its bytes and those gathered of parts are the same.
#[test]
fn gathered_parts_give_the_bytes_of_a_single_run() {
    let folder = tempfile::tempdir().unwrap();
    let whole = std::fs::read(sample::write_swept_finished(folder.path())).unwrap();
    let path = folder.path().join("gathered.epiloom");
    let parts = Parts::of(halves(folder.path())).unwrap();
    assert_eq!((parts.run(), parts.count()), (&sample::run(), 2));
    assert_eq!(parts.copy_into(&path).unwrap(), 7);
    assert_eq!(parts.copy_into(&path).unwrap(), 0, "what is there is not copied again");
    let mut writer = Writer::resume(&path, &sample::run(), None).unwrap();
    writer.append(&sample::snapshot("light J-V", 0)).unwrap();
    assert_eq!(writer.begin_sweep(&sample::sweep_start()).unwrap().count(), 7);
    writer.finish_sweep("map", 2).unwrap();
    writer.append(&sample::failed("bands", 2)).unwrap();
    writer.finish(&sample::run()).unwrap();
    assert!(std::fs::read(path).unwrap() == whole);
}

/// What is wrong with parts is named: made wrong one way each.
#[test]
fn parts_that_make_no_whole_are_named() {
    let folder = tempfile::tempdir().unwrap();
    let refused = |archives: Vec<(std::path::PathBuf, Archive)>| Parts::of(archives).unwrap_err().what;
    let again = |path: &Path| (path.to_owned(), Archive::open(path).unwrap());
    let mut one = halves(folder.path());
    let second = one.pop().unwrap().0;
    let first = one[0].0.clone();
    assert_eq!(refused(one), "part 2 of 2 is missing");
    assert!(refused(vec![again(&first), again(&second), again(&first)]).contains("part 1/2 is there twice"));
    let whole = sample::write_swept_finished(folder.path());
    assert!(refused(vec![again(&first), again(&whole)]).contains("is no part"));
    let unfinished = sample::write_swept_unfinished(folder.path());
    assert!(refused(vec![again(&first), again(&unfinished)]).contains("is not finished"));
    assert!(refused(vec![again(&sample::write_finished(folder.path()))]).contains("holds no sweep"));

    let made = |share: Share, header: &RunHeader, left_out: Option<u64>| {
        let path = folder.path().join("made.epiloom");
        let mut writer = Writer::resume(&path, header, Some(share)).unwrap();
        let _ = writer.begin_sweep(&sample::sweep_start()).unwrap();
        if let Some(left_out) = left_out {
            writer.finish_sweep("map", left_out).unwrap();
        }
        writer.finish(header).unwrap()
    };
    let (half, third) = (Share { number: 2, of: 2 }, Share { number: 2, of: 3 });
    for (share, version, left_out, word) in [
        (half, "9", Some(4), "versions 9 and 0.1.0"),
        (third, "0.1.0", Some(3), "is part 2/3"),
        (half, "0.1.0", Some(3), "does not hold all its points"),
        (half, "0.1.0", None, "does not hold all its points"),
    ] {
        let header = RunHeader { program_version: version.to_owned(), ..sample::run() };
        let file = made(share, &header, left_out);
        let why = refused(vec![again(&first), again(&file)]);
        assert!(why.contains(word), "{why}");
    }
    assert_eq!(ranges(&[1, 3, 4, 7, 8, 9, 12]), "1, 3, 4, 7 to 9, 12");
}
