//! `epiloom replay`: runs an archived script again and compares bit by bit.

use std::collections::BTreeSet;
use std::path::PathBuf;

use crate::archive::{
    Archive, ArchiveError, Difference, Point, Share, Snapshot, SweepStart, compare_bits, compare_point,
};
use crate::diagnostics::{Diagnostic, SourceText, codes};
use crate::language::{self, Part, RunOptions, Sink, StoredPoints};

use super::archived::{archived_script, overrides};
use super::exit::Exit;
use super::output::Output;
use super::show::{condition, open, tell};
use super::sweeps::Tally;

/// Differences that are written out.
const SHOWN: usize = 20;

/// `epiloom replay FILE`.
#[derive(clap::Args, Debug)]
pub struct Replay {
    /// The archive
    #[arg(value_hint = clap::ValueHint::FilePath)]
    pub file: PathBuf,
    /// The folder of the script's data files, if it reads any [default: the archive's folder]
    #[arg(long, value_name = "DIR")]
    pub data: Option<PathBuf>,
    /// A folder outside it that data files lay in, as it was given to the run
    #[arg(long, value_name = "DIR", value_hint = clap::ValueHint::DirPath)]
    pub allow_read: Vec<PathBuf>,
}

/// Compares every snapshot with the archive's as it comes.
struct Comparison<'a> {
    output: &'a mut Output,
    archive: &'a Archive,
    seen: BTreeSet<String>,
    extra: Vec<String>,
    damaged: Vec<String>,
    numbers: usize,
    points: u64,
    /// The first differences, and how many there are.
    differences: Vec<(String, Difference)>,
    different: usize,
    share: Option<Share>,
    tally: Tally,
}

impl Replay {
    /// Runs it again.
    pub fn run(&self, output: &mut Output) -> Exit {
        let archive = match open(&self.file, output) {
            Ok(archive) => archive,
            Err(exit) => return exit,
        };
        let run = match archive.run() {
            Ok(run) => run,
            Err(error) => return tell(&error, output),
        };
        let version = env!("CARGO_PKG_VERSION");
        if run.program_version != version {
            let message =
                format!("the archive was written by version {}, this is {version}", run.program_version);
            output.diagnostic(&Diagnostic::new(codes::OTHER_VERSION, message), None);
        }
        let script = match archived_script(run, self.data.as_deref(), &self.file, &self.allow_read) {
            Ok(script) => script,
            Err(fault) => {
                output.diagnostic(&fault, None);
                return Exit::of(fault.code);
            }
        };
        // a part is replayed as that part
        let share = archive.sweeps().iter().find_map(|sweep| sweep.record()?.share);
        let options = RunOptions {
            set: overrides(run),
            part: share.map(|share| Part { number: share.number, of: share.of }),
            ..RunOptions::default()
        };
        output.show_progress();
        let mut comparison = Comparison {
            output,
            archive: &archive,
            seen: BTreeSet::new(),
            extra: Vec::new(),
            damaged: Vec::new(),
            numbers: 0,
            points: 0,
            differences: Vec::new(),
            different: 0,
            share,
            tally: Tally::default(),
        };
        let outcome = language::run(&script, options, &mut comparison);
        let Comparison { seen, extra, damaged, numbers, points, differences, different, .. } = comparison;
        output.end_progress();
        let source =
            SourceText::new(format!("{} in {}", script.name, self.file.display()), script.text.clone());
        // an unfinished archive may come from a script that stopped with these very faults
        for error in &outcome.errors {
            output.diagnostic(error, Some(&source));
        }
        let snapshots = archive.entries().iter().map(|e| e.label.name.as_str());
        let missing: Vec<&str> = snapshots
            .chain(archive.sweeps().iter().map(|sweep| sweep.name.as_str()))
            .filter(|name| !seen.contains(*name))
            .collect();
        for name in &missing {
            output.remark(&format!("`{name}` did not come again"));
        }
        for name in extra.iter().filter(|_| archive.is_finished()) {
            output.remark(&format!("`{name}` is new: the archive does not hold it"));
        }
        for (name, difference) in &differences {
            let Difference { place, first, second } = difference;
            output.result(&format!("`{name}`, {place}: archived {first}, now {second}\n"));
        }
        if different > differences.len() {
            output.result(&format!("and {} differences more\n", different - differences.len()));
        }
        let differs = different > 0 || !missing.is_empty() || (archive.is_finished() && !extra.is_empty());
        let sweeps = archive.sweeps().iter().filter(|sweep| seen.contains(&sweep.name)).count();
        let compared = seen.len() - sweeps - damaged.len();
        let verdict = match compared as u64 + points {
            _ if differs => "differs",
            0 => "nothing could be compared",
            _ => "every number is identical to the bit",
        };
        let points = if points > 0 { format!("{points} points, ") } else { String::new() };
        output.result(&format!(
            "{}: {verdict} ({compared} snapshots, {points}{numbers} numbers)\n",
            self.file.display()
        ));
        match () {
            () if outcome.interrupted => Exit::Interrupted,
            () if differs => Exit::Differs,
            () if !outcome.errors.is_empty() && archive.is_finished() => Exit::Fault,
            () if !damaged.is_empty() => Exit::Archive,
            () => condition(&archive),
        }
    }
}

