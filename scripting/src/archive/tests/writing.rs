//! Locks, leftovers of earlier runs, and storage that fails.

use std::io;
use std::path::Path;
use std::sync::atomic::{AtomicU32, Ordering};

use super::sample;
use crate::archive::storage::{Disk, Opening, Storage, StoredFile};
use crate::archive::*;

/// The promise of the format: a second run on the same archive is refused while the first one lives.
#[test]
fn a_second_writer_is_refused_until_the_first_is_gone() {
    let folder = tempfile::tempdir().unwrap();
    let path = folder.path().join("run.epiloom");
    let first = Writer::create(&path, &sample::run()).unwrap();
    match Writer::create(&path, &sample::run()) {
        Err(ArchiveError::HeldByAnotherRun { path: held }) => assert_eq!(held, unfinished_path(&path)),
        other => panic!("{other:?}"),
    }
    drop(first);
    let second = Writer::create(&path, &sample::run()).unwrap();
    assert_eq!(second.earlier(), None); // the first had stored nothing
}

/// Where the earlier unfinished file was moved to.
fn aside(writer: &Writer<'_>) -> std::path::PathBuf {
    match writer.earlier() {
        Some(Earlier::SetAside { path, .. }) => path.clone(),
        other => panic!("{other:?}"),
    }
}

/// Nothing is lost: what a killed run has stored opens whole, and the next run moves it out of the way.
#[test]
fn the_snapshots_of_a_killed_run_are_kept() {
    let folder = tempfile::tempdir().unwrap();
    let left = sample::write_unfinished(folder.path());
    let archive = Archive::open(&left).unwrap();
    assert!(!archive.is_finished());
    assert_eq!(archive.warnings(), [ArchiveWarning::NotFinished { snapshots: 3, points: 0 }]);
    assert_eq!(archive.run().unwrap(), &sample::run());
    for written in sample::snapshots() {
        assert_eq!(compare_bits(&written, &archive.snapshot(written.name()).unwrap()), []);
    }
    for number in 1..=2 {
        let path = folder.path().join("run.epiloom");
        let mut writer = Writer::create(&path, &sample::run()).unwrap();
        let aside = aside(&writer);
        assert_eq!(aside, folder.path().join(format!("run.epiloom.unfinished-{number}")));
        assert!(!Archive::open(&aside).unwrap().entries().is_empty());
        writer.append(&sample::snapshot("again", 0)).unwrap();
        assert_eq!(writer.abandon().unwrap(), left);
    }
}

/// A folder in the way is told before anything is solved; somebody else's file is moved, not overwritten.
#[test]
fn what_stands_in_the_way_is_neither_overwritten_nor_found_too_late() {
    let folder = tempfile::tempdir().unwrap();
    assert!(matches!(Writer::create(folder.path(), &sample::run()), Err(ArchiveError::Io { .. })));
    let nowhere = folder.path().join("none").join("run.epiloom");
    assert!(matches!(Writer::create(&nowhere, &sample::run()), Err(ArchiveError::Io { .. })));
    let path = folder.path().join("run.epiloom");
    std::fs::write(unfinished_path(&path), "a note").unwrap();
    let writer = Writer::create(&path, &sample::run()).unwrap();
    assert_eq!(std::fs::read(aside(&writer)).unwrap(), b"a note");
}

/// A name is stored once; a ragged table is refused; neither harms what is there.
#[test]
fn refused_snapshots_leave_the_archive_as_it_was() {
    let folder = tempfile::tempdir().unwrap();
    let path = folder.path().join("run.epiloom");
    let mut writer = Writer::create(&path, &sample::run()).unwrap();
    writer.append(&sample::snapshot("one", 0)).unwrap();
    assert!(matches!(writer.append(&sample::failed("one", 1)), Err(ArchiveError::NameTaken { .. })));
    let mut ragged = sample::snapshot("two", 1);
    ragged.tables[0].columns[1].values.pop();
    match writer.append(&ragged) {
        Err(ArchiveError::RaggedTable { found: 3, expected: 4, .. }) => {}
        other => panic!("{other:?}"),
    }
    let long = sample::failed(&"n".repeat(70_000), 3);
    assert!(matches!(writer.append(&long), Err(ArchiveError::TooLarge { .. })));
    assert_eq!(writer.count(), 1);
    let archive = Archive::open(&writer.finish(&sample::run()).unwrap()).unwrap();
    assert_eq!((archive.entries().len(), archive.warnings().len()), (1, 0));
}

/// A disk whose k-th write, sync, rename or removal fails, the write after half of its bytes.
#[derive(Debug, Default)]
struct Failing {
    calls: AtomicU32,
    at: u32,
}

#[derive(Debug)]
struct FailingFile<'a> {
    disk: &'a Failing,
    file: Box<dyn StoredFile>,
}

impl Failing {
    fn fails(&self) -> bool {
        self.calls.fetch_add(1, Ordering::Relaxed) == self.at
    }

    fn call(&self) -> io::Result<()> {
        if self.fails() { Err(io::ErrorKind::StorageFull.into()) } else { Ok(()) }
    }
}

impl Storage for &'static Failing {
    fn open(&self, path: &Path, opening: Opening) -> io::Result<Box<dyn StoredFile>> {
        self.call()?;
        Ok(Box::new(FailingFile { disk: self, file: Disk.open(path, opening)? }))
    }

    fn exists(&self, path: &Path) -> io::Result<bool> {
        Disk.exists(path)
    }

    fn rename(&self, from: &Path, to: &Path) -> io::Result<()> {
        self.call().and_then(|()| Disk.rename(from, to))
    }

    fn remove(&self, path: &Path) -> io::Result<()> {
        self.call().and_then(|()| Disk.remove(path))
    }

    fn sync_folder(&self, file: &Path) -> io::Result<()> {
        self.call().and_then(|()| Disk.sync_folder(file))
    }
}

