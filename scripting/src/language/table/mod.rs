//! Tables: what a sweep gave, by columns, and what is asked of them.

use std::collections::BTreeMap;
use std::sync::Arc;

use rhai::{Array, Dynamic, EvalAltResult, ImmutableString, Map, Position};

use crate::archive::{Cell, Point, Status};
use crate::diagnostics::codes;

use super::cells::of_unit;
use super::dimension::Dimension;
use super::fault::{Fault, Outcome};
use super::plan::Plan;
use super::quantity::Quantity;
use super::sandbox::Stop;
use super::units::Unit;
use super::value::{Unknown, any_quantity};

pub mod builder;
pub mod fit;
pub mod shown;
pub mod statistics;
mod stored;

/// A table as scripts hold it.
#[derive(Clone, Debug)]
pub struct TableValue(pub Arc<Table>);

/// How much of a table there is.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Extent {
    /// All rows.
    Whole,
    /// The share of this run only: nothing of it can be read.
    Share,
    /// One row of figures that were not solved, while checking.
    Checked,
}

/// Rows with named columns. Rows are points that were solved; those that failed stand apart with their reasons.
#[derive(Clone, Debug)]
pub struct Table {
    /// The name of the sweep.
    pub name: String,
    /// The point of each row in its plan; empty for a table that no sweep gave.
    pub points: Vec<u64>,
    /// How many rows there are.
    pub rows: usize,
    /// The columns, coordinates first.
    pub columns: Vec<Column>,
    /// How many of the columns are coordinates.
    pub coordinates: usize,
    /// The plan that the points are of, for their coordinates as they were given.
    pub plan: Option<Arc<Plan>>,
    /// Points without a result.
    pub failures: Arc<Vec<Failure>>,
    /// How much of it there is.
    pub extent: Extent,
}

/// A point without a result.
#[derive(Clone, Debug)]
pub struct Failure {
    /// Its index in the plan.
    pub point: u64,
    /// Why.
    pub reason: Arc<str>,
}

/// A column.
#[derive(Clone, Debug)]
pub struct Column {
    /// Its name.
    pub name: ImmutableString,
    /// Its values, one a row.
    pub data: Data,
}

/// Values of a column.
#[derive(Clone, Debug)]
pub enum Data {
    /// Quantities of one dimension.
    Numbers(Numbers),
    /// Texts: for each row a number in the list of words, [`NO_WORD`] where there is none.
    Texts {
        /// One a row.
        codes: Vec<u32>,
        /// The words, each once.
        words: Vec<ImmutableString>,
    },
    /// Values of different kinds, or yes and no.
    Mixed(Vec<Dynamic>),
}

/// No text.
pub const NO_WORD: u32 = u32::MAX;

/// Quantities of one dimension.
#[derive(Clone, Debug)]
pub struct Numbers {
    /// SI values; [`absent`] where there is none.
    pub values: Vec<f64>,
    /// Numerical errors in SI, NaN where there is none; empty when no value has one.
    pub errors: Vec<f64>,
    /// The dimension.
    pub dimension: Dimension,
    /// The unit they are shown in.
    pub unit: Option<&'static Unit>,
}

/// What stands for no number: a NaN that no calculation gives.
pub fn absent() -> f64 {
    f64::from_bits(0x7ff8_0a65_e170_0a65)
}

/// Whether this stands for no number.
pub fn is_absent(value: f64) -> bool {
    value.to_bits() == absent().to_bits()
}

impl Numbers {
    /// The quantity of a row, if there is one.
    pub fn get(&self, row: usize) -> Option<Quantity> {
        let value = self.values[row];
        if is_absent(value) {
            return None;
        }
        Some(Quantity {
            error: self.errors.get(row).copied().filter(|e| !e.is_nan()),
            ..self.quantity(value)
        })
    }

    /// An SI value as a quantity of this column.
    pub fn quantity(&self, value: f64) -> Quantity {
        Quantity { shown_in: self.unit, ..Quantity::si(value, self.dimension) }
    }
}

impl Column {
    /// The value of a row.
    pub fn get(&self, row: usize) -> Dynamic {
        match &self.data {
            Data::Numbers(numbers) => numbers.get(row).map_or(Dynamic::UNIT, Dynamic::from),
            Data::Texts { codes, words } => {
                words.get(codes[row] as usize).map_or(Dynamic::UNIT, |word| Dynamic::from(word.clone()))
            }
            Data::Mixed(values) => values[row].clone(),
        }
    }