impl Comparison<'_> {
    /// Counts differences and keeps the first ones.
    fn keep(&mut self, name: &str, differences: Vec<Difference>) {
        self.different += differences.len();
        let room = SHOWN.saturating_sub(self.differences.len());
        self.differences.extend(differences.into_iter().take(room).map(|each| (name.to_string(), each)));
    }

    /// Compares a point and what it stored with the archive's.
    fn point(&mut self, sweep: &str, point: &Point) {
        let name = format!("{sweep}/{}", point.index);
        let archived = match self.archive.point(sweep, point.index) {
            Ok(archived) => archived,
            // an unfinished archive or a part holds some of the points only
            Err(ArchiveError::NoSuchPoint { .. }) if !self.whole(sweep) => return,
            Err(ArchiveError::NoSuchPoint { .. }) => return self.extra.push(name),
            Err(error) => {
                if !self.damaged.contains(&sweep.to_string()) {
                    tell(&error, self.output);
                    self.damaged.push(sweep.to_string());
                }
                return;
            }
        };
        self.points += 1;
        let cells = archived.point.coordinates.iter().chain(archived.point.outputs.iter().map(|o| &o.cell));
        self.numbers += cells.filter(|cell| cell.number().is_some()).count();
        self.keep(&name, compare_point(&archived.point, point));
        for snapshot in &point.snapshots {
            let found = archived.snapshots.iter().find(|place| place.label.name == snapshot.name());
            match found.map(|place| self.archive.point_snapshot(place)) {
                None => self.extra.push(snapshot.name().to_string()),
                Some(Ok(stored)) => {
                    self.numbers += numbers(&stored);
                    self.keep(snapshot.name(), compare_bits(&stored, snapshot));
                }
                Some(Err(error)) => {
                    tell(&error, self.output);
                    self.damaged.push(snapshot.name().to_string());
                }
            }
        }
    }

    /// Whether the archive holds all points of the sweep's plan.
    fn whole(&self, sweep: &str) -> bool {
        let record = self.archive.sweep(sweep).ok().and_then(|sweep| sweep.record());
        record.is_some_and(|record| record.left_out.is_some() && record.share.is_none())
    }
}

/// Numbers of a snapshot that are compared.
fn numbers(snapshot: &Snapshot) -> usize {
    let figures =
        snapshot.figures.iter().map(|f| usize::from(f.value.is_some()) + f.meshes.len()).sum::<usize>();
    let tables = snapshot.tables.iter().flat_map(|t| &t.columns).map(|c| c.values.len()).sum::<usize>();
    let ledgers = snapshot.ledgers.iter().flat_map(|l| &l.lines).filter(|l| l.value.is_some()).count();
    figures + tables + ledgers
}

impl Sink for Comparison<'_> {
    fn working(&mut self, what: &str) {
        self.output.working(what);
    }

    fn snapshot(&mut self, snapshot: Snapshot) -> Result<(), String> {
        self.output.stored();
        let name = snapshot.name().to_string();
        if !self.archive.entries().iter().any(|entry| entry.label.name == name) {
            self.extra.push(name);
            return Ok(());
        }
        match self.archive.snapshot(&name) {
            Ok(archived) => {
                self.numbers += numbers(&archived);
                self.keep(&name, compare_bits(&archived, &snapshot));
            }
            Err(error) => {
                tell(&error, self.output);
                self.damaged.push(name.clone());
            }
        }
        self.seen.insert(name);
        Ok(())
    }

    fn sweep(&mut self, sweep: &SweepStart) -> Result<StoredPoints, String> {
        match self.archive.sweep(&sweep.name) {
            Ok(archived) => {
                self.seen.insert(sweep.name.clone());
                if let Some(record) = archived.record().filter(|record| record.start != *sweep) {
                    let difference = Difference {
                        place: "plan".to_string(),
                        first: record.start.plan.clone(),
                        second: sweep.plan.clone(),
                    };
                    self.keep(&sweep.name, vec![difference]);
                }
            }
            Err(_) => self.extra.push(sweep.name.clone()),
        }
        let total = self.share.map_or(sweep.points, |share| share.count(sweep.points));
        self.output.sweep_begins(&sweep.name, total, 0);
        self.tally = Tally::default();
        Ok(Box::new(std::iter::empty()))
    }

    fn points(&mut self, sweep: &SweepStart, points: Vec<Point>) -> Result<(), String> {
        for point in &points {
            self.tally.count(point);
            if self.seen.contains(&sweep.name) {
                self.point(&sweep.name, point);
            }
        }
        self.output.sweep_goes_on(self.tally.done, self.tally.failed);
        Ok(())
    }

    fn sweep_done(&mut self, sweep: &SweepStart, _left_out: u64) {
        self.output.sweep_ends();
        let archived = self.archive.sweep(&sweep.name).map_or(0, |sweep| sweep.count());
        if self.tally.done < archived {
            self.extra.push(format!("{}: fewer points", sweep.name));
        }
    }
}