impl StoredFile for FailingFile<'_> {
    fn length(&mut self) -> io::Result<u64> {
        self.file.length()
    }

    fn read_at(&mut self, offset: u64, buffer: &mut [u8]) -> io::Result<()> {
        self.file.read_at(offset, buffer)
    }

    fn write_at(&mut self, offset: u64, bytes: &[u8]) -> io::Result<()> {
        if self.disk.fails() {
            self.file.write_at(offset, &bytes[..bytes.len() / 2])?;
            return Err(io::ErrorKind::StorageFull.into());
        }
        self.file.write_at(offset, bytes)
    }

    fn cut(&mut self, length: u64) -> io::Result<()> {
        self.disk.call().and_then(|()| self.file.cut(length))
    }

    fn sync(&mut self) -> io::Result<()> {
        self.disk.call().and_then(|()| self.file.sync())
    }

    fn try_lock(&mut self) -> io::Result<bool> {
        self.file.try_lock()
    }

    fn stands_at(&mut self, path: &Path) -> io::Result<bool> {
        self.file.stands_at(path)
    }
}

/// After a write that failed half-way the unfinished file has no half frame in it, and the next one fits.
#[test]
fn a_half_written_frame_is_cut_off_again() {
    for at in 0.. {
        let disk: &'static Failing = Box::leak(Box::new(Failing { at, ..Failing::default() }));
        let storage: &'static &'static Failing = Box::leak(Box::new(disk));
        let folder = tempfile::tempdir().unwrap();
        let Ok(mut writer) = Writer::create_in(storage, &folder.path().join("run.epiloom"), &sample::run())
        else {
            continue;
        };
        let begun = disk.calls.load(Ordering::Relaxed);
        assert!(begun <= at);
        if begun < at {
            continue;
        }
        // The first call of an append is its write.
        assert!(matches!(
            writer.append(&sample::snapshot("one", 0)),
            Err(ArchiveError::Io { action: "write", .. })
        ));
        writer.append(&sample::snapshot("two", 1)).unwrap();
        writer.append(&sample::snapshot("one", 0)).unwrap();
        let archive = Archive::open(&writer.abandon().unwrap()).unwrap();
        assert_eq!(archive.warnings(), [ArchiveWarning::NotFinished { snapshots: 2, points: 0 }]);
        break;
    }
}

/// What changes on the disk behind the writer's back is not sealed anew as if it were right.
#[test]
fn finishing_refuses_what_the_disk_no_longer_holds() {
    let folder = tempfile::tempdir().unwrap();
    let path = folder.path().join("run.epiloom");
    let mut writer = Writer::create(&path, &sample::run()).unwrap();
    writer.append(&sample::snapshot("one", 0)).unwrap();
    let mut bytes = std::fs::read(writer.unfinished()).unwrap();
    let last = bytes.len() - 1;
    bytes[last] ^= 1;
    std::fs::write(writer.unfinished(), bytes).unwrap();
    assert!(matches!(writer.finish(&sample::run()), Err(ArchiveError::DamagedSnapshot { .. })));
    assert!(!path.exists());
    assert!(unfinished_path(&path).exists());
}

/// Whichever call fails: every snapshot whose `append` succeeded can be read afterwards, from the archive or
/// from the unfinished file, and a file under the final name is always whole.
#[test]
fn no_failing_call_loses_a_stored_snapshot() {
    let mut stopped_by = 0;
    for at in 0.. {
        let disk: &'static Failing = Box::leak(Box::new(Failing { at, ..Failing::default() }));
        let storage: &'static &'static Failing = Box::leak(Box::new(disk));
        let folder = tempfile::tempdir().unwrap();
        let path = folder.path().join("run.epiloom");
        let mut stored = Vec::new();
        let mut errors = 0;
        let mut done = false;
        match Writer::create_in(storage, &path, &sample::run()) {
            Ok(mut writer) => {
                for snapshot in sample::snapshots() {
                    match writer.append(&snapshot) {
                        Ok(()) => stored.push(snapshot),
                        Err(_) => errors += 1,
                    }
                }
                match writer.finish(&sample::run()) {
                    Ok(_) => done = true,
                    Err(_) => errors += 1,
                }
            }
            Err(_) => errors += 1,
        }
        if path.exists() {
            let archive = Archive::open(&path).unwrap();
            assert!(archive.is_finished() && archive.warnings().is_empty(), "call {at}");
        }
        assert!(path.exists() || !done, "call {at}");
        let there = if path.exists() { path.clone() } else { unfinished_path(&path) };
        for snapshot in &stored {
            let read = Archive::open(&there).unwrap().snapshot(snapshot.name()).unwrap();
            assert_eq!(compare_bits(snapshot, &read), [], "call {at}");
        }
        stopped_by += u32::from(errors > 0);
        if disk.calls.load(Ordering::Relaxed) <= at {
            assert_eq!((errors, stored.len()), (0, 3));
            break;
        }
        // The removal of the unfinished file, the last call, is the only one that may fail unseen.
        assert!(errors > 0 || done, "call {at}");
    }
    assert!(stopped_by > 15, "only {stopped_by} calls were made to fail");
}
