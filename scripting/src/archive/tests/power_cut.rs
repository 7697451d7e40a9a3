//! Storage that fails and power that is cut: what was counted is there afterwards, whatever the disk did with the rest.

use std::collections::BTreeMap;
use std::io;
use std::path::{Path, PathBuf};
use std::sync::{Arc, Mutex};

use super::sample;
use crate::archive::storage::{Opening, Storage, StoredFile};
use crate::archive::*;

/// What was done to a file since it was last synced.
#[derive(Clone, Debug)]
enum Change {
    Write(u64, Vec<u8>),
    Cut(u64),
}

/// A file: what a power cut leaves of it for certain, and what may or may not be left.
#[derive(Clone, Debug, Default)]
struct Node {
    durable: Vec<u8>,
    pending: Vec<Change>,
    now: Vec<u8>,
}

/// What was done to the folder since it was last synced.
#[derive(Clone, Debug)]
enum Move {
    Name(PathBuf, usize),
    Rename(PathBuf, PathBuf),
    Remove(PathBuf),
}

/// A disk in memory whose power can be cut at the k-th call, or whose k-th call fails.
#[derive(Clone, Debug, Default)]
struct State {
    nodes: Vec<Node>,
    names: BTreeMap<PathBuf, usize>,
    durable_names: BTreeMap<PathBuf, usize>,
    moves: Vec<Move>,
    calls: u64,
    /// From this call on nothing is done any more: the power is cut.
    cut_at: Option<u64>,
    /// This call alone fails, a write after half of its bytes.
    fail_at: Option<u64>,
    /// Syncs that return without having done anything: the negative control.
    no_sync: bool,
}

#[derive(Clone, Debug, Default)]
struct Memory(Arc<Mutex<State>>);

impl Memory {
    fn state(&self) -> std::sync::MutexGuard<'_, State> {
        self.0.lock().unwrap()
    }

    /// Counts a call; whether it does nothing, half or all.
    fn call(&self) -> io::Result<Call> {
        let mut state = self.state();
        let this = state.calls;
        state.calls += 1;
        if state.cut_at.is_some_and(|at| this >= at) {
            return Err(io::ErrorKind::BrokenPipe.into());
        }
        Ok(if state.fail_at == Some(this) { Call::Half } else { Call::Whole })
    }

    fn whole_call(&self) -> io::Result<()> {
        match self.call()? {
            Call::Whole => Ok(()),
            Call::Half => Err(io::ErrorKind::StorageFull.into()),
        }
    }

    /// The bytes under a name as they are now.
    fn bytes(&self, path: &Path) -> Option<Vec<u8>> {
        let state = self.state();
        state.names.get(path).map(|node| state.nodes[*node].now.clone())
    }

    /// The disk after the power is back: what was synced is there; of the rest every stretch of 64 bytes may have
    /// reached the disk or not, or be zero, and the moves in the folder up to some point.
    fn after_the_cut(&self, random: &mut Random) -> Memory {
        let state = self.state();
        let mut names = state.durable_names.clone();
        for done in state.moves.iter().take(random.below(state.moves.len() as u64 + 1) as usize) {
            match done.clone() {
                Move::Name(path, node) => drop(names.insert(path, node)),
                Move::Rename(from, to) => {
                    if let Some(node) = names.remove(&from) {
                        names.insert(to, node);
                    }
                }
                Move::Remove(path) => drop(names.remove(&path)),
            }
        }
        let nodes = state.nodes.iter().map(|node| node.after_the_cut(random)).collect();
        Memory(Arc::new(Mutex::new(State { nodes, durable_names: names.clone(), names, ..State::default() })))
    }
}

#[derive(PartialEq)]
enum Call {
    Whole,
    Half,
}

