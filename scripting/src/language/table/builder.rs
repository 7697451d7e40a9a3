//! From points in whatever order they come to columns in the order of the plan.

use std::collections::{BTreeMap, BTreeSet};
use std::sync::Arc;

use rhai::{Dynamic, ImmutableString};

use crate::archive::{Cell, Point, SweepStart};

use super::super::cells;
use super::super::dimension::Dimension;
use super::super::plan::Plan;
use super::super::quantity::Quantity;
use super::super::units::Unit;
use super::{Column, Data, Extent, Failure, NO_WORD, Numbers, Table, absent, number_of, outcome_of};

/// Gathers points; what comes out does not depend on the order in which they came.
#[derive(Debug, Default)]
pub struct Builder {
    points: Vec<u64>,
    outputs: BTreeMap<String, Collected>,
    failures: Vec<Failure>,
    reasons: BTreeSet<Arc<str>>,
    warned: BTreeMap<String, Warned>,
}

/// Points with a warning of one code.
#[derive(Clone, Debug)]
pub struct Warned {
    /// How many.
    pub points: u64,
    /// The first of them.
    pub first: u64,
    /// What the warnings of this code say there.
    pub words: Vec<String>,
}

impl Builder {
    /// Takes one more point.
    pub fn push(&mut self, point: &Point) {
        self.take_warnings(point);
        if let Err(reason) = outcome_of(point) {
            let reason = match self.reasons.get(reason) {
                Some(known) => Arc::clone(known),
                None => {
                    let new: Arc<str> = reason.into();
                    self.reasons.insert(Arc::clone(&new));
                    new
                }
            };
            self.failures.push(Failure { point: point.index, reason });
            return;
        }
        let row = self.points.len();
        self.points.push(point.index);
        for output in &point.outputs {
            if !self.outputs.contains_key(&output.column.name) {
                self.outputs.insert(output.column.name.clone(), Collected::default());
            }
            if let Some(column) = self.outputs.get_mut(&output.column.name) {
                column.push(row, point.index, &output.column.unit, &output.cell);
            }
        }
    }

    fn take_warnings(&mut self, point: &Point) {
        // "[W313] the error .."
        let code_of =
            |words: &str| words.split(']').next().unwrap_or_default().trim_start_matches('[').to_string();
        let mut found: BTreeMap<String, Vec<&String>> = BTreeMap::new();
        for words in &point.warnings {
            found.entry(code_of(words)).or_default().push(words);
        }
        for (code, words) in found {
            let new = Warned { points: 0, first: u64::MAX, words: Vec::new() };
            let warned = self.warned.entry(code).or_insert(new);
            warned.points += 1;
            if point.index < warned.first {
                warned.first = point.index;
                warned.words = words.into_iter().cloned().collect();
            }
        }
    }

    /// Points with a result so far.
    pub fn solved(&self) -> u64 {
        self.points.len() as u64
    }

    /// Points without one so far.
    pub fn failed(&self) -> u64 {
        self.failures.len() as u64
    }

    /// Why points failed: each reason with its number of points and the first of them, the most frequent first.
    pub fn reasons(&self) -> Vec<(Arc<str>, usize, u64)> {
        let mut reasons: BTreeMap<&Arc<str>, (usize, u64)> = BTreeMap::new();
        for failure in &self.failures {
            let (count, first) = reasons.entry(&failure.reason).or_insert((0, u64::MAX));
            *count += 1;
            *first = failure.point.min(*first);
        }
        let mut list: Vec<_> =
            reasons.into_iter().map(|(r, (count, first))| (Arc::clone(r), count, first)).collect();
        list.sort_by_key(|(_, count, first)| (std::cmp::Reverse(*count), *first));
        list
    }

    /// Points with warnings, by code.
    pub fn warned(&self) -> &BTreeMap<String, Warned> {
        &self.warned
    }

    /// The table.
    pub fn finish(mut self, sweep: &SweepStart, plan: &Arc<Plan>) -> Table {
        let rows = self.points.len();
        let mut order: Vec<usize> = (0..rows).collect();
        order.sort_by_key(|row| self.points[*row]);
        let sorted = order.iter().enumerate().all(|(at, row)| at == *row);
        let points: Vec<u64> = order.iter().map(|row| self.points[*row]).collect();
        self.failures.sort_by_key(|failure| failure.point);
        let mut columns = coordinate_columns(sweep, plan, &points);
        let coordinates = columns.len();
        for (name, collected) in self.outputs {
            let column = Column { name: name.into(), data: collected.finish(rows) };
            columns.push(if sorted { column } else { column.picked(&order) });
        }
        Table {
            name: sweep.name.clone(),
            points,
            rows,
            columns,
            coordinates,
            plan: Some(Arc::clone(plan)),
            failures: Arc::new(self.failures),
            extent: Extent::Whole,
        }
    }
}

