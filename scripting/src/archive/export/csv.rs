//! Comma-separated values: a header line with units in the names, then one line a row.
//!
//! Numbers are the shortest decimal that reads back as the same bits; what is no number is `NaN`, `inf`
//! or `-inf`, and an absent value is an empty cell.

use std::collections::BTreeSet;
use std::io::Write;

use super::sheet::{Form, Row, SheetCell};
use super::{plain_name, unique_name};
use crate::archive::error::ArchiveError;
use crate::archive::model::{Figure, Ledger, Snapshot, Table};

/// One file of a CSV export.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct CsvDocument {
    /// What is added to the name of the file; nothing for the first one.
    pub suffix: Option<String>,
    /// Its bytes.
    pub bytes: Vec<u8>,
}

/// What one file of an export holds.
enum Part<'a> {
    Table(&'a Table),
    Figures(&'a [Figure]),
    Ledgers(&'a [Ledger]),
}

fn parts(snapshot: &Snapshot) -> Vec<Part<'_>> {
    let mut parts: Vec<Part> = snapshot.tables.iter().map(Part::Table).collect();
    if !snapshot.figures.is_empty() || parts.is_empty() {
        parts.push(Part::Figures(&snapshot.figures));
    }
    if !snapshot.ledgers.is_empty() {
        parts.push(Part::Ledgers(&snapshot.ledgers));
    }
    parts
}

/// The names of the files of an export, in order: the tables, then `figures`, then `ledger`, as far as it has them. The
/// first one stands at the path asked for; the others take theirs as a suffix.
pub fn csv_names(snapshot: &Snapshot) -> Vec<String> {
    let mut taken = BTreeSet::new();
    let names = parts(snapshot).into_iter().map(|part| match part {
        Part::Table(table) => plain_name(&table.name),
        Part::Figures(_) => "figures".to_owned(),
        Part::Ledgers(_) => "ledger".to_owned(),
    });
    names.map(|name| unique_name(name, &mut taken)).collect()
}

/// The tables of the snapshot, then `figures`, then `ledger`, as far as it has them.
///
/// # Errors
/// [`ArchiveError::Encoding`].
pub fn csv_documents(snapshot: &Snapshot) -> Result<Vec<CsvDocument>, ArchiveError> {
    let named = csv_names(snapshot).into_iter().zip(parts(snapshot)).enumerate();
    let document = |(place, (name, part))| {
        let bytes = match part {
            Part::Table(table) => table_bytes(table)?,
            Part::Figures(figures) => figure_bytes(figures)?,
            Part::Ledgers(ledgers) => ledger_bytes(ledgers)?,
        };
        Ok(CsvDocument { suffix: (place > 0).then_some(name), bytes })
    };
    named.map(document).collect()
}

/// A number as the shortest decimal that reads back as the same bits.
pub(super) fn number(value: f64) -> String {
    let size = value.abs();
    if value.is_nan() {
        "NaN".to_owned()
    } else if value == 0.0 || value.is_infinite() || (1e-4..1e15).contains(&size) {
        format!("{value}")
    } else {
        format!("{value:e}")
    }
}

fn optional(value: Option<f64>) -> String {
    value.map_or_else(String::new, number)
}

type Lines<W> = csv::Writer<W>;

fn failed(error: impl std::fmt::Display) -> ArchiveError {
    ArchiveError::Encoding { what: "CSV".to_owned(), reason: error.to_string() }
}

fn written(fill: impl FnOnce(&mut Lines<Vec<u8>>) -> csv::Result<()>) -> Result<Vec<u8>, ArchiveError> {
    let mut lines = csv::Writer::from_writer(Vec::new());
    fill(&mut lines).map_err(failed)?;
    lines.into_inner().map_err(failed)
}

/// A sweep, row by row: the index of each point, its columns with units in their names and errors beside them, and the
/// reason.
///
/// # Errors
/// [`ArchiveError::Encoding`] and those of the rows.
pub fn csv_sheet(
    form: &Form,
    rows: impl Iterator<Item = Result<Row, ArchiveError>>,
    out: impl Write,
) -> Result<(), ArchiveError> {
    let mut lines = csv::Writer::from_writer(out);
    let mut taken = BTreeSet::new();
    let mut heading = vec![unique_name("point".to_owned(), &mut taken)];
    for column in &form.columns {
        heading.push(unique_name(column.title(), &mut taken));
        if column.has_errors() {
            heading.push(unique_name(column.error_title(), &mut taken));
        }
    }
    heading.push(unique_name("reason".to_owned(), &mut taken));
    lines.write_record(&heading).map_err(failed)?;
    for row in rows {
        let row = row?;
        line(&mut lines, form, &row).map_err(failed)?;
    }
    lines.flush().map_err(failed)
}

fn line(lines: &mut Lines<impl Write>, form: &Form, row: &Row) -> csv::Result<()> {
    lines.write_field(row.index.to_string())?;
    for (column, cell) in form.columns.iter().zip(&row.cells) {
        let (text, error) = match cell {
            SheetCell::Empty => (String::new(), None),
            SheetCell::Number(value, error) => (number(*value), *error),
            SheetCell::Flag(flag) => (if *flag { "yes" } else { "no" }.to_owned(), None),
            SheetCell::Text(text) => (text.clone(), None),
        };
        lines.write_field(text)?;
        if column.has_errors() {
            lines.write_field(optional(error))?;
        }
    }
    lines.write_field(&row.reason)?;
    lines.write_record(None::<&[u8]>)
}

fn table_bytes(table: &Table) -> Result<Vec<u8>, ArchiveError> {
    written(|lines| {
        lines.write_record(table.columns.iter().map(|column| column.name.as_str()))?;
        let rows = table.columns.iter().map(|column| column.values.len()).max().unwrap_or(0);
        for row in 0..rows {
            lines
                .write_record(table.columns.iter().map(|column| optional(column.values.get(row).copied())))?;
        }
        Ok(())
    })
}

fn figure_bytes(figures: &[Figure]) -> Result<Vec<u8>, ArchiveError> {
    written(|lines| {
        lines.write_record(["figure", "value", "numerical_error", "unit", "reason"])?;
        for figure in figures {
            lines.write_record([
                figure.name.as_str(),
                &optional(figure.value),
                &optional(figure.error),
                &figure.unit,
                figure.reason.as_deref().unwrap_or_default(),
            ])?;
        }
        Ok(())
    })
}

fn ledger_bytes(ledgers: &[Ledger]) -> Result<Vec<u8>, ArchiveError> {
    written(|lines| {
        lines.write_record(["ledger", "group", "line", "value", "unit", "share", "note"])?;
        for ledger in ledgers {
            for line in &ledger.lines {
                lines.write_record([
                    ledger.title.as_str(),
                    &line.group,
                    &line.label,
                    &optional(line.value),
                    &line.unit,
                    &optional(line.share),
                    &line.note,
                ])?;
            }
        }
        Ok(())
    })
}
