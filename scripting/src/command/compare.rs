//! `epiloom compare`: what differs between two archives, and whether it is more than numerical error.

use std::collections::{BTreeMap, BTreeSet};
use std::path::PathBuf;

use crate::archive::{
    Archive, ArchiveError, Cell, Figure, MaterialValue, Point, RunHeader, Snapshot, Status, Sweep,
    compare_bits,
};
use crate::figure_text::{figure_text, significant, unit_symbol};

use super::columns::{Align, columns};
use super::exit::Exit;
use super::output::Output;
use super::report::{figure_title, value_text};
use super::show::{condition, open, tell};

/// Material values that are written out for each difference.
const SHOWN: usize = 40;

/// `epiloom compare A B`.
#[derive(clap::Args, Debug)]
#[command(after_help = "\
A number has moved beyond its numerical error when the two values differ by more than the errors of both together; a
number that carries no error has moved when it differs at all. The command ends with 4 when anything did.")]
pub struct Compare {
    /// The first archive
    #[arg(value_hint = clap::ValueHint::FilePath)]
    pub first: PathBuf,
    /// The second archive
    #[arg(value_hint = clap::ValueHint::FilePath)]
    pub second: PathBuf,
}

/// What has come of comparing so far.
#[derive(Default)]
struct Told {
    text: String,
    beyond: bool,
}

impl Told {
    fn section(&mut self, title: &str, rows: &[Vec<String>], align: &[Align]) {
        if !rows.is_empty() {
            self.text.push_str(&format!("{title}\n{}", columns(rows, align, 2)));
        }
    }

    fn line(&mut self, line: &str) {
        self.text.push_str(line);
        self.text.push('\n');
    }
}

impl Compare {
    /// Compares them.
    pub fn run(&self, output: &mut Output) -> Exit {
        let (first, second) = match (open(&self.first, output), open(&self.second, output)) {
            (Ok(first), Ok(second)) => (first, second),
            (Err(exit), _) | (_, Err(exit)) => return exit,
        };
        let mut told = Told::default();
        match compare(&first, &second, &mut told) {
            Ok(()) => {}
            Err(error) => return tell(&error, output),
        }
        if told.text.is_empty() {
            told.line("the archives hold the same, to the bit");
        }
        output.result(&told.text);
        match (condition(&first), condition(&second)) {
            (Exit::Done, Exit::Done) if told.beyond => Exit::Differs,
            (Exit::Done, exit) | (exit, _) => exit,
        }
    }
}

fn compare(first: &Archive, second: &Archive, told: &mut Told) -> Result<(), ArchiveError> {
    if let (Ok(a), Ok(b)) = (first.run(), second.run()) {
        runs(a, b, told);
    }
    let names = |archive: &Archive| -> BTreeSet<String> {
        let snapshots = archive.entries().iter().map(|entry| entry.label.name.clone());
        snapshots.chain(archive.sweeps().iter().map(|sweep| sweep.name.clone())).collect()
    };
    let (in_first, in_second) = (names(first), names(second));
    for (which, names) in
        [("first", in_first.difference(&in_second)), ("second", in_second.difference(&in_first))]
    {
        for name in names {
            told.line(&format!("`{name}` is in the {which} archive only"));
            told.beyond = true;
        }
    }
    let mut materials: BTreeMap<[String; 3], (String, String)> = BTreeMap::new();
    for entry in first.entries() {
        let name = &entry.label.name;
        if !second.entries().iter().any(|other| other.label.name == *name) {
            continue;
        }
        let (a, b) = (first.snapshot(name)?, second.snapshot(name)?);
        changed_materials(&a.materials, &b.materials, &mut materials);
        snapshots(&a, &b, told);
    }
    let rows: Vec<Vec<String>> = materials
        .into_iter()
        .take(SHOWN)
        .map(|([layer, material, parameter], (a, b))| {
            vec![format!("{parameter} of {material}"), format!("in `{layer}`"), a, b]
        })
        .collect();
    told.section("material values", &rows, &[]);
    for sweep in first.sweeps() {
        if let Ok(other) = second.sweep(&sweep.name) {
            sweeps((first, sweep), (second, other), told)?;
        }
    }
    Ok(())
}