impl Node {
    fn after_the_cut(&self, random: &mut Random) -> Node {
        let mut bytes = self.durable.clone();
        // 0 all lost, 1 all there, 2 mixed, 3 mixed with zeros
        let fate = random.below(4);
        for change in &self.pending {
            match change {
                Change::Cut(length) if fate == 1 || (fate > 1 && random.below(2) == 0) => {
                    bytes.resize(*length as usize, 0);
                }
                Change::Cut(_) => {}
                Change::Write(offset, written) => {
                    for (at, stretch) in written.chunks(64).enumerate() {
                        let begin = *offset as usize + 64 * at;
                        let there = fate == 1 || (fate > 1 && random.below(2) == 0);
                        if !there && fate != 3 {
                            continue;
                        }
                        if bytes.len() < begin + stretch.len() {
                            bytes.resize(begin + stretch.len(), 0);
                        }
                        if there {
                            bytes[begin..begin + stretch.len()].copy_from_slice(stretch);
                        }
                    }
                }
            }
        }
        Node { now: bytes.clone(), durable: bytes, pending: Vec::new() }
    }
}

/// Numbers in a fixed order: Knuth's linear congruential generator (The Art of Computer Programming, vol. 2).
struct Random(u64);

impl Random {
    fn below(&mut self, bound: u64) -> u64 {
        self.0 = self.0.wrapping_mul(6_364_136_223_846_793_005).wrapping_add(1_442_695_040_888_963_407);
        (self.0 >> 33) % bound
    }
}

impl Storage for Memory {
    fn open(&self, path: &Path, opening: Opening) -> io::Result<Box<dyn StoredFile>> {
        self.whole_call()?;
        let mut state = self.state();
        let node = match state.names.get(path) {
            Some(_) if opening == Opening::New => return Err(io::ErrorKind::AlreadyExists.into()),
            Some(node) => *node,
            None => {
                state.nodes.push(Node::default());
                let node = state.nodes.len() - 1;
                state.names.insert(path.to_owned(), node);
                state.moves.push(Move::Name(path.to_owned(), node));
                node
            }
        };
        if opening == Opening::Emptied {
            state.nodes[node].pending.push(Change::Cut(0));
            state.nodes[node].now.clear();
        }
        drop(state);
        Ok(Box::new(MemoryFile { disk: self.clone(), node }))
    }

    fn exists(&self, path: &Path) -> io::Result<bool> {
        Ok(self.state().names.contains_key(path))
    }

    fn rename(&self, from: &Path, to: &Path) -> io::Result<()> {
        self.whole_call()?;
        let mut state = self.state();
        let node = state.names.remove(from).ok_or(io::ErrorKind::NotFound)?;
        state.names.insert(to.to_owned(), node);
        state.moves.push(Move::Rename(from.to_owned(), to.to_owned()));
        Ok(())
    }

    fn remove(&self, path: &Path) -> io::Result<()> {
        self.whole_call()?;
        let mut state = self.state();
        state.names.remove(path).ok_or(io::ErrorKind::NotFound)?;
        state.moves.push(Move::Remove(path.to_owned()));
        Ok(())
    }

    fn sync_folder(&self, _: &Path) -> io::Result<()> {
        self.whole_call()?;
        let mut state = self.state();
        if !state.no_sync {
            state.durable_names = state.names.clone();
            state.moves.clear();
        }
        Ok(())
    }
}

#[derive(Debug)]
struct MemoryFile {
    disk: Memory,
    node: usize,
}

impl StoredFile for MemoryFile {
    fn length(&mut self) -> io::Result<u64> {
        Ok(self.disk.state().nodes[self.node].now.len() as u64)
    }

    fn read_at(&mut self, offset: u64, buffer: &mut [u8]) -> io::Result<()> {
        let state = self.disk.state();
        let end = offset as usize + buffer.len();
        let bytes = state.nodes[self.node].now.get(offset as usize..end);
        buffer.copy_from_slice(bytes.ok_or(io::ErrorKind::UnexpectedEof)?);
        Ok(())
    }