    /// The same with these rows, in this order.
    pub fn picked(&self, rows: &[usize]) -> Column {
        let data = match &self.data {
            Data::Numbers(numbers) => Data::Numbers(Numbers {
                values: rows.iter().map(|row| numbers.values[*row]).collect(),
                errors: if numbers.errors.is_empty() {
                    Vec::new()
                } else {
                    rows.iter().map(|row| numbers.errors[*row]).collect()
                },
                ..*numbers
            }),
            Data::Texts { codes, words } => {
                Data::Texts { codes: rows.iter().map(|row| codes[*row]).collect(), words: words.clone() }
            }
            Data::Mixed(values) => Data::Mixed(rows.iter().map(|row| values[*row].clone()).collect()),
        };
        Column { name: self.name.clone(), data }
    }

    /// A column of these values.
    ///
    /// # Errors
    /// A value that cannot stand in a table.
    pub fn of_values(name: impl Into<ImmutableString>, values: Vec<Dynamic>) -> Result<Column, Fault> {
        let name = name.into();
        let mut column = builder::Collected::default();
        for (row, value) in values.iter().enumerate() {
            let output =
                super::cells::outputs(&Map::from([(name.as_str().into(), value.clone())]).into(), &[], &[])?;
            if let Some(output) = output.into_iter().next() {
                column.push(row, row as u64, &output.column.unit, &output.cell);
            }
        }
        let rows = values.len();
        Ok(Column { name, data: column.finish(rows) })
    }
}

impl Table {
    /// A table that no sweep gave.
    pub fn of_columns(name: &str, rows: usize, columns: Vec<Column>) -> Table {
        Table {
            name: name.to_string(),
            points: Vec::new(),
            rows,
            columns,
            coordinates: 0,
            plan: None,
            failures: Arc::default(),
            extent: Extent::Whole,
        }
    }

    /// What ends the script, well, where it reads this table, of which the run has a share only.
    pub fn waited_for(&self, position: Position) -> Box<EvalAltResult> {
        super::report::stopped(Stop::Share(self.name.clone()), position)
    }

    /// The column of this name.
    ///
    /// # Errors
    /// There is none; the near names.
    pub fn column(&self, name: &str) -> Result<&Column, Fault> {
        self.columns.iter().find(|c| c.name == name).ok_or_else(|| {
            let names: Vec<&str> = self.columns.iter().map(|c| c.name.as_str()).collect();
            Fault::new(codes::NO_SUCH_ENTRY, format!("the table `{}` has no column `{name}`", self.name))
                .candidates(name, names.iter().copied())
        })
    }

    /// The column of this name, of quantities.
    ///
    /// # Errors
    /// There is none, or it holds something else.
    pub fn numbers(&self, name: &str) -> Result<&Numbers, Fault> {
        match &self.column(name)?.data {
            Data::Numbers(numbers) => Ok(numbers),
            _ => Err(Fault::new(codes::WRONG_KIND, format!("the column `{name}` holds no numbers"))),
        }
    }

    /// The quantities of a column that exist, by row.
    ///
    /// # Errors
    /// No such column, or it holds something else; no row has a number in it.
    pub fn existing(&self, name: &str) -> Result<(Vec<f64>, &Numbers), Fault> {
        let numbers = self.numbers(name)?;
        let values: Vec<f64> = numbers.values.iter().copied().filter(|v| !v.is_nan()).collect();
        if values.is_empty() {
            return Err(Fault::new(
                codes::EMPTY_TABLE,
                format!("no row of the table `{}` has a `{name}`", self.name),
            ));
        }
        Ok((values, numbers))
    }

    /// The value of a column in a row; a coordinate as the plan gives it.
    fn cell(&self, column: usize, row: usize, given: Option<&Vec<Dynamic>>) -> Dynamic {
        given.and_then(|values| values.get(column).cloned()).unwrap_or_else(|| self.columns[column].get(row))
    }

    /// A row as a map.
    pub fn row(&self, row: usize) -> Map {
        let plan = self.plan.as_ref().filter(|_| self.coordinates > 0);
        let given = plan.zip(self.points.get(row)).map(|(plan, point)| plan.values(*point));
        (0..self.columns.len())
            .map(|c| {
                let given = given.as_ref().filter(|_| c < self.coordinates);
                (self.columns[c].name.as_str().into(), self.cell(c, row, given))
            })
            .collect()
    }

    /// The same with these rows, in this order; failures are left out.
    pub fn picked(&self, rows: &[usize]) -> Table {
        Table {
            name: self.name.clone(),
            points: if self.points.is_empty() {
                Vec::new()
            } else {
                rows.iter().map(|row| self.points[*row]).collect()
            },
            rows: rows.len(),
            columns: self.columns.iter().map(|column| column.picked(rows)).collect(),
            coordinates: self.coordinates,
            plan: self.plan.clone(),
            failures: Arc::default(),
            extent: self.extent,
        }
    }