/// Versions, scripts, inputs, data files and tolerances.
fn runs(a: &RunHeader, b: &RunHeader, told: &mut Told) {
    let mut rows: Vec<Vec<String>> = Vec::new();
    let mut row = |what: String, a: String, b: String| rows.push(vec![what, a, b]);
    if a.program_version != b.program_version {
        row("version".to_string(), a.program_version.clone(), b.program_version.clone());
    }
    if a.script_name != b.script_name {
        row("script".to_string(), a.script_name.clone(), b.script_name.clone());
    }
    if a.script_text != b.script_text {
        let lines = a.script_text.lines().zip(b.script_text.lines());
        let same = lines.take_while(|(x, y)| x == y).count();
        let line = |text: &str| text.lines().nth(same).map_or("(its end)", str::trim).to_string();
        row(format!("script, from line {} on", same + 1), line(&a.script_text), line(&b.script_text));
    }
    let none = || "none".to_string();
    let inputs: BTreeSet<&String> = a.inputs.keys().chain(b.inputs.keys()).collect();
    for name in inputs {
        let value = |run: &RunHeader| run.inputs.get(name).map_or_else(none, |input| value_text(&input.used));
        if a.inputs.get(name).map(|input| &input.used) != b.inputs.get(name).map(|input| &input.used) {
            row(format!("input {name}"), value(a), value(b));
        }
    }
    let files: BTreeSet<&String> = a.data_files.keys().chain(b.data_files.keys()).collect();
    for name in files {
        let (x, y) = (a.data_files.get(name), b.data_files.get(name));
        let shown = |file: Option<&crate::archive::DataFile>| {
            file.map_or_else(none, |file| {
                format!("{} bytes, BLAKE3 {}", file.length, file.blake3.get(..12).unwrap_or(""))
            })
        };
        if x != y {
            row(format!("data file {name}"), shown(x), shown(y));
        }
    }
    for each in &a.tolerances {
        let other = b.tolerances.iter().find(|other| other.name == each.name);
        if other.map(|other| &other.value) != Some(&each.value) {
            row(
                each.name.clone(),
                value_text(&each.value),
                other.map_or_else(none, |it| value_text(&it.value)),
            );
        }
    }
    told.section("runs", &rows, &[]);
}

/// Material values that differ, once for each layer and parameter.
fn changed_materials(
    a: &[MaterialValue],
    b: &[MaterialValue],
    into: &mut BTreeMap<[String; 3], (String, String)>,
) {
    let key = |each: &MaterialValue| [each.layer.clone(), each.material.clone(), each.parameter.clone()];
    let others: BTreeMap<[String; 3], &MaterialValue> = b.iter().map(|each| (key(each), each)).collect();
    for each in a {
        if let Some(other) = others.get(&key(each)).filter(|other| other.value != each.value) {
            into.entry(key(each)).or_insert_with(|| (value_text(&each.value), value_text(&other.value)));
        }
    }
}

/// How far a number has moved, in words; nothing where it is the same to the bit.
fn moved(a: (f64, Option<f64>), b: (f64, Option<f64>)) -> Option<(bool, &'static str)> {
    if a.0.to_bits() == b.0.to_bits() {
        return None;
    }
    match (a.1, b.1) {
        (Some(x), Some(y)) if (a.0 - b.0).abs() <= x.abs() + y.abs() => Some((false, "within its error")),
        (Some(_), Some(_)) => Some((true, "beyond its error")),
        _ => Some((true, "moved; it carries no error")),
    }
}

/// The change from one number to another, relative where that has a meaning.
fn change(a: f64, b: f64, unit: &str) -> String {
    let difference = b - a;
    let sign = if difference > 0.0 { "+" } else { "" };
    let symbol = unit_symbol(unit);
    let absolute = format!("{sign}{} {symbol}", significant(difference, 3)).trim_end().to_string();
    if a != 0.0 && (difference / a).is_finite() {
        format!("{absolute} ({sign}{} %)", significant(100.0 * difference / a.abs(), 3))
    } else {
        absolute
    }
}

