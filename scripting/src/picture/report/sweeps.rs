//! The sweeps of an archive for a page: what was varied, what each point gave, and which of its snapshots the page holds.

use std::collections::BTreeMap;

use serde_json::{Value as Json, json};

use crate::archive::{Archive, Cell, Point, Status, Sweep, SweepColumn};
use crate::figure_text::significant;
use crate::picture::chart::{Chart, Kind, si_unit};
use crate::picture::charts::table::{Choice, Columns, Numbers, chart};

use super::contents::Held;
use super::numbers::Pool;
use super::view::chart_json;

/// Most maps that are drawn of one sweep: one for each of its outputs.
const MOST_MAPS: usize = 8;

/// A sweep read whole.
#[derive(Clone, Debug, Default)]
pub struct HeldSweep {
    /// Its name.
    pub name: String,
    /// The plan in words.
    pub plan: String,
    /// Points of the whole plan; none where the description is damaged.
    pub planned: Option<u64>,
    /// The share of the plan that the run solves, where it is not the whole.
    pub share: Option<String>,
    /// How many indices the filter of the plan leaves out.
    pub left_out: u64,
    /// What was varied.
    pub coordinates: Vec<SweepColumn>,
    /// The points in the order of the plan.
    pub points: Vec<HeldPoint>,
    /// What could not be read, in words.
    pub troubles: Vec<String>,
}

/// A point, and its snapshots by their place among those of all points.
#[derive(Clone, Debug, Default)]
pub struct HeldPoint {
    /// The point without its snapshots.
    pub point: Point,
    /// Its snapshots, in the order of the script.
    pub snapshots: Vec<usize>,
}

impl HeldSweep {
    /// Reads a sweep; the snapshots of its points are added to `inner`.
    pub(super) fn of(archive: &Archive, sweep: &Sweep, inner: &mut Vec<Held>) -> HeldSweep {
        let mut held = HeldSweep { name: sweep.name.clone(), ..HeldSweep::default() };
        if let Some(record) = sweep.record() {
            held.plan = record.start.plan.clone();
            held.planned = Some(record.start.points);
            held.share = record.share.map(|share| share.to_string());
            held.left_out = record.left_out.unwrap_or(0);
            held.coordinates = record.start.coordinates.clone();
        }
        for stored in archive.points(sweep) {
            match stored {
                Ok(stored) => {
                    let snapshots = stored.snapshots.iter().map(|place| {
                        inner.push(match archive.point_snapshot(place) {
                            Ok(snapshot) => Held::Whole(Box::new(snapshot)),
                            Err(error) => {
                                Held::Damaged { label: place.label.clone(), reason: error.to_string() }
                            }
                        });
                        inner.len() - 1
                    });
                    let snapshots = snapshots.collect();
                    held.points.push(HeldPoint { point: stored.point, snapshots });
                }
                Err(error) => held.troubles.push(error.to_string()),
            }
        }
        held
    }

    /// How many points failed.
    pub fn failed(&self) -> usize {
        self.points.iter().filter(|held| held.point.status != Status::Solved).count()
    }

    /// Its coordinates, then what the points returned, by name and unit; a cell a point.
    fn columns(&self) -> Vec<(SweepColumn, bool, Vec<Option<&Cell>>)> {
        let coordinates = self.coordinates.iter().enumerate().map(|(place, column)| {
            let cells = self.points.iter().map(|held| held.point.coordinates.get(place));
            (column.clone(), true, cells.collect())
        });
        let mut outputs: BTreeMap<(&str, &str), Vec<Option<&Cell>>> = BTreeMap::new();
        for (row, held) in self.points.iter().enumerate() {
            for output in &held.point.outputs {
                let key = (output.column.name.as_str(), output.column.unit.as_str());
                outputs.entry(key).or_insert_with(|| vec![None; self.points.len()])[row] = Some(&output.cell);
            }
        }
        let outputs = outputs.into_iter().map(|((name, unit), cells)| {
            (SweepColumn { name: name.to_string(), unit: unit.to_string() }, false, cells)
        });
        coordinates.chain(outputs).collect()
    }

    /// The columns that hold numbers, and the coordinates of texts, for charts.
    fn numbers(&self) -> Columns {
        let columns = self.columns().into_iter().filter_map(|(column, varied, cells)| {
            let made = Numbers { name: column.name, unit: column.unit, varied, ..Numbers::default() };
            if all_numbers(&cells) {
                Some(Numbers { values: values(&cells), error: errors(&cells), ..made })
            } else if varied {
                let texts: Vec<Option<&str>> = cells.iter().map(|cell| cell.and_then(as_text)).collect();
                Some(made.counting(&texts))
            } else {
                None
            }
        });
        let mut notes = Vec::new();
        match self.failed() {
            0 => {}
            failed => notes.push(format!("{failed} of {} points failed and are left out", self.points.len())),
        }
        Columns { columns: columns.collect(), notes, conditions: self.plan.clone() }
    }

