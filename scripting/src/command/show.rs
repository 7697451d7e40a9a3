//! `epiloom show`: what an archive holds.

use std::collections::BTreeMap;
use std::fmt::Write as _;
use std::io::{BufWriter, Write};
use std::path::{Path, PathBuf};

use crate::archive::export::{
    Form, OrderError, Row, Sheet, json_listing, json_point, json_sheet, json_snapshot,
};
use crate::archive::{Archive, ArchiveError, RunHeader, Status, Sweep};
use crate::diagnostics::{Diagnostic, codes};

use super::columns::{Align, columns};
use super::exit::Exit;
use super::output::Output;
use super::overview::{Look, overview, small_plot, stack_picture};
use super::report::{snapshot_text, stack_text, value_text, warnings_text};
use super::table::{FIRST_ROWS, TableText, point_of, point_text, sweep_line};
use super::trouble::{archive_error, archive_warning, damage};

/// `epiloom show FILE [SNAPSHOT]`.
#[derive(clap::Args, Debug)]
#[command(after_help = "\
`map/12` is point 12 of the sweep `map`, and `map/12/bands` what that point stored as `bands`: one point of a million is
read without the others. `--table map` shows the sweep, a row a point, numbers to the place of their numerical error.")]
pub struct Show {
    /// The archive
    #[arg(value_hint = clap::ValueHint::FilePath)]
    pub file: PathBuf,
    /// The snapshot, or a point of a sweep such as map/12; without one all are listed
    pub snapshot: Option<String>,
    /// Print JSON, with every number of the snapshot, the point or the table
    #[arg(long)]
    pub json: bool,
    /// The sweep to show as a table
    #[arg(long, value_name = "SWEEP", conflicts_with = "snapshot")]
    pub table: Option<String>,
    /// Order the table by this column, points without a value last
    #[arg(long, value_name = "COLUMN", requires = "table")]
    pub sort: Option<String>,
    /// The largest first
    #[arg(long, requires = "sort")]
    pub descending: bool,
    /// Show all rows of the table, not the first ones only
    #[arg(long, requires = "table", conflicts_with = "rows")]
    pub all: bool,
    /// Rows of the table to show
    #[arg(long, value_name = "N", requires = "table", default_value_t = FIRST_ROWS)]
    pub rows: usize,
    /// Print no drawings, for logs
    #[arg(long)]
    pub plain: bool,
}

impl Show {
    /// Shows it.
    pub fn run(&self, output: &mut Output) -> Exit {
        let archive = match open(&self.file, output) {
            Ok(archive) => archive,
            Err(exit) => return exit,
        };
        if let Some(name) = &self.table {
            return self.table(&archive, name, output);
        }
        let look = Look { plain: self.plain, width: output.width() };
        let mut all_whole = true;
        let text = match (&self.snapshot, self.json) {
            (None, json) => {
                all_whole = tell_damaged(&archive, output);
                if json { json_listing(&archive) } else { Ok(listing(&archive, look).into_bytes()) }
            }
            (Some(name), json) if let Some((sweep, index)) = point_of(&archive, name) => {
                archive.point(&sweep.name, index).and_then(|point| {
                    if json { json_point(sweep, &point) } else { Ok(point_text(sweep, &point).into_bytes()) }
                })
            }
            (Some(name), json) => archive.snapshot(name).and_then(|snapshot| {
                if json {
                    return json_snapshot(&snapshot);
                }
                // figures that a script put together itself belong to no stack
                let mut text = String::new();
                if !snapshot.stack.layers.is_empty() {
                    text = format!("{}\n", stack_text(&snapshot.stack));
                    if !look.plain {
                        text.push_str(&format!("{}\n", stack_picture(&snapshot.stack, look)));
                    }
                }
                let plot = small_plot(&snapshot, look);
                let warnings = warnings_text(&snapshot.warnings);
                text.push_str(&format!("{}{plot}{warnings}", snapshot_text(&snapshot)));
                Ok(text.into_bytes())
            }),
        };
        match text {
            Ok(text) => {
                output.result(&String::from_utf8_lossy(&text));
                if all_whole { condition(&archive) } else { Exit::Archive }
            }
            Err(error) => tell(&error, output),
        }
    }
}

impl Show {
    /// Shows a sweep as a table.
    fn table(&self, archive: &Archive, name: &str, output: &mut Output) -> Exit {
        let shown = archive.sweep(name).map_err(OrderError::from).and_then(|sweep| {
            let form = Form::of(archive, sweep)?;
            if self.json {
                json_sheet(&form, archive, sweep, BufWriter::with_capacity(1 << 16, Results(output)))?;
                return Ok(());
            }
            self.rows_of(archive, sweep, &form, output)
        });
        match shown {
            Ok(()) => condition(archive),
            Err(OrderError::Archive(error)) => tell(&error, output),
            Err(OrderError::Unknown(names)) => {
                let wanted = self.sort.as_deref().unwrap_or_default();
                let fault = Diagnostic::new(
                    codes::UNKNOWN_SNAPSHOT,
                    format!("the sweep `{name}` has no column `{wanted}`"),
                );
                output.diagnostic(&fault.help(format!("there is point, {}", names.join(", "))), None);
                Exit::Usage
            }
        }
    }