fn snapshots(a: &Snapshot, b: &Snapshot, told: &mut Told) {
    if compare_bits(a, b).is_empty() {
        return;
    }
    let mut rows: Vec<Vec<String>> = Vec::new();
    if a.label.status != b.label.status {
        let shown = |status: &Status| match status {
            Status::Solved => "solved".to_string(),
            Status::Failed { reason } => format!("failed: {reason}"),
        };
        rows.push(vec!["status".to_string(), shown(&a.label.status), shown(&b.label.status)]);
        told.beyond = true;
    }
    for figure in &a.figures {
        let Some(other) = b.figure(&figure.name) else { continue };
        let shown = |figure: &Figure| match figure.value {
            Some(value) => figure_text(value, figure.error, &figure.unit),
            None => "none".to_string(),
        };
        let (how, by) = match (figure.value, other.value) {
            (Some(x), Some(y)) => match moved((x, figure.error), (y, other.error)) {
                Some(how) => (how, change(x, y, &figure.unit)),
                None => continue,
            },
            (None, None) => continue,
            _ => ((true, "only one has a value"), String::new()),
        };
        told.beyond |= how.0;
        rows.push(vec![figure_title(&figure.name), shown(figure), shown(other), by, how.1.to_string()]);
    }
    for table in &a.tables {
        let Some(other) = b.table(&table.name) else { continue };
        for column in &table.columns {
            let Some(values) = other.column(&column.name).map(|it| &it.values) else { continue };
            let place = format!("table {}, {}", table.name, column.name);
            if values.len() != column.values.len() {
                rows.push(vec![
                    place,
                    format!("{} rows", column.values.len()),
                    format!("{} rows", values.len()),
                ]);
                told.beyond = true;
                continue;
            }
            if let Some(text) = differing(&column.values, values, &column.unit) {
                rows.push(vec![place, text]);
                told.beyond = true;
            }
        }
    }
    let lines = |snapshot: &Snapshot| -> Vec<(String, Option<f64>, String)> {
        let each =
            snapshot.ledgers.iter().flat_map(|ledger| ledger.lines.iter().map(move |line| (ledger, line)));
        each.map(|(ledger, line)| {
            (
                format!("ledger {}, {}, {}", ledger.title, line.group, line.label),
                line.value,
                line.unit.clone(),
            )
        })
        .collect()
    };
    let (mine, theirs) = (lines(a), lines(b));
    let mut ledger = 0;
    let mut largest: Option<(f64, String)> = None;
    for (name, value, unit) in &mine {
        let other = theirs.iter().find(|(other, ..)| other == name);
        if let (Some(x), Some(y)) = (value, other.and_then(|other| other.1))
            && x.to_bits() != y.to_bits()
        {
            ledger += 1;
            let by = (y - x).abs();
            if largest.as_ref().is_none_or(|(most, _)| by > *most) {
                largest = Some((by, format!("{name}: {}", change(*x, y, unit))));
            }
        }
    }
    if let Some((_, text)) = largest {
        rows.push(vec!["ledgers".to_string(), format!("{ledger} lines, most in {text}")]);
    }
    if rows.is_empty() {
        told.line(&format!(
            "`{}`: the same figures and tables; stack, sources or warnings differ",
            a.label.name
        ));
        return;
    }
    told.section(&format!("`{}`", a.label.name), &rows, &[]);
}

/// How many numbers of two equally long columns differ, and where most; nothing where none does.
fn differing(a: &[f64], b: &[f64], unit: &str) -> Option<String> {
    let pairs = || a.iter().zip(b).enumerate().filter(|(_, (x, y))| x.to_bits() != y.to_bits());
    let count = pairs().count();
    let (row, (x, y)) = pairs().max_by(|p, q| (p.1.0 - p.1.1).abs().total_cmp(&(q.1.0 - q.1.1).abs()))?;
    Some(format!("{count} of {} numbers, most in row {row}: {}", a.len(), change(*x, *y, unit)))
}

/// One output of a sweep over all points.
#[derive(Default)]
struct OutputMoves {
    points: u64,
    beyond: u64,
    most: f64,
    example: String,
}

