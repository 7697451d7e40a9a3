//! Making one run of its parts: each part is a finished archive that solved one share of every plan.

use std::path::{Path, PathBuf};

use super::error::ArchiveError;
use super::model::RunHeader;
use super::reader::Archive;
use super::stored::Points;
use super::sweep::{Point, Share, SweepRecord};
use super::writer::Writer;

/// Points that are written and synced at once.
const BATCH: usize = 4096;

/// Why archives are not the parts of one run, in words for a person.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct NotParts {
    /// What is wrong.
    pub what: String,
    /// How to mend it, where that can be said.
    pub mend: Option<String>,
}

fn fault(what: impl Into<String>) -> NotParts {
    NotParts { what: what.into(), mend: None }
}

/// The parts of one run: all there, each once, each whole.
#[derive(Debug)]
pub struct Parts {
    archives: Vec<(PathBuf, Archive)>,
    run: RunHeader,
    /// The sweeps of the run, as they are described where nothing is left out of them.
    sweeps: Vec<SweepRecord>,
}

impl Parts {
    /// Holds the archives against each other.
    ///
    /// # Errors
    /// One that is not finished or damaged, of another script, run or division; a part that is missing or there twice;
    /// a sweep that a part has not finished.
    pub fn of(archives: Vec<(PathBuf, Archive)>) -> Result<Parts, NotParts> {
        let mut found: Vec<(Share, usize)> = Vec::new();
        let mut run: Option<(&PathBuf, &RunHeader)> = None;
        for (at, (path, archive)) in archives.iter().enumerate() {
            let shown = path.display();
            if !archive.is_finished() {
                return Err(NotParts {
                    what: format!("`{shown}` is not finished"),
                    mend: Some("run that part again: it goes on from what is stored".to_owned()),
                });
            }
            let Ok(described) = archive.run() else {
                return Err(fault(format!("the description of the run in `{shown}` is damaged")));
            };
            if let Some(warning) = archive.warnings().first() {
                return Err(fault(format!("`{shown}`: {warning}")));
            }
            match run {
                None => run = Some((path, described)),
                Some((other, expected)) => {
                    if let Some(what) = difference(expected, described) {
                        let other = other.display();
                        return Err(fault(format!("`{shown}` and `{other}` are of different runs: {what}")));
                    }
                }
            }
            let mut shares = archive.sweeps().iter().filter_map(|sweep| sweep.record());
            match shares.next().map(|record| record.share) {
                Some(Some(share)) => found.push((share, at)),
                Some(None) => return Err(fault(format!("`{shown}` is no part: it holds whole plans"))),
                None => return Err(fault(format!("`{shown}` holds no sweep, so it is no part of one"))),
            }
        }
        let Some((_, run)) = run else { return Err(fault("no part was given")) };
        let run = run.clone();
        all_there(&archives, found)?;
        let sweeps = same_sweeps(&archives)?;
        Ok(Parts { archives, run, sweeps })
    }

    /// The description of the run, the same in every part.
    pub fn run(&self) -> &RunHeader {
        &self.run
    }

    /// How many parts there are.
    pub fn count(&self) -> usize {
        self.archives.len()
    }

    /// Writes the points of all parts into the unfinished file of the whole, as an interrupted run would have left
    /// them. Points that stand there already are not written again.
    ///
    /// # Errors
    /// [`ArchiveError::DamagedPoints`], [`ArchiveError::DamagedSnapshot`] in a part, and what writing can meet.
    pub fn copy_into(&self, whole: &Path) -> Result<u64, ArchiveError> {
        let mut writer = Writer::resume(whole, &self.run, None)?;
        writer.update_run(&self.run)?;
        let mut copied = 0;
        for record in &self.sweeps {
            let name = &record.start.name;
            let there: Result<Vec<u64>, ArchiveError> =
                writer.adopt_sweep(record)?.map(|point| Ok(point?.index)).collect();
            let there = there?;
            let mut sources: Vec<Source<'_>> = Vec::new();
            for (_, archive) in &self.archives {
                let mut source = Source { archive, points: archive.points(archive.sweep(name)?), next: None };
                source.advance()?;
                sources.push(source);
            }
            let mut batch: Vec<Point> = Vec::new();
            let mut bytes = 0;
            // By index, so that finishing finds neighbours together.
            while let Some(source) =
                sources.iter_mut().filter(|each| each.next.is_some()).min_by_key(|each| each.index())
            {
                let Some(point) = source.take()? else { break };
                if there.binary_search(&point.index).is_ok() {
                    continue;
                }
                bytes += point.snapshots.len() << 16;
                batch.push(point);
                copied += 1;
                if batch.len() >= BATCH || bytes >= 1 << 26 {
                    writer.append_points(name, std::mem::take(&mut batch))?;
                    bytes = 0;
                }
            }
            if !batch.is_empty() {
                writer.append_points(name, batch)?;
            }
        }
        writer.abandon()?;
        Ok(copied)
    }
}

/// The points of one part, by index.
struct Source<'a> {
    archive: &'a Archive,
    points: Points<'a>,
    next: Option<super::sweep::StoredPoint>,
}