    fn write_at(&mut self, offset: u64, bytes: &[u8]) -> io::Result<()> {
        let call = self.disk.call()?;
        let written = if call == Call::Half { &bytes[..bytes.len() / 2] } else { bytes };
        let mut state = self.disk.state();
        let node = &mut state.nodes[self.node];
        let end = offset as usize + written.len();
        if node.now.len() < end {
            node.now.resize(end, 0);
        }
        node.now[offset as usize..end].copy_from_slice(written);
        node.pending.push(Change::Write(offset, written.to_vec()));
        if call == Call::Half { Err(io::ErrorKind::StorageFull.into()) } else { Ok(()) }
    }

    fn cut(&mut self, length: u64) -> io::Result<()> {
        self.disk.whole_call()?;
        let mut state = self.disk.state();
        let node = &mut state.nodes[self.node];
        node.now.resize(length as usize, 0);
        node.pending.push(Change::Cut(length));
        Ok(())
    }

    fn sync(&mut self) -> io::Result<()> {
        self.disk.whole_call()?;
        let mut state = self.disk.state();
        if !state.no_sync {
            let node = &mut state.nodes[self.node];
            node.durable = node.now.clone();
            node.pending.clear();
        }
        Ok(())
    }

    fn try_lock(&mut self) -> io::Result<bool> {
        Ok(true)
    }

    fn stands_at(&mut self, path: &Path) -> io::Result<bool> {
        Ok(self.disk.state().names.get(path) == Some(&self.node))
    }
}

const PATH: &str = "run.epiloom";

/// What a run counted as stored before it was stopped.
#[derive(Debug, Default)]
struct Counted {
    snapshots: Vec<Snapshot>,
    points: Vec<u64>,
    finished: bool,
}

/// A run with a snapshot, a sweep in batches of two, and another snapshot, until something fails.
fn run(disk: &'static Memory, counted: &mut Counted) -> Result<(), ArchiveError> {
    let mut writer = Writer::resume_in(disk, Path::new(PATH), &sample::run(), None)?;
    let (first, last) = (sample::snapshot("light J-V", 0), sample::failed("bands", 2));
    writer.append(&first)?;
    counted.snapshots.push(first);
    let stored: Result<Vec<u64>, ArchiveError> =
        writer.begin_sweep(&sample::sweep_start())?.map(|point| Ok(point?.index)).collect();
    let stored = stored?;
    counted.points.extend(&stored);
    let rest: Vec<Point> =
        sample::points().into_iter().filter(|each| !stored.contains(&each.index)).collect();
    for batch in rest.chunks(2) {
        writer.append_points("map", batch.to_vec())?;
        counted.points.extend(batch.iter().map(|point| point.index));
    }
    writer.finish_sweep("map", 2)?;
    writer.append(&last)?;
    counted.snapshots.push(last);
    writer.finish(&sample::run())?;
    counted.finished = true;
    Ok(())
}

/// The bytes of a run that nothing stopped, and how many calls it takes.
fn undisturbed() -> (Vec<u8>, u64) {
    let disk: &'static Memory = Box::leak(Box::default());
    run(disk, &mut Counted::default()).unwrap();
    (disk.bytes(Path::new(PATH)).unwrap(), disk.state().calls)
}

/// Whether everything that was counted is on the disk, and the run can be gone on with to the same bytes.
fn holds(disk: &'static Memory, counted: &Counted, whole: &[u8]) -> Result<(), String> {
    let path = Path::new(PATH);
    let archive = match disk.bytes(path) {
        Some(bytes) => {
            let archive = Archive::from_bytes(bytes.clone()).map_err(|error| error.to_string())?;
            if bytes != whole {
                return Err("a file under the final name is not whole".to_owned());
            }
            Some(archive)
        }
        None if counted.finished => return Err("the finished archive is gone".to_owned()),
        None => disk.bytes(&unfinished_path(path)).and_then(|bytes| Archive::from_bytes(bytes).ok()),
    };
    let Some(archive) = archive else {
        let nothing = counted.snapshots.is_empty() && counted.points.is_empty();
        return if nothing { Ok(()) } else { Err("there is no archive".to_owned()) };
    };
    for snapshot in &counted.snapshots {
        let read = archive.snapshot(snapshot.name()).map_err(|error| error.to_string())?;
        if !compare_bits(snapshot, &read).is_empty() {
            return Err(format!("`{}` differs", snapshot.name()));
        }
    }
    if !counted.points.is_empty() {
        let read = if archive.sweep("map").is_ok() { archive_points(&archive)? } else { Vec::new() };
        for index in &counted.points {
            let written = sample::points().into_iter().find(|point| point.index == *index);
            let found = read.iter().find(|point| point.index == *index);
            if format!("{found:?}") != format!("{:?}", written.as_ref()) {
                return Err(format!("point {index} is lost"));
            }
        }
    }
    let mut again = Counted::default();
    run(disk, &mut again).map_err(|error| error.to_string())?;
    if disk.bytes(path).as_deref() != Some(whole) {
        return Err("gone on with, it gives other bytes".to_owned());
    }
    Ok(())
}

