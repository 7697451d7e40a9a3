//! A sweep as a table, one row a point, for a screen and for files of other programs. Its form is read first; then rows pass
//! by one at a time, or a few columns or rows are gathered, so that the memory does not grow with the sweep.

use std::cmp::Ordering;
use std::collections::BTreeMap;
use std::ops::Range;

use crate::archive::error::ArchiveError;
use crate::archive::model::Status;
use crate::archive::reader::Archive;
use crate::archive::stored::{Points, Sweep};
use crate::archive::sweep::{Cell, Point, SweepColumn};

/// Cells that are gathered in one pass over a sweep where a format wants whole columns.
const GATHERED: usize = 4_000_000;

/// What columns a sweep has, known when all its points have been read once.
#[derive(Clone, Debug, Default, PartialEq)]
pub struct Form {
    /// Name of the sweep.
    pub name: String,
    /// How many points are stored.
    pub rows: usize,
    /// How many of them failed.
    pub failed: u64,
    /// Whether any point failed or says why a cell of it is empty.
    pub reasons: bool,
    /// The coordinates in the plan's order, then what the points returned, by name.
    pub columns: Vec<FormColumn>,
    pub(crate) coordinates: usize,
    pub(crate) places: BTreeMap<SweepColumn, usize>,
}

/// One column of a sweep.
#[derive(Clone, Debug, PartialEq)]
pub struct FormColumn {
    /// Its name.
    pub name: String,
    /// Its unit as a script spells it; empty for none.
    pub unit: String,
    /// Whether it is a coordinate of the plan.
    pub coordinate: bool,
    /// What it holds.
    pub kind: CellKind,
}

/// What a column holds.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum CellKind {
    /// Numbers, and whether any has an estimate of its numerical error.
    Numbers {
        /// Whether any has one.
        errors: bool,
    },
    /// Yes and no.
    Flags,
    /// Texts; a column with cells of several kinds is one of texts.
    Texts,
}

/// What stands in a cell.
#[derive(Clone, Debug, PartialEq)]
pub enum SheetCell {
    /// Nothing.
    Empty,
    /// A number and the estimate of its numerical error.
    Number(f64, Option<f64>),
    /// Yes or no.
    Flag(bool),
    /// A text.
    Text(String),
}

/// One point.
#[derive(Clone, Debug, PartialEq)]
pub struct Row {
    /// Its index in the plan.
    pub index: u64,
    /// A cell for each column, of the column's kind or empty.
    pub cells: Vec<SheetCell>,
    /// Why the point failed, or why cells are empty; empty where there is nothing to say.
    pub reason: String,
}

/// Some columns or rows of a sweep in memory.
#[derive(Clone, Debug, Default, PartialEq)]
pub struct Sheet {
    /// The indices of the points in the plan.
    pub indices: Vec<u64>,
    /// The columns.
    pub columns: Vec<SheetColumn>,
    /// Why a point failed, or why cells of it are empty; empty where there is nothing to say.
    pub reasons: Vec<String>,
}

/// One column of a sheet.
#[derive(Clone, Debug, PartialEq)]
pub struct SheetColumn {
    /// What it is.
    pub form: FormColumn,
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
    /// Texts.
    Texts(Vec<Option<String>>),
}

impl FormColumn {
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

    /// Whether it has a column of errors beside it.
    pub fn has_errors(&self) -> bool {
        self.kind == CellKind::Numbers { errors: true }
    }
}

/// The kinds of cell that a column was seen to hold.
#[derive(Clone, Copy, Default)]
struct Seen {
    number: bool,
    error: bool,
    flag: bool,
    text: bool,
}

impl Seen {
    fn see(&mut self, cell: &Cell) -> bool {
        match cell {
            Cell::Number { error, .. } => {
                self.number = true;
                self.error |= error.is_some();
            }
            Cell::Flag(_) => self.flag = true,
            Cell::Text(_) => self.text = true,
            Cell::Absent { reason } => return !reason.is_empty(),
        }
        false
    }

    fn kind(self) -> CellKind {
        match (self.text, self.flag, self.number) {
            (false, false, _) => CellKind::Numbers { errors: self.error },
            (false, true, false) => CellKind::Flags,
            _ => CellKind::Texts,
        }
    }
}

