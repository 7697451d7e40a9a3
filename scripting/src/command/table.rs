//! Sweeps and their points as a person reads them.

use std::fmt::Write;

use crate::archive::export::{CellKind, Form, FormColumn, Sheet, SheetCells, SheetColumn};
use crate::archive::{Archive, Cell, Status, StoredPoint, Sweep};
use crate::figure_text::{figure_text, significant, unit_symbol};

use super::columns::{Align, columns, laid, widths};

/// Rows of a table that are shown unless all are asked for.
pub const FIRST_ROWS: usize = 30;

/// Digits of a number that carries no error.
const DIGITS: usize = 7;

/// Letters of a text in a table.
const LETTERS: usize = 60;

/// One line on a sweep.
pub fn sweep_line(sweep: &Sweep) -> Vec<String> {
    let record = sweep.record();
    let plan = record.map_or("its description is damaged", |record| &record.start.plan);
    let mut points = format!("{} points", sweep.count());
    if sweep.failed() > 0 {
        points.push_str(&format!(", {} failed", sweep.failed()));
    }
    if let Some(share) = record.and_then(|record| record.share) {
        points.push_str(&format!(", part {share}"));
    }
    if record.is_some_and(|record| record.left_out.is_none()) {
        points.push_str(", not finished");
    }
    vec![sweep.name.clone(), points, plan.to_string()]
}

/// A sweep in columns of text, written stretch by stretch: their widths are found first.
pub struct TableText<'a> {
    form: &'a Form,
    align: Vec<Align>,
    widths: Vec<usize>,
}

impl<'a> TableText<'a> {
    /// A table of that sweep, with nothing in it yet.
    pub fn new(form: &'a Form) -> Self {
        let align = form.columns.iter().map(|column| match column.kind {
            CellKind::Numbers { .. } => Align::Right,
            _ => Align::Left,
        });
        let align: Vec<Align> = std::iter::once(Align::Right).chain(align).collect();
        let mut table = TableText { form, align, widths: Vec::new() };
        table.widths = widths(&table.heading(), table.widths);
        table
    }

    /// Makes room for these rows.
    pub fn measure(&mut self, sheet: &Sheet) {
        self.widths = widths(&self.cells(sheet), std::mem::take(&mut self.widths));
    }

    /// The names of the columns and their units.
    pub fn head(&self) -> String {
        laid(&self.heading(), &self.align, &self.widths, 0)
    }

    /// These rows.
    pub fn rows(&self, sheet: &Sheet) -> String {
        laid(&self.cells(sheet), &self.align, &self.widths, 0)
    }

    /// What stands below the rows where there are more.
    pub fn rest(&self, shown: usize) -> String {
        match self.form.rows.saturating_sub(shown) {
            0 => String::new(),
            more => format!("and {more} points more (--all shows them)\n"),
        }
    }

    fn heading(&self) -> Vec<Vec<String>> {
        let mut names = vec!["point".to_string()];
        let mut units = vec![String::new()];
        for column in &self.form.columns {
            names.push(column.name.clone());
            units.push(match is_share(column) {
                true => "%".to_string(),
                false => unit_symbol(&column.unit),
            });
        }
        if self.form.reasons {
            names.push("reason".to_string());
        }
        let mut rows = vec![names];
        if units.iter().any(|unit| !unit.is_empty()) {
            rows.push(units);
        }
        rows
    }

    fn cells(&self, sheet: &Sheet) -> Vec<Vec<String>> {
        let row = |row: usize| {
            let mut cells = vec![sheet.indices[row].to_string()];
            cells.extend(sheet.columns.iter().map(|column| cell_text(column, row)));
            if self.form.reasons {
                cells.push(shortened(&sheet.reasons[row]));
            }
            cells
        };
        (0..sheet.indices.len()).map(row).collect()
    }
}

/// Fractions that the trade reads in percent; their unit says so, or their name.
fn is_share(column: &FormColumn) -> bool {
    let known = matches!(column.name.as_str(), "ff" | "fill_factor" | "efficiency");
    matches!(column.kind, CellKind::Numbers { .. }) && column.unit.is_empty() && known
}

fn cell_text(column: &SheetColumn, row: usize) -> String {
    match &column.cells {
        SheetCells::Numbers { values, errors } => {
            let factor = if is_share(&column.form) { 100.0 } else { 1.0 };
            let error = errors.get(row).copied().flatten().map(|error| factor * error);
            values[row].map_or_else(|| "-".to_string(), |value| plain_figure(factor * value, error))
        }
        SheetCells::Flags(flags) => match flags[row] {
            Some(true) => "yes".to_string(),
            Some(false) => "no".to_string(),
            None => "-".to_string(),
        },
        SheetCells::Texts(texts) => texts[row].as_deref().map_or_else(|| "-".to_string(), shortened),
    }
}