/// The coordinates of these points, by column.
fn coordinate_columns(sweep: &SweepStart, plan: &Plan, points: &[u64]) -> Vec<Column> {
    let mut collected: Vec<Collected> = sweep.coordinates.iter().map(|_| Collected::default()).collect();
    for (row, point) in points.iter().enumerate() {
        for ((into, column), value) in collected.iter_mut().zip(&sweep.coordinates).zip(plan.values(*point)) {
            match super::super::value::any_quantity(&value) {
                // as the plan gives it, not by way of the column's unit
                Some(q) => into.push_number(row, *point, q.value, f64::NAN, q.dimension, unit_of(column)),
                None => into.push(row, *point, &column.unit, &cells::coordinate_cell(&value, column)),
            }
        }
    }
    let named = sweep.coordinates.iter().zip(collected);
    named
        .map(|(c, values)| Column { name: c.name.as_str().into(), data: values.finish(points.len()) })
        .collect()
}

fn unit_of(column: &crate::archive::SweepColumn) -> Option<&'static Unit> {
    cells::of_unit(&column.unit).and_then(|(_, unit)| unit)
}

/// The values of one column as they come.
#[derive(Debug, Default)]
pub struct Collected {
    values: Vec<f64>,
    errors: Vec<f64>,
    /// Dimension and unit of the numbers, with the point that they are from: the first of the plan decides.
    unit: Option<(u64, Dimension, Option<&'static Unit>)>,
    codes: Vec<u32>,
    words: BTreeMap<ImmutableString, u32>,
    /// Values that fit neither.
    others: BTreeMap<usize, Dynamic>,
}

impl Collected {
    /// Takes the value of a row.
    pub fn push(&mut self, row: usize, point: u64, unit: &str, cell: &Cell) {
        match cell {
            Cell::Number { .. } => match number_of(cell, unit) {
                Some((value, error, dimension, unit)) => {
                    self.push_number(row, point, value, error, dimension, unit);
                }
                None => {
                    self.others.insert(row, cells::value(cell, unit));
                }
            },
            Cell::Text(text) => {
                let next = self.words.len() as u32;
                let code = *self.words.entry(text.as_str().into()).or_insert(next);
                self.codes.resize(row, NO_WORD);
                self.codes.push(code);
            }
            Cell::Flag(_) => {
                self.others.insert(row, cells::value(cell, unit));
            }
            Cell::Absent { .. } => {}
        }
    }

    fn push_number(
        &mut self,
        row: usize,
        point: u64,
        value: f64,
        error: f64,
        dimension: Dimension,
        unit: Option<&'static Unit>,
    ) {
        match &mut self.unit {
            Some((_, known, _)) if *known != dimension => {
                let value = Quantity { shown_in: unit, ..Quantity::si(value, dimension) };
                self.others.insert(row, Dynamic::from(value));
                return;
            }
            Some(first) if first.0 > point => *first = (point, dimension, unit),
            Some(_) => {}
            none => *none = Some((point, dimension, unit)),
        }
        self.values.resize(row, absent());
        self.values.push(value);
        if !error.is_nan() || !self.errors.is_empty() {
            self.errors.resize(row, f64::NAN);
            self.errors.push(error);
        }
    }

    /// The column of so many rows.
    pub fn finish(mut self, rows: usize) -> Data {
        let numbers = self.unit.map(|(_, dimension, unit)| {
            self.values.resize(rows, absent());
            if !self.errors.is_empty() {
                self.errors.resize(rows, f64::NAN);
            }
            Numbers { values: self.values, errors: self.errors, dimension, unit }
        });
        let mut words: Vec<ImmutableString> = vec![ImmutableString::new(); self.words.len()];
        for (word, code) in self.words {
            words[code as usize] = word;
        }
        let texts = (!words.is_empty()).then(|| {
            self.codes.resize(rows, NO_WORD);
            (self.codes, words)
        });
        match (numbers, texts) {
            (Some(numbers), None) if self.others.is_empty() => Data::Numbers(numbers),
            (None, Some((codes, words))) if self.others.is_empty() => Data::Texts { codes, words },
            (numbers, texts) => Data::Mixed(
                (0..rows)
                    .map(|row| {
                        if let Some(other) = self.others.get(&row) {
                            return other.clone();
                        }
                        let text = texts.as_ref().and_then(|(codes, words)| words.get(codes[row] as usize));
                        match (text, numbers.as_ref().and_then(|numbers| numbers.get(row))) {
                            (Some(text), _) => text.clone().into(),
                            (None, Some(q)) => Dynamic::from(q),
                            (None, None) => Dynamic::UNIT,
                        }
                    })
                    .collect(),
            ),
        }
    }
}
