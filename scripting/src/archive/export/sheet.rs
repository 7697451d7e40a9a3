//! A sweep as columns: one row a point, for tables on a screen and files of other programs.

use std::collections::BTreeMap;

use crate::archive::error::ArchiveError;
use crate::archive::model::Status;
use crate::archive::reader::Archive;
use crate::archive::stored::Sweep;
use crate::archive::sweep::{Cell, StoredPoint, SweepColumn};

/// A sweep as columns of equal length, one row a point, by index.
#[derive(Clone, Debug, Default, PartialEq)]
pub struct Sheet {
    /// Name of the sweep.
    pub name: String,
    /// The indices of the points in the plan.
    pub indices: Vec<u64>,
    /// The coordinates in the plan's order, then what the points returned, by name.
    pub columns: Vec<SheetColumn>,
    /// Why a point failed, or why cells of it are empty; empty where there is nothing to say.
    pub reasons: Vec<String>,
    /// How many points failed.
    pub failed: u64,
}

/// One column of a sheet.
#[derive(Clone, Debug, PartialEq)]
pub struct SheetColumn {
    /// Its name.
    pub name: String,
    /// Its unit as a script spells it; empty for none.
    pub unit: String,
    /// Whether it is a coordinate of the plan.
    pub coordinate: bool,
    /// What it holds.
    pub cells: SheetCells,
}

/// The cells of a column.
#[derive(Clone, Debug, PartialEq)]
pub enum SheetCells {
    /// Numbers.
    Numbers {
        /// The values; absent where a point has none.
        values: Vec<Option<f64>>,
        /// Estimates of their numerical errors; no entries at all where no point has one.
        errors: Vec<Option<f64>>,
    },
    /// Yes and no.
    Flags(Vec<Option<bool>>),
    /// Texts; a column with cells of several kinds is one of texts.
    Texts(Vec<Option<String>>),
}

impl SheetColumn {
    /// Its name with its unit, such as `bsf_nm`.
    pub fn title(&self) -> String {
        if self.unit.is_empty() { self.name.clone() } else { format!("{}_{}", self.name, self.unit) }
    }

    /// The name of the column of its errors, such as `voc_error_V`.
    pub fn error_title(&self) -> String {
        if self.unit.is_empty() {
            format!("{}_error", self.name)
        } else {
            format!("{}_error_{}", self.name, self.unit)
        }
    }
}

impl Sheet {
    /// All points of a sweep.
    ///
    /// # Errors
    /// A block that is damaged.
    pub fn of(archive: &Archive, sweep: &Sweep) -> Result<Sheet, ArchiveError> {
        let mut sheet = Sheet { name: sweep.name.clone(), ..Sheet::default() };
        let coordinates: Vec<SweepColumn> =
            sweep.record().map(|record| record.start.coordinates.clone()).unwrap_or_default();
        let mut coordinate_columns: Vec<Filling> = coordinates.iter().map(|_| Filling::default()).collect();
        let mut outputs: BTreeMap<SweepColumn, Filling> = BTreeMap::new();
        for (row, stored) in archive.points(sweep).enumerate() {
            let StoredPoint { point, .. } = stored?;
            let mut reasons: Vec<String> = Vec::new();
            if let Status::Failed { reason } = point.status {
                reasons.push(reason);
                sheet.failed += 1;
            }
            for (place, cell) in point.coordinates.into_iter().enumerate() {
                if coordinate_columns.len() <= place {
                    coordinate_columns.push(Filling::default());
                }
                coordinate_columns[place].set(row, cell, &mut |_| {});
            }
            for output in point.outputs {
                let name = output.column.name.clone();
                outputs
                    .entry(output.column)
                    .or_default()
                    .set(row, output.cell, &mut |why| reasons.push(format!("{name}: {why}")));
            }
            sheet.indices.push(point.index);
            sheet.reasons.push(reasons.join("; "));
        }
        let rows = sheet.indices.len();
        let unnamed = |place: usize| SweepColumn { name: format!("coordinate_{place}"), unit: String::new() };
        let named = (0..coordinate_columns.len())
            .map(|place| coordinates.get(place).cloned().unwrap_or_else(|| unnamed(place)));
        let columns: Vec<(SweepColumn, Filling, bool)> = named
            .zip(coordinate_columns)
            .map(|(column, filling)| (column, filling, true))
            .chain(outputs.into_iter().map(|(column, filling)| (column, filling, false)))
            .collect();
        sheet.columns = columns
            .into_iter()
            .map(|(column, filling, coordinate)| SheetColumn {
                name: column.name,
                unit: column.unit,
                coordinate,
                cells: filling.cells(rows),
            })
            .collect();
        Ok(sheet)
    }

