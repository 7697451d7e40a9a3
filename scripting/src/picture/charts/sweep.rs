//! A sweep as columns: its coordinates as what was varied, its outputs with their errors, the failed points as holes.

use crate::archive::{Archive, ArchiveError, Cell, Status, Sweep, SweepColumn};

use super::table::{Columns, Numbers};

/// The columns of a sweep, its points in the order of the plan. A coordinate of texts counts
/// them; outputs that hold texts are left out.
///
/// # Errors
/// A damaged block of points.
pub fn columns(archive: &Archive, sweep: &Sweep) -> Result<Columns, ArchiveError> {
    let mut columns: Vec<Numbers> = Vec::new();
    if let Some(record) = sweep.record() {
        columns = record.start.coordinates.iter().map(|column| numbers(column, true, 0)).collect();
    }
    let coordinates = columns.len();
    let (mut rows, mut failed) = (0, 0);
    for stored in archive.points(sweep) {
        let point = stored?.point;
        failed += usize::from(point.status != Status::Solved);
        for (column, cell) in columns.iter_mut().zip(&point.coordinates) {
            push(column, cell, rows);
        }
        for output in &point.outputs {
            let known =
                |column: &Numbers| column.name == output.column.name && column.unit == output.column.unit;
            let index = match columns[coordinates..].iter().position(known) {
                Some(index) => coordinates + index,
                None => {
                    columns.push(numbers(&output.column, false, rows));
                    columns.len() - 1
                }
            };
            push(&mut columns[index], &output.cell, rows);
        }
        rows += 1;
        for column in &mut columns {
            column.values.resize(rows, f64::NAN);
        }
    }
    for column in &mut columns {
        if !column.error.is_empty() {
            column.error.resize(rows, 0.0);
        }
    }
    // texts that are results hold no number
    columns.retain(|column| column.values.iter().any(|v| v.is_finite()));
    let mut notes = Vec::new();
    if failed > 0 {
        notes.push(format!("{failed} of {rows} points failed and are left out"));
    }
    let conditions = sweep.record().map_or_else(String::new, |record| record.start.plan.clone());
    Ok(Columns { columns, notes, conditions })
}

fn numbers(column: &SweepColumn, varied: bool, rows: usize) -> Numbers {
    Numbers {
        name: column.name.clone(),
        unit: column.unit.clone(),
        values: vec![f64::NAN; rows],
        varied,
        ..Numbers::default()
    }
}

/// Adds the cell of the point after `rows` others.
fn push(column: &mut Numbers, cell: &Cell, rows: usize) {
    column.values.resize(rows, f64::NAN);
    match cell {
        Cell::Number { value, error } => {
            column.values.push(*value);
            if let Some(error) = error {
                column.error.resize(rows, 0.0);
                column.error.push(*error);
            }
        }
        Cell::Flag(flag) => column.values.push(f64::from(u8::from(*flag))),
        Cell::Text(text) if column.varied => {
            let index = column.index_of(text);
            column.values.push(index);
        }
        Cell::Text(_) | Cell::Absent { .. } => column.values.push(f64::NAN),
    }
}
