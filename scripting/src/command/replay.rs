//! `epiloom replay`: runs an archived script again and compares bit by bit.

use std::collections::{BTreeMap, BTreeSet};
use std::path::{Path, PathBuf};

use crate::archive::{Archive, Difference, RunHeader, Snapshot, compare_bits};
use crate::diagnostics::{Diagnostic, SourceText, codes};
use crate::language::{self, InputRecord, RunOptions, Script, Sink};

use super::exit::Exit;
use super::inputs;
use super::output::Output;
use super::show::{condition, open, tell};

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
    differences: Vec<(String, Difference)>,
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
        let files = match self.data_files(run) {
            Ok(files) => files,
            Err(fault) => {
                output.diagnostic(&fault, None);
                return Exit::of(fault.code);
            }
        };
        let script =
            Script { name: run.script_name.clone(), text: run.script_text.clone(), folder: None, files };
        let set = run.inputs.iter().filter(|(_, input)| input.overridden);
        let options = RunOptions {
            set: set.map(|(name, input)| (name.clone(), inputs::typed(&input.used))).collect(),
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
            differences: Vec::new(),
        };
        let outcome = language::run(&script, options, &mut comparison);
        let Comparison { seen, extra, damaged, numbers, differences, .. } = comparison;
        output.end_progress();
        let source =
            SourceText::new(format!("{} in {}", script.name, self.file.display()), script.text.clone());
        // an unfinished archive may come from a script that stopped with these very faults
        for error in &outcome.errors {
            output.diagnostic(error, Some(&source));
        }
        let missing: Vec<&str> = archive
            .entries()
            .iter()
            .map(|e| e.label.name.as_str())
            .filter(|name| !seen.contains(*name))
            .collect();
        for name in &missing {
            output.remark(&format!("snapshot `{name}` did not come again"));
        }
        for name in extra.iter().filter(|_| archive.is_finished()) {
            output.remark(&format!("snapshot `{name}` is new: the archive does not hold it"));
        }
        for (name, difference) in differences.iter().take(SHOWN) {
            let Difference { place, first, second } = difference;
            output.result(&format!("`{name}`, {place}: archived {first}, now {second}\n"));
        }
        if differences.len() > SHOWN {
            output.result(&format!("and {} differences more\n", differences.len() - SHOWN));
        }
        let differs =
            !differences.is_empty() || !missing.is_empty() || (archive.is_finished() && !extra.is_empty());
        let compared = seen.len() - damaged.len();
        let verdict = match compared {
            _ if differs => "differs",
            0 => "nothing could be compared",
            _ => "every number is identical to the bit",
        };
        output.result(&format!(
            "{}: {verdict} ({compared} snapshots, {numbers} numbers)\n",
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

    /// The script's data files as they were, by their digests.
    fn data_files(&self, run: &RunHeader) -> Result<BTreeMap<String, Vec<u8>>, Box<Diagnostic>> {
        let folder = match (&self.data, self.file.parent()) {
            (Some(folder), _) => folder.clone(),
            (None, Some(parent)) if !parent.as_os_str().is_empty() => parent.to_path_buf(),
            _ => PathBuf::from("."),
        };
        let mut files = BTreeMap::new();
        for (name, recorded) in &run.data_files {
            let fault = |why: &str| {
                Diagnostic::new(codes::REPLAY_INPUT, format!("the data file `{name}` {why}")).help(
                    "give the script's folder, --data DIR, and other folders it was given, --allow-read DIR",
                )
            };
            let path = inside(&folder, &self.allow_read, name)
                .ok_or_else(|| fault("is not in the folder of data files"))?;
            let length = path.metadata().map(|m| m.len()).ok();
            if length != Some(recorded.length) {
                return Err(Box::new(fault("is not as long as it was")));
            }
            let bytes = std::fs::read(&path).map_err(|e| fault(&format!("cannot be read: {e}")))?;
            if blake3::hash(&bytes).to_hex().as_str() != recorded.blake3 {
                return Err(Box::new(fault("has changed since the archive was written")));
            }
            files.insert(name.clone(), bytes);
        }
        Ok(files)
    }
}

/// The regular file of this name, below the folder or one that was opened; an archive from elsewhere reaches no other.
fn inside(folder: &Path, allowed: &[PathBuf], name: &str) -> Option<PathBuf> {
    let path = folder.join(name).canonicalize().ok()?;
    let open = |folder: &Path| folder.canonicalize().is_ok_and(|folder| path.starts_with(folder));
    let found = open(folder) || allowed.iter().any(|folder| open(folder));
    (found && path.is_file()).then_some(path)
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
    fn print(&mut self, _: &str) {}

    fn input(&mut self, _: &InputRecord) {}

    fn data_file(&mut self, _: &language::DataFile) {}

    fn warning(&mut self, _: &Diagnostic) {}

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
                let differences = compare_bits(&archived, &snapshot);
                self.differences.extend(differences.into_iter().map(|difference| (name.clone(), difference)));
            }
            Err(error) => {
                tell(&error, self.output);
                self.damaged.push(name.clone());
            }
        }
        self.seen.insert(name);
        Ok(())
    }
}