    /// How many rows it has.
    pub fn rows(&self) -> usize {
        self.indices.len()
    }

    /// Rows in the order of that column, by number or by text, rows without a value last.
    ///
    /// # Errors
    /// The names of the columns, where none is called so.
    pub fn order_by(&self, name: &str, descending: bool) -> Result<Vec<usize>, Vec<String>> {
        let mut rows: Vec<usize> = (0..self.rows()).collect();
        let turn = |order: std::cmp::Ordering| if descending { order.reverse() } else { order };
        if name == "point" {
            rows.sort_by(|a, b| turn(self.indices[*a].cmp(&self.indices[*b])));
            return Ok(rows);
        }
        let found = self.columns.iter().find(|column| column.name == name || column.title() == name);
        let Some(column) = found else {
            return Err(self.columns.iter().map(|column| column.name.clone()).collect());
        };
        // a row without a value stands last either way
        let by = |a: bool, b: bool, order: std::cmp::Ordering| a.cmp(&b).then(turn(order));
        match &column.cells {
            SheetCells::Numbers { values, .. } => {
                let number = |row: usize| values[row].filter(|value| !value.is_nan());
                rows.sort_by(|&a, &b| {
                    let (x, y) = (number(a), number(b));
                    let order = x.unwrap_or(0.0).total_cmp(&y.unwrap_or(0.0));
                    by(x.is_none(), y.is_none(), order)
                });
            }
            SheetCells::Flags(flags) => {
                rows.sort_by(|&a, &b| by(flags[a].is_none(), flags[b].is_none(), flags[a].cmp(&flags[b])));
            }
            SheetCells::Texts(texts) => {
                rows.sort_by(|&a, &b| by(texts[a].is_none(), texts[b].is_none(), texts[a].cmp(&texts[b])));
            }
        }
        Ok(rows)
    }
}

/// A column while it is filled; rows that it does not reach are empty.
#[derive(Default)]
struct Filling {
    values: Vec<Option<f64>>,
    errors: Vec<Option<f64>>,
    flags: Vec<Option<bool>>,
    texts: Vec<Option<String>>,
}

fn put<T>(list: &mut Vec<Option<T>>, row: usize, value: T) {
    list.resize_with(row, || None);
    list.push(Some(value));
}

impl Filling {
    fn set(&mut self, row: usize, cell: Cell, absent: &mut dyn FnMut(&str)) {
        match cell {
            Cell::Number { value, error } => {
                put(&mut self.values, row, value);
                if let Some(error) = error {
                    put(&mut self.errors, row, error);
                }
            }
            Cell::Flag(flag) => put(&mut self.flags, row, flag),
            Cell::Text(text) => put(&mut self.texts, row, text),
            Cell::Absent { reason } if reason.is_empty() => {}
            Cell::Absent { reason } => absent(&reason),
        }
    }

    fn cells(mut self, rows: usize) -> SheetCells {
        self.values.resize(rows, None);
        self.flags.resize(rows, None);
        self.texts.resize(rows, None);
        let none = |list: &[Option<bool>]| list.iter().all(Option::is_none);
        let no_text = self.texts.iter().all(Option::is_none);
        let no_number = self.values.iter().all(Option::is_none);
        if no_text && none(&self.flags) {
            if !self.errors.is_empty() {
                self.errors.resize(rows, None);
            }
            return SheetCells::Numbers { values: self.values, errors: self.errors };
        }
        if no_text && no_number {
            return SheetCells::Flags(self.flags);
        }
        let merged = self.texts.into_iter().zip(self.values).zip(self.flags).map(|((text, value), flag)| {
            let flag = || flag.map(|flag| if flag { "yes" } else { "no" }.to_owned());
            text.or_else(|| value.map(super::csv::number)).or_else(flag)
        });
        SheetCells::Texts(merged.collect())
    }
}