impl Form {
    /// Reads all points of a sweep once.
    ///
    /// # Errors
    /// A block that is damaged.
    pub fn of(archive: &Archive, sweep: &Sweep) -> Result<Form, ArchiveError> {
        let mut form = Form { name: sweep.name.clone(), ..Form::default() };
        let named: Vec<SweepColumn> =
            sweep.record().map(|record| record.start.coordinates.clone()).unwrap_or_default();
        let mut coordinates = vec![Seen::default(); named.len()];
        let mut outputs: BTreeMap<SweepColumn, Seen> = BTreeMap::new();
        for stored in archive.points(sweep) {
            let point = stored?.point;
            if point.status != Status::Solved {
                form.failed += 1;
                form.reasons = true;
            }
            if coordinates.len() < point.coordinates.len() {
                coordinates.resize(point.coordinates.len(), Seen::default());
            }
            for (seen, cell) in coordinates.iter_mut().zip(&point.coordinates) {
                seen.see(cell);
            }
            for output in point.outputs {
                form.reasons |= outputs.entry(output.column).or_default().see(&output.cell);
            }
            form.rows += 1;
        }
        form.coordinates = coordinates.len();
        let unnamed = |place: usize| SweepColumn { name: format!("coordinate_{place}"), unit: String::new() };
        let coordinates = coordinates.into_iter().enumerate().map(|(place, seen)| {
            let column = named.get(place).cloned().unwrap_or_else(|| unnamed(place));
            FormColumn { name: column.name, unit: column.unit, coordinate: true, kind: seen.kind() }
        });
        form.columns = coordinates.collect();
        for (column, seen) in outputs {
            form.places.insert(column.clone(), form.columns.len());
            let SweepColumn { name, unit } = column;
            form.columns.push(FormColumn { name, unit, coordinate: false, kind: seen.kind() });
        }
        Ok(form)
    }

    /// The points of the sweep that this is the form of, in order of index.
    pub fn rows<'a>(&'a self, archive: &'a Archive, sweep: &'a Sweep) -> Rows<'a> {
        Rows { form: self, points: archive.points(sweep) }
    }

    /// These columns of these rows.
    ///
    /// # Errors
    /// Those of the rows.
    pub fn gathered(
        &self,
        columns: Range<usize>,
        rows: impl Iterator<Item = Result<Row, ArchiveError>>,
    ) -> Result<Sheet, ArchiveError> {
        let mut sheet = Sheet {
            columns: self.columns[columns.clone()].iter().map(SheetColumn::begun).collect(),
            ..Sheet::default()
        };
        for row in rows {
            let row = row?;
            sheet.indices.push(row.index);
            sheet.reasons.push(row.reason);
            let cells = row.cells.into_iter().skip(columns.start);
            sheet.columns.iter_mut().zip(cells).for_each(|(column, cell)| column.push(cell));
        }
        Ok(sheet)
    }

    /// All columns in order, as many in each stretch as are gathered at once.
    pub fn stretches(&self) -> impl Iterator<Item = Range<usize>> + '_ {
        let at_once = (GATHERED / self.rows.max(1)).max(1);
        let all = self.columns.len();
        (0..all).step_by(at_once).map(move |first| first..(first + at_once).min(all))
    }

    /// The first `most` rows in the order of that column, by number or by text, rows without a value last: the place of each
    /// among all rows.
    ///
    /// # Errors
    /// A block that is damaged; [`Unknown`](OrderError::Unknown) where no column is called so.
    pub fn order(
        &self,
        archive: &Archive,
        sweep: &Sweep,
        name: &str,
        descending: bool,
        most: usize,
    ) -> Result<Vec<usize>, OrderError> {
        let column = match name {
            "point" => None,
            name => Some(
                self.columns.iter().position(|each| each.name == name || each.title() == name).ok_or_else(
                    || OrderError::Unknown(self.columns.iter().map(|each| each.name.clone()).collect()),
                )?,
            ),
        };
        let mut kept: Vec<(SheetCell, usize)> = Vec::new();
        let by = |a: &(SheetCell, usize), b: &(SheetCell, usize)| {
            let order = compare(&a.0, &b.0);
            // a row without a value stands last either way, and equal ones in the order of the plan
            let turned = match (known(&a.0), known(&b.0)) {
                (true, true) if descending => order.reverse(),
                _ => order,
            };
            turned.then(if descending && column.is_none() { b.1.cmp(&a.1) } else { a.1.cmp(&b.1) })
        };
        for (place, row) in self.rows(archive, sweep).enumerate() {
            let mut row = row?;
            let cell =
                column.map_or(SheetCell::Empty, |at| std::mem::replace(&mut row.cells[at], SheetCell::Empty));
            kept.push((cell, place));
            if kept.len() >= most.saturating_mul(2).max(1000) && kept.len() > most {
                kept.select_nth_unstable_by(most, by);
                kept.truncate(most);
            }
        }
        kept.sort_by(by);
        kept.truncate(most);
        Ok(kept.into_iter().map(|(_, place)| place).collect())
    }
}