    /// The rows by the values of a column: each distinct value with its rows, rising; rows without one left out.
    ///
    /// # Errors
    /// No such column.
    pub fn groups(&self, name: &str) -> Result<Vec<(Dynamic, Vec<usize>)>, Fault> {
        let column = self.column(name)?;
        let at = self.columns.iter().position(|c| c.name == name).unwrap_or(0);
        let mut groups: BTreeMap<Key, Vec<usize>> = BTreeMap::new();
        for row in 0..self.rows {
            if let Some(key) = Key::of(column, row) {
                groups.entry(key).or_default().push(row);
            }
        }
        let plan = self.plan.as_ref().filter(|_| at < self.coordinates);
        Ok(groups
            .into_values()
            .map(|rows| {
                let given = plan.zip(self.points.get(rows[0])).map(|(plan, point)| plan.values(*point));
                (self.cell(at, rows[0], given.as_ref()), rows)
            })
            .collect())
    }

    /// The order of the rows by a column, rising; equal values keep their order, rows without a value come last.
    ///
    /// # Errors
    /// No such column.
    pub fn order(&self, name: &str, falling: bool) -> Result<Vec<usize>, Fault> {
        let column = self.column(name)?;
        let keys: Vec<Option<Key>> = (0..self.rows).map(|row| Key::of(column, row)).collect();
        let mut rows: Vec<usize> = (0..self.rows).collect();
        rows.sort_by(|a, b| match (&keys[*a], &keys[*b]) {
            (Some(a), Some(b)) => {
                if falling {
                    b.cmp(a)
                } else {
                    a.cmp(b)
                }
            }
            (a, b) => a.is_none().cmp(&b.is_none()),
        });
        Ok(rows)
    }
}

/// The value with all numbers unknown.
pub fn veiled(value: Dynamic) -> Dynamic {
    if let Some(q) = any_quantity(&value) {
        return Dynamic::from(Quantity { unknown: true, ..q });
    }
    if value.is_bool() {
        return Dynamic::from(Unknown);
    }
    if let Some(list) = value.read_lock::<Array>() {
        return list.iter().cloned().map(veiled).collect::<Array>().into();
    }
    if let Some(map) = value.read_lock::<Map>() {
        return map.iter().map(|(key, value)| (key.clone(), veiled(value.clone()))).collect::<Map>().into();
    }
    value
}

/// Rows one after the other, as a loop of a script takes them.
impl IntoIterator for TableValue {
    type Item = Outcome<Dynamic>;
    type IntoIter = Box<dyn Iterator<Item = Outcome<Dynamic>>>;
    fn into_iter(self) -> Self::IntoIter {
        let table = self.0;
        match table.extent {
            Extent::Share => Box::new(std::iter::once(Err(table.waited_for(Position::NONE)))),
            Extent::Checked => Box::new(std::iter::once(Ok(veiled(table.row(0).into())))),
            Extent::Whole => Box::new((0..table.rows).map(move |row| Ok(table.row(row).into()))),
        }
    }
}

/// What rows are ordered by.
#[derive(Clone, Debug, PartialEq, Eq, PartialOrd, Ord)]
pub enum Key {
    /// A number, by its order.
    Number(i64),
    /// Yes or no.
    Flag(bool),
    /// A text.
    Text(String),
}

impl Key {
    /// The key of a row in a column; nothing where there is no value.
    pub fn of(column: &Column, row: usize) -> Option<Key> {
        if let Data::Numbers(numbers) = &column.data {
            return Key::of_number(numbers.values[row]);
        }
        let value = column.get(row);
        if let Some(q) = super::value::any_quantity(&value) {
            return Key::of_number(q.value);
        }
        if let Ok(flag) = value.as_bool() {
            return Some(Key::Flag(flag));
        }
        (!value.is_unit()).then(|| Key::Text(super::plan::plain_words(&value)))
    }

    fn of_number(value: f64) -> Option<Key> {
        if value.is_nan() {
            return None;
        }
        // the order of the bits is that of the numbers once negative ones are turned round; -0 is 0
        let bits = (value + 0.0).to_bits() as i64;
        Some(Key::Number(bits ^ (((bits >> 63) as u64) >> 1) as i64))
    }
}

/// What a point of an archive is for a table: its number and outputs, or why it has none.
pub fn outcome_of(point: &Point) -> Result<(), &str> {
    match &point.status {
        Status::Solved => Ok(()),
        Status::Failed { reason } => Err(reason),
    }
}

/// The SI value and error of a cell that holds a number, with its dimension and unit.
pub fn number_of(cell: &Cell, column_unit: &str) -> Option<(f64, f64, Dimension, Option<&'static Unit>)> {
    let Cell::Number { value, error } = cell else { return None };
    let (dimension, unit) = of_unit(column_unit)?;
    let convert = |v: f64| unit.map_or(v, |u| u.to_si(v));
    Some((convert(*value), error.map_or(f64::NAN, convert), dimension, unit))
}

#[cfg(test)]
mod tests;