fn sweeps(
    (first, a): (&Archive, &Sweep),
    (second, b): (&Archive, &Sweep),
    told: &mut Told,
) -> Result<(), ArchiveError> {
    let title = format!("sweep `{}`", a.name);
    if let (Some(x), Some(y)) = (a.record(), b.record())
        && (x.start.plan != y.start.plan || x.start.points != y.start.points)
    {
        told.line(&format!("{title}: the plans differ: {} and {}", x.start.plan, y.start.plan));
    }
    let mut others = second.points(b).peekable();
    let mut only = [0_u64; 2];
    let (mut common, mut status, mut elsewhere) = (0_u64, 0_u64, 0_u64);
    let mut moves: BTreeMap<String, OutputMoves> = BTreeMap::new();
    for mine in first.points(a) {
        let mine = mine?.point;
        while let Some(other) =
            others.next_if(|other| other.as_ref().is_ok_and(|it| it.point.index < mine.index))
        {
            other?;
            only[1] += 1;
        }
        let Some(theirs) =
            others.next_if(|other| other.as_ref().map_or(true, |it| it.point.index == mine.index))
        else {
            only[0] += 1;
            continue;
        };
        let theirs = theirs?.point;
        common += 1;
        if format!("{:?}", mine.coordinates) != format!("{:?}", theirs.coordinates) {
            elsewhere += 1;
            continue;
        }
        if mine.status != theirs.status {
            status += 1;
        }
        outputs(&mine, &theirs, &mut moves);
    }
    for other in others {
        other?;
        only[1] += 1;
    }
    let mut rows: Vec<Vec<String>> = Vec::new();
    for (count, what) in [
        (only[0], "points in the first archive only"),
        (only[1], "points in the second archive only"),
        (elsewhere, "points at other coordinates, not compared"),
        (status, "points that failed in one only, or for another reason"),
    ] {
        if count > 0 {
            rows.push(vec![what.to_string(), count.to_string()]);
            told.beyond = true;
        }
    }
    for (name, moves) in moves {
        told.beyond |= moves.beyond > 0;
        rows.push(vec![
            name,
            format!("{} of {common} points moved", moves.points),
            format!("{} beyond its error", moves.beyond),
            format!("most at {}", moves.example),
        ]);
    }
    told.section(&title, &rows, &[]);
    Ok(())
}

fn outputs(a: &Point, b: &Point, moves: &mut BTreeMap<String, OutputMoves>) {
    for output in &a.outputs {
        let Some(other) = b.output(&output.column.name) else { continue };
        let (how, by, text) = match (&output.cell, &other.cell) {
            (Cell::Number { value: x, error: e }, Cell::Number { value: y, error: f }) => {
                match moved((*x, *e), (*y, *f)) {
                    Some((beyond, _)) => (beyond, (y - x).abs(), change(*x, *y, &output.column.unit)),
                    None => continue,
                }
            }
            (x, y) if x == y => continue,
            (x, y) => (true, f64::INFINITY, format!("{x:?} and {y:?}")),
        };
        let entry = moves.entry(output.column.name.clone()).or_default();
        entry.points += 1;
        entry.beyond += u64::from(how);
        if entry.points == 1 || by > entry.most {
            (entry.most, entry.example) = (by, format!("point {}: {text}", a.index));
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    /// Source of truth: sums of errors by hand.
    #[test]
    fn a_number_has_moved_beyond_its_error_or_not() {
        assert_eq!(moved((1.0, Some(0.1)), (1.0, Some(0.2))), None);
        assert_eq!(moved((1.0, Some(0.125)), (1.25, Some(0.125))).map(|it| it.0), Some(false));
        assert_eq!(moved((1.0, Some(0.125)), (1.375, Some(0.125))).map(|it| it.0), Some(true));
        assert_eq!(moved((1.0, None), (1.0_f64.next_up(), Some(1.0))).map(|it| it.0), Some(true));
        assert_eq!(change(2.0, 2.5, "V"), "+0.5 V (+25 %)");
        assert_eq!(change(0.0, -2.5, ""), "-2.5");
        assert_eq!(
            differing(&[1.0, 2.0], &[1.0, 4.0], "V").as_deref(),
            Some("1 of 2 numbers, most in row 1: +2 V (+100 %)")
        );
        assert_eq!(differing(&[1.0], &[1.0], "V"), None);
    }
}