/// Why rows have no order.
#[derive(Debug)]
pub enum OrderError {
    /// No column is called so; the names of those that there are.
    Unknown(Vec<String>),
    /// The archive could not be read.
    Archive(ArchiveError),
}

impl From<ArchiveError> for OrderError {
    fn from(error: ArchiveError) -> Self {
        OrderError::Archive(error)
    }
}

/// Whether a cell has a place in an order.
fn known(cell: &SheetCell) -> bool {
    match cell {
        SheetCell::Empty => false,
        SheetCell::Number(value, _) => !value.is_nan(),
        SheetCell::Flag(_) | SheetCell::Text(_) => true,
    }
}

fn compare(a: &SheetCell, b: &SheetCell) -> Ordering {
    match (a, b) {
        (SheetCell::Number(a, _), SheetCell::Number(b, _)) if !a.is_nan() && !b.is_nan() => a.total_cmp(b),
        (SheetCell::Flag(a), SheetCell::Flag(b)) => a.cmp(b),
        (SheetCell::Text(a), SheetCell::Text(b)) => a.cmp(b),
        _ => known(b).cmp(&known(a)),
    }
}

/// The points of a sweep as rows, read block by block.
#[derive(Debug)]
pub struct Rows<'a> {
    form: &'a Form,
    points: Points<'a>,
}

impl Iterator for Rows<'_> {
    type Item = Result<Row, ArchiveError>;

    fn next(&mut self) -> Option<Self::Item> {
        Some(self.points.next()?.map(|stored| self.form.row(stored.point)))
    }
}

impl Form {
    fn row(&self, point: Point) -> Row {
        let mut cells = vec![SheetCell::Empty; self.columns.len()];
        let mut reasons: Vec<String> = Vec::new();
        if let Status::Failed { reason } = point.status {
            reasons.push(reason);
        }
        for (place, cell) in point.coordinates.into_iter().enumerate().take(self.coordinates) {
            cells[place] = self.columns[place].cell(cell).unwrap_or(SheetCell::Empty);
        }
        for output in point.outputs {
            let Some(&place) = self.places.get(&output.column) else { continue };
            match self.columns[place].cell(output.cell) {
                Ok(cell) => cells[place] = cell,
                Err(why) => reasons.push(format!("{}: {why}", output.column.name)),
            }
        }
        Row { index: point.index, cells, reason: reasons.join("; ") }
    }
}

impl FormColumn {
    /// The cell as this column has it.
    ///
    /// # Errors
    /// Why it is empty, where that is said.
    fn cell(&self, cell: Cell) -> Result<SheetCell, String> {
        let texts = self.kind == CellKind::Texts;
        Ok(match cell {
            Cell::Number { value, .. } if texts => SheetCell::Text(super::csv::number(value)),
            Cell::Number { value, error } => SheetCell::Number(value, error),
            Cell::Flag(flag) if texts => SheetCell::Text(if flag { "yes" } else { "no" }.to_owned()),
            Cell::Flag(flag) => SheetCell::Flag(flag),
            Cell::Text(text) => SheetCell::Text(text),
            Cell::Absent { reason } if reason.is_empty() => SheetCell::Empty,
            Cell::Absent { reason } => return Err(reason),
        })
    }
}

impl SheetColumn {
    fn begun(form: &FormColumn) -> SheetColumn {
        let cells = match form.kind {
            CellKind::Numbers { .. } => SheetCells::Numbers { values: Vec::new(), errors: Vec::new() },
            CellKind::Flags => SheetCells::Flags(Vec::new()),
            CellKind::Texts => SheetCells::Texts(Vec::new()),
        };
        SheetColumn { form: form.clone(), cells }
    }

    fn push(&mut self, cell: SheetCell) {
        match &mut self.cells {
            SheetCells::Numbers { values, errors } => {
                let (value, error) = match cell {
                    SheetCell::Number(value, error) => (Some(value), error),
                    _ => (None, None),
                };
                values.push(value);
                if self.form.has_errors() {
                    errors.push(error);
                }
            }
            SheetCells::Flags(flags) => flags.push(match cell {
                SheetCell::Flag(flag) => Some(flag),
                _ => None,
            }),
            SheetCells::Texts(texts) => texts.push(match cell {
                SheetCell::Text(text) => Some(text),
                _ => None,
            }),
        }
    }
}