/// A number to the place of its error, without the error.
fn plain_figure(value: f64, error: Option<f64>) -> String {
    let text = figure_text(value, error, "");
    match text.split_once(" +- ") {
        Some((value, _)) => value.to_string(),
        None => significant(value, DIGITS),
    }
}

fn shortened(text: &str) -> String {
    let line = text.split_whitespace().collect::<Vec<_>>().join(" ");
    if line.chars().count() <= LETTERS {
        return line;
    }
    let start: String = line.chars().take(LETTERS - 2).collect();
    format!("{start}..")
}

/// One point: what it was asked, what it gave, what it printed and stored.
pub fn point_text(sweep: &Sweep, stored: &StoredPoint) -> String {
    let point = &stored.point;
    let mut text = format!("point {} of the sweep `{}`\n", point.index, sweep.name);
    if let Status::Failed { reason } = &point.status {
        // writing to a text cannot fail, here and below
        let _ = writeln!(text, "  failed: {reason}");
    }
    let names = sweep.record().map(|record| record.start.coordinates.as_slice()).unwrap_or_default();
    let mut rows: Vec<Vec<String>> = Vec::new();
    for (place, cell) in point.coordinates.iter().enumerate() {
        let column = names.get(place);
        let unit = column.map_or("", |column| &column.unit);
        let name = column.map_or_else(|| format!("coordinate {place}"), |column| column.name.clone());
        rows.push(vec![name, value_text(cell, unit), "coordinate".to_string()]);
    }
    for output in &point.outputs {
        rows.push(vec![output.column.name.clone(), value_text(&output.cell, &output.column.unit)]);
    }
    text.push_str(&columns(&rows, &[], 2));
    for line in &point.printed {
        let _ = writeln!(text, "  printed: {line}");
    }
    for warning in &point.warnings {
        let _ = writeln!(text, "  warning: {warning}");
    }
    for place in &stored.snapshots {
        let _ = writeln!(text, "  stored: {} ({})", place.label.name, place.label.kind);
    }
    text
}

fn value_text(cell: &Cell, unit: &str) -> String {
    match cell {
        Cell::Number { value, error } => figure_text(*value, *error, unit),
        Cell::Text(text) => text.clone(),
        Cell::Flag(flag) => if *flag { "yes" } else { "no" }.to_string(),
        Cell::Absent { reason } if reason.is_empty() => "none".to_string(),
        Cell::Absent { reason } => format!("none: {reason}"),
    }
}

/// The sweep and the point that a name such as `map/12` means, where the archive has that sweep.
pub fn point_of<'a>(archive: &'a Archive, name: &str) -> Option<(&'a Sweep, u64)> {
    let (sweep, index, inside) = crate::archive::point_of_name(name)?;
    let found = archive.sweeps().iter().find(|each| each.name == sweep)?;
    inside.is_none().then_some((found, index))
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::archive::export::{Row, SheetCell};

    /// Source of truth: the layout as it is meant, written by hand.
    #[test]
    fn a_sweep_reads_as_a_table() {
        let column = |name: &str, unit: &str, kind| FormColumn {
            name: name.to_string(),
            unit: unit.to_string(),
            coordinate: false,
            kind,
        };
        let form = Form {
            name: "map".to_string(),
            rows: 3,
            failed: 1,
            reasons: true,
            columns: vec![
                column("bsf", "nm", CellKind::Numbers { errors: false }),
                column("efficiency", "", CellKind::Numbers { errors: true }),
                column("good", "", CellKind::Flags),
            ],
            ..Form::default()
        };
        let row = |index, bsf, efficiency, good| Row {
            index,
            cells: vec![SheetCell::Number(bsf, None), efficiency, SheetCell::Flag(good)],
            reason: String::new(),
        };
        let rows = [
            row(12, 80.0, SheetCell::Number(0.251, Some(3e-4)), false),
            row(0, 20.0, SheetCell::Number(0.243_712, Some(2e-5)), true),
        ];
        let sheet = form.gathered(0..3, rows.into_iter().map(Ok)).unwrap();
        let expected = "\
point  bsf  efficiency  good  reason
        nm           %
   12   80       25.10  no
    0   20      24.371  yes
and 1 points more (--all shows them)
";
        let mut table = TableText::new(&form);
        table.measure(&sheet);
        assert_eq!(format!("{}{}{}", table.head(), table.rows(&sheet), table.rest(2)), expected);
    }
}