    /// Its charts: a map of each output over two coordinates, lines, how often values occur.
    fn charts(&self) -> Vec<Chart> {
        let columns = self.numbers();
        let mut charts = Vec::new();
        for kind in columns.kinds() {
            if kind == Kind::Map {
                let outputs = columns.columns.iter().filter(|column| !column.varied).take(MOST_MAPS);
                charts.extend(outputs.filter_map(|column| {
                    let choice = Choice { z: Some(column.name.clone()), ..Choice::default() };
                    chart(&self.name, &columns, kind, &choice).ok()
                }));
            } else {
                charts.extend(chart(&self.name, &columns, kind, &Choice::default()).ok());
            }
        }
        charts
    }

    /// The sweep as the page's script takes it, and its block of numbers. `place` gives where the page holds a snapshot.
    pub(super) fn view(&self, place: impl Fn(usize) -> Option<usize>) -> (Json, String) {
        let mut pool = Pool::default();
        let columns: Vec<Json> = self
            .columns()
            .into_iter()
            .map(|(column, varied, cells)| {
                let full = |extra: &str| match column.unit.as_str() {
                    "" => format!("{}{extra}", column.name),
                    unit => format!("{}{extra}_{unit}", column.name),
                };
                let mut json = json!({ "name": full(""), "label": column.name.replace('_', " "), "unit": si_unit(&column.unit), "varied": varied });
                if all_numbers(&cells) {
                    json["at"] = json!(pool.add(&values(&cells)));
                    let errors = errors(&cells);
                    if !errors.is_empty() {
                        json["error"] = json!({ "name": full("_error"), "at": pool.add(&errors) });
                    }
                } else {
                    json["texts"] = json!(
                        cells.iter().map(|cell| cell.map_or_else(String::new, text)).collect::<Vec<_>>()
                    );
                }
                json
            })
            .collect();
        let points: Vec<Json> = self
            .points
            .iter()
            .map(|held| {
                let Point { index, status, printed, warnings, outputs, .. } = &held.point;
                let mut reasons = Vec::new();
                if let Status::Failed { reason } = status {
                    reasons.push(reason.clone());
                }
                for output in outputs {
                    if let Cell::Absent { reason } = &output.cell
                        && !reason.is_empty()
                    {
                        reasons.push(format!("{}: {reason}", output.column.name));
                    }
                }
                json!({
                    "index": index,
                    "failed": *status != Status::Solved,
                    "reason": reasons.join("; "),
                    "printed": printed,
                    "warnings": warnings,
                    "stored": held.snapshots.len(),
                    "snapshots": held.snapshots.iter().filter_map(|at| place(*at)).collect::<Vec<_>>(),
                })
            })
            .collect();
        let charts: Vec<Json> =
            self.charts().iter().map(|chart| chart_json(chart, None, &mut pool)).collect();
        let (packed, block) = pool.finish();
        let json = json!({
            "name": self.name,
            "plan": self.plan,
            "planned": self.planned,
            "share": self.share,
            "leftOut": self.left_out,
            "failed": self.failed(),
            "troubles": self.troubles,
            "columns": columns,
            "points": points,
            "charts": charts,
            "packed": packed,
        });
        (json, block)
    }
}

/// Whether every cell that is there is a number, and one is.
fn all_numbers(cells: &[Option<&Cell>]) -> bool {
    let there = || cells.iter().flatten().filter(|cell| !matches!(cell, Cell::Absent { .. }));
    there().all(|cell| matches!(cell, Cell::Number { .. })) && there().next().is_some()
}

fn as_text(cell: &Cell) -> Option<&str> {
    match cell {
        Cell::Text(text) => Some(text),
        _ => None,
    }
}

fn values(cells: &[Option<&Cell>]) -> Vec<f64> {
    cells.iter().map(|cell| cell.and_then(Cell::number).unwrap_or(f64::NAN)).collect()
}

/// The errors of the numbers; empty where none has one.
fn errors(cells: &[Option<&Cell>]) -> Vec<f64> {
    let error = |cell: &Option<&Cell>| match cell {
        Some(Cell::Number { error, .. }) => *error,
        _ => None,
    };
    if cells.iter().all(|cell| error(cell).is_none()) {
        return Vec::new();
    }
    cells.iter().map(|cell| error(cell).unwrap_or(f64::NAN)).collect()
}

fn text(cell: &Cell) -> String {
    match cell {
        Cell::Number { value, .. } => significant(*value, 17),
        Cell::Text(text) => text.clone(),
        Cell::Flag(flag) => if *flag { "yes" } else { "no" }.to_string(),
        Cell::Absent { .. } => String::new(),
    }
}