fn archive_points(archive: &Archive) -> Result<Vec<Point>, String> {
    // points of an unfinished file whose snapshots are damaged are those that were not counted
    let sweep = archive.sweep("map").map_err(|error| error.to_string())?;
    let mut points = Vec::new();
    for stored in archive.points(sweep) {
        let stored = stored.map_err(|error| error.to_string())?;
        let snapshots: Result<Vec<Snapshot>, ArchiveError> =
            stored.snapshots.iter().map(|place| archive.point_snapshot(place)).collect();
        if let Ok(snapshots) = snapshots {
            points.push(Point { snapshots, ..stored.point });
        }
    }
    Ok(points)
}

fn disk(change: impl FnOnce(&mut State)) -> &'static Memory {
    let disk: &'static Memory = Box::leak(Box::default());
    change(&mut disk.state());
    disk
}

/// The power is cut before every single call, with several fates of what was not synced each: all that was counted is
/// there, and the run goes on to the same bytes. The promise of the format is the source of truth.
#[test]
fn a_power_cut_loses_nothing_that_was_counted() {
    let (whole, calls) = undisturbed();
    let mut random = Random(1);
    for at in 0..calls {
        let cut = disk(|state| state.cut_at = Some(at));
        let mut counted = Counted::default();
        assert!(run(cut, &mut counted).is_err() || at + 1 == calls, "call {at}");
        for _ in 0..12 {
            let after: &'static Memory = Box::leak(Box::new(cut.after_the_cut(&mut random)));
            holds(after, &counted, &whole).unwrap_or_else(|why| panic!("power cut before call {at}: {why}"));
        }
    }
    assert!(calls > 20, "{calls}");
}

/// The simulation can fail: with the syncs taken out, something that was counted is lost.
#[test]
fn without_syncs_the_power_cut_loses_something() {
    let (whole, calls) = undisturbed();
    let mut random = Random(1);
    let mut lost = 0;
    for at in 0..calls {
        let cut = disk(|state| (state.cut_at, state.no_sync) = (Some(at), true));
        let mut counted = Counted::default();
        let _ = run(cut, &mut counted);
        for _ in 0..12 {
            let after: &'static Memory = Box::leak(Box::new(cut.after_the_cut(&mut random)));
            lost += u32::from(holds(after, &counted, &whole).is_err());
        }
    }
    assert!(lost > 50, "only {lost} cuts lost anything");
}

/// Whichever write, sync, rename, removal or opening fails, once: what was counted is there, and the run goes on.
#[test]
fn no_failing_call_loses_a_point_that_was_counted() {
    let (whole, calls) = undisturbed();
    for at in 0..calls {
        let failing = disk(|state| state.fail_at = Some(at));
        let mut counted = Counted::default();
        let ended = run(failing, &mut counted);
        // the removal of the unfinished file, the last call, may fail unseen
        assert!(ended.is_err() || at + 1 == calls, "call {at}");
        holds(failing, &counted, &whole).unwrap_or_else(|why| panic!("call {at} failed: {why}"));
        // and in that very state the power is cut
        let after = failing.after_the_cut(&mut Random(at));
        holds(Box::leak(Box::new(after)), &counted, &whole)
            .unwrap_or_else(|why| panic!("call {at} failed, then the power: {why}"));
    }
}