    /// Prints the rows that are wanted, some at a time.
    fn rows_of(
        &self,
        archive: &Archive,
        sweep: &Sweep,
        form: &Form,
        output: &mut Output,
    ) -> Result<(), OrderError> {
        let most = if self.all { form.rows } else { self.rows.min(form.rows) };
        let order = match &self.sort {
            Some(column) => Some(form.order(archive, sweep, column, self.descending, most)?),
            None => None,
        };
        let all = 0..form.columns.len();
        let each = |take: &mut dyn FnMut(Sheet)| -> Result<(), ArchiveError> {
            let Some(order) = &order else {
                let mut rows = form.rows(archive, sweep).take(most);
                let stretches = most.div_ceil(AT_ONCE);
                for _ in 0..stretches {
                    take(form.gathered(all.clone(), rows.by_ref().take(AT_ONCE))?);
                }
                return Ok(());
            };
            for wanted in order.chunks(AT_ONCE) {
                let wanted: BTreeMap<usize, usize> =
                    wanted.iter().enumerate().map(|(at, place)| (*place, at)).collect();
                let mut found: Vec<(usize, Row)> = Vec::new();
                for (place, row) in form.rows(archive, sweep).enumerate() {
                    if let Some(at) = wanted.get(&place) {
                        found.push((*at, row?));
                    }
                }
                found.sort_by_key(|(at, _)| *at);
                take(form.gathered(all.clone(), found.into_iter().map(|(_, row)| Ok(row)))?);
            }
            Ok(())
        };
        let mut table = TableText::new(form);
        let mut kept = Vec::new();
        each(&mut |sheet| {
            table.measure(&sheet);
            // a short table is not read again
            if most <= AT_ONCE {
                kept.push(sheet);
            }
        })?;
        output.result(&table.head());
        match kept.is_empty() {
            true => each(&mut |sheet| output.result(&table.rows(&sheet)))?,
            false => kept.iter().for_each(|sheet| output.result(&table.rows(sheet))),
        }
        output.result(&table.rest(most));
        Ok(())
    }
}

/// Rows of a table that are in memory at once.
const AT_ONCE: usize = 50_000;

/// Standard output for what is written in pieces.
struct Results<'a>(&'a mut Output);

impl Write for Results<'_> {
    fn write(&mut self, bytes: &[u8]) -> std::io::Result<usize> {
        // the buffer before it keeps pieces whole, and what writes JSON gives whole letters
        self.0.result(&String::from_utf8_lossy(bytes));
        Ok(bytes.len())
    }
    fn flush(&mut self) -> std::io::Result<()> {
        Ok(())
    }
}

/// Reads every snapshot and every point, names the damaged ones, and says whether all are whole.
fn tell_damaged(archive: &Archive, output: &mut Output) -> bool {
    match archive.verify() {
        Ok(damaged) => {
            // what was found on opening is told already
            for warning in damaged.iter().filter(|each| !archive.warnings().contains(each)) {
                output.diagnostic(&damage(warning), None);
            }
            damaged.is_empty()
        }
        Err(error) => {
            tell(&error, output);
            false
        }
    }
}

/// Opens an archive and says what is amiss in it.
///
/// # Errors
/// How the command ends when it cannot be opened at all.
pub fn open(path: &Path, output: &mut Output) -> Result<Archive, Exit> {
    let archive = Archive::open(path).map_err(|error| tell(&error, output))?;
    for warning in archive.warnings() {
        output.diagnostic(&archive_warning(warning), None);
    }
    Ok(archive)
}

/// How a command ends that has shown what is whole in an archive.
pub fn condition(archive: &Archive) -> Exit {
    if archive.warnings().is_empty() { Exit::Done } else { Exit::Archive }
}

/// Prints the fault; the way the command ends.
pub fn tell(error: &ArchiveError, output: &mut Output) -> Exit {
    let fault = archive_error(error);
    output.diagnostic(&fault, None);
    Exit::of(fault.code)
}

/// The run and the list of snapshots.
fn listing(archive: &Archive, look: Look) -> String {
    let mut text = match archive.run() {
        Ok(run) => run_text(run),
        // said among the archive's warnings
        Err(_) => String::new(),
    };
    text.push_str(&overview(archive, look));
    let mut rows = vec![vec!["snapshot".to_string(), "kind".to_string(), String::new()]];
    for (index, entry) in archive.entries().iter().enumerate() {
        let status = match (&entry.label.status, archive.snapshot_at(index)) {
            (_, Err(_)) => "damaged".to_string(),
            (Status::Failed { reason }, _) => format!("failed: {reason}"),
            (Status::Solved, Ok(_)) => String::new(),
        };
        rows.push(vec![entry.label.name.clone(), entry.label.kind.clone(), status]);
    }
    if rows.len() > 1 || archive.sweeps().is_empty() {
        text.push_str(&columns(&rows, &[], 0));
    }
    if !archive.sweeps().is_empty() {
        if rows.len() > 1 {
            text.push('\n');
        }
        let mut rows = vec![vec!["sweep".to_string(), "points".to_string(), "plan".to_string()]];
        rows.extend(archive.sweeps().iter().map(sweep_line));
        text.push_str(&columns(&rows, &[], 0));
    }
    text
}

fn run_text(run: &RunHeader) -> String {
    let mut text = format!("script {}, run by epiloom {}\n", run.script_name, run.program_version);
    let inputs: Vec<Vec<String>> = run
        .inputs
        .iter()
        .map(|(name, input)| {
            let origin = if input.overridden {
                format!("set from outside, {} in the script", value_text(&input.default))
            } else {
                String::new()
            };
            vec![format!("input {name}"), value_text(&input.used), origin]
        })
        .collect();
    text.push_str(&columns(&inputs, &[Align::Left], 2));
    for each in &run.tolerances {
        // writing to a text cannot fail, here and below
        let _ = writeln!(text, "  {}: {}", each.name, value_text(&each.value));
    }
    for (name, file) in &run.data_files {
        let _ = writeln!(text, "  data file {name}, {} bytes, BLAKE3 {}", file.length, file.blake3);
    }
    text.push('\n');
    text
}
