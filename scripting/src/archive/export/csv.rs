//! Comma-separated values: a header line with units in the names, then one line a row.
//!
//! Numbers are the shortest decimal that reads back as the same bits; what is no number is `NaN`, `inf`
//! or `-inf`, and an absent value is an empty cell.

use std::collections::BTreeSet;

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

/// The tables of the snapshot, then `figures`, then `ledger`, as far as it has them.
///
/// # Errors
/// [`ArchiveError::Encoding`].
pub fn csv_documents(snapshot: &Snapshot) -> Result<Vec<CsvDocument>, ArchiveError> {
    let mut named: Vec<(String, Vec<u8>)> = Vec::new();
    for table in &snapshot.tables {
        named.push((plain_name(&table.name), table_bytes(table)?));
    }
    if !snapshot.figures.is_empty() || named.is_empty() {
        named.push(("figures".to_owned(), figure_bytes(&snapshot.figures)?));
    }
    if !snapshot.ledgers.is_empty() {
        named.push(("ledger".to_owned(), ledger_bytes(&snapshot.ledgers)?));
    }
    let mut taken = BTreeSet::new();
    let documents = named.into_iter().enumerate().map(|(place, (name, bytes))| {
        let name = unique_name(name, &mut taken);
        CsvDocument { suffix: (place > 0).then_some(name), bytes }
    });
    Ok(documents.collect())
}

fn number(value: f64) -> String {
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

type Lines = csv::Writer<Vec<u8>>;

fn written(fill: impl FnOnce(&mut Lines) -> csv::Result<()>) -> Result<Vec<u8>, ArchiveError> {
    let failed = |reason: String| ArchiveError::Encoding { what: "CSV".to_owned(), reason };
    let mut lines = csv::Writer::from_writer(Vec::new());
    fill(&mut lines).map_err(|error| failed(error.to_string()))?;
    lines.into_inner().map_err(|error| failed(error.to_string()))
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