impl Source<'_> {
    fn advance(&mut self) -> Result<(), ArchiveError> {
        self.next = self.points.next().transpose()?;
        Ok(())
    }

    fn index(&self) -> u64 {
        self.next.as_ref().map_or(u64::MAX, |stored| stored.point.index)
    }

    /// The next point with what it stored.
    fn take(&mut self) -> Result<Option<Point>, ArchiveError> {
        let Some(stored) = self.next.take() else { return Ok(None) };
        self.advance()?;
        let snapshots: Result<_, ArchiveError> =
            stored.snapshots.iter().map(|place| self.archive.point_snapshot(place)).collect();
        Ok(Some(Point { snapshots: snapshots?, ..stored.point }))
    }
}

/// What differs between two descriptions of a run.
fn difference(a: &RunHeader, b: &RunHeader) -> Option<String> {
    if a.script_name != b.script_name {
        return Some(format!("scripts `{}` and `{}`", b.script_name, a.script_name));
    }
    if a.script_text != b.script_text {
        return Some("the script was changed in between".to_owned());
    }
    if a.program_version != b.program_version {
        return Some(format!("versions {} and {}", b.program_version, a.program_version));
    }
    if a.tolerances != b.tolerances {
        return Some("other tolerances".to_owned());
    }
    for (name, input) in &b.inputs {
        match a.inputs.get(name) {
            Some(other) if other == input => {}
            Some(other) => return Some(format!("input `{name}` is {} and {}", input.used, other.used)),
            None => return Some(format!("only one has the input `{name}`")),
        }
    }
    for (name, file) in &b.data_files {
        if a.data_files.get(name) != Some(file) {
            return Some(format!("the data file `{name}` differs"));
        }
    }
    (a != b).then(|| "one has read or declared more than the other".to_owned())
}

/// Whether each part of one division is there once.
fn all_there(archives: &[(PathBuf, Archive)], mut found: Vec<(Share, usize)>) -> Result<(), NotParts> {
    found.sort_by_key(|(share, _)| (share.of, share.number));
    let path = |at: usize| archives[at].0.display();
    let Some(&(first, _)) = found.first() else { return Err(fault("no part was given")) };
    for pair in found.windows(2) {
        let ((a, at), (b, bt)) = (pair[0], pair[1]);
        if a.of != b.of {
            return Err(fault(format!("`{}` is part {a} and `{}` is part {b}", path(at), path(bt))));
        }
        if a.number == b.number {
            return Err(fault(format!("part {a} is there twice: `{}` and `{}`", path(at), path(bt))));
        }
    }
    let has = |number: u64| found.binary_search_by_key(&number, |(share, _)| share.number).is_ok();
    let missing: Vec<u64> = (1..=first.of).filter(|number| !has(*number)).take(1000).collect();
    if missing.is_empty() {
        return Ok(());
    }
    let (noun, verb) = if missing.len() == 1 { ("part", "is") } else { ("parts", "are") };
    Err(NotParts {
        what: format!("{noun} {} of {} {verb} missing", ranges(&missing), first.of),
        mend: Some(format!("run them: epiloom run SCRIPT --part {}/{}", missing[0], first.of)),
    })
}

/// Ascending numbers as a person lists them: `3, 7 to 12`.
pub(crate) fn ranges(numbers: &[u64]) -> String {
    let mut text = String::new();
    let mut at = 0;
    while at < numbers.len() {
        let begin = at;
        while at + 1 < numbers.len() && numbers[at + 1] == numbers[at] + 1 {
            at += 1;
        }
        let (first, last) = (numbers[begin], numbers[at]);
        let piece = match last - first {
            0 => first.to_string(),
            1 => format!("{first}, {last}"),
            _ => format!("{first} to {last}"),
        };
        if !text.is_empty() {
            text.push_str(", ");
        }
        text.push_str(&piece);
        at += 1;
    }
    text
}

/// The sweeps of the run, each the same in all parts and complete in each.
fn same_sweeps(archives: &[(PathBuf, Archive)]) -> Result<Vec<SweepRecord>, NotParts> {
    let mut sweeps: Vec<SweepRecord> = Vec::new();
    for (place, (path, archive)) in archives.iter().enumerate() {
        let shown = path.display();
        for sweep in archive.sweeps() {
            // A finished archive without warnings has all descriptions.
            let Some(record) = sweep.record() else { continue };
            let name = &sweep.name;
            let complete = match (record.left_out, record.share) {
                (Some(left_out), Some(share)) => {
                    sweep.count().checked_add(left_out) == Some(share.count(record.start.points))
                }
                _ => false,
            };
            if !complete {
                return Err(fault(format!("`{shown}` does not hold all its points of the sweep `{name}`")));
            }
            let whole = SweepRecord { share: None, left_out: None, ..record.clone() };
            match sweeps.iter().find(|each| each.start.name == *name) {
                Some(known) if *known == whole => {}
                None if place == 0 => sweeps.push(whole),
                _ => {
                    return Err(fault(format!(
                        "the sweep `{name}` of `{shown}` is not that of the other parts"
                    )));
                }
            }
        }
        if archive.sweeps().len() != sweeps.len() {
            return Err(fault(format!("`{shown}` holds other sweeps than the other parts")));
        }
        // No point outside the share: the places of blocks tell for all but the points themselves.
        for sweep in archive.sweeps() {
            let share = sweep.record().and_then(|record| record.share);
            let outside = |index: u64| share.is_some_and(|share| !share.holds(index));
            if sweep.blocks.iter().any(|block| outside(block.first) || outside(block.last)) {
                return Err(fault(format!("`{shown}` holds points of another part")));
            }
        }
    }
    Ok(sweeps)
}
