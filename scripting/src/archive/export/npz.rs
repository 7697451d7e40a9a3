//! A zip of `.npy` arrays (format 1.0), which numpy and its kin open.
//!
//! Each column is an array of `<f8` under `TABLE.COLUMN`; the figures are `figures.name`, `figures.value`,
//! `figures.numerical_error` and `figures.unit` (absent numbers are NaN), the ledger and the conditions
//! likewise. Nothing is compressed and every time stamp is the earliest that zip can hold, so that the same
//! snapshot gives the same bytes.

use std::collections::BTreeSet;
use std::io::{Cursor, Seek, Write};

use zip::write::SimpleFileOptions;
use zip::{CompressionMethod, DateTime, ZipWriter};

use super::sheet::{Form, Row, SheetCells, SheetColumn};
use super::{plain_name, unique_name};
use crate::archive::error::ArchiveError;
use crate::archive::model::{Snapshot, Value};
use crate::archive::reader::Archive;
use crate::archive::stored::Sweep;

/// The snapshot as the bytes of an NPZ file.
///
/// # Errors
/// [`ArchiveError::Encoding`].
pub fn npz(snapshot: &Snapshot) -> Result<Vec<u8>, ArchiveError> {
    let mut arrays = Arrays { zip: ZipWriter::new(Cursor::new(Vec::new())), taken: BTreeSet::new() };
    for table in &snapshot.tables {
        for column in &table.columns {
            arrays.numbers(&format!("{}.{}", table.name, column.name), &column.values)?;
        }
    }
    if !snapshot.figures.is_empty() {
        let figures = &snapshot.figures;
        let of = |get: fn(&crate::archive::Figure) -> Option<f64>| -> Vec<f64> {
            figures.iter().map(|figure| get(figure).unwrap_or(f64::NAN)).collect()
        };
        arrays.texts("figures.name", figures.iter().map(|figure| figure.name.as_str()))?;
        arrays.numbers("figures.value", &of(|figure| figure.value))?;
        arrays.numbers("figures.numerical_error", &of(|figure| figure.error))?;
        arrays.texts("figures.unit", figures.iter().map(|figure| figure.unit.as_str()))?;
    }
    if !snapshot.ledgers.is_empty() {
        let lines =
            || snapshot.ledgers.iter().flat_map(|ledger| ledger.lines.iter().map(move |line| (ledger, line)));
        let of = |get: fn(&crate::archive::LedgerLine) -> Option<f64>| -> Vec<f64> {
            lines().map(|(_, line)| get(line).unwrap_or(f64::NAN)).collect()
        };
        arrays.texts("ledger.title", lines().map(|(ledger, _)| ledger.title.as_str()))?;
        arrays.texts("ledger.group", lines().map(|(_, line)| line.group.as_str()))?;
        arrays.texts("ledger.line", lines().map(|(_, line)| line.label.as_str()))?;
        arrays.numbers("ledger.value", &of(|line| line.value))?;
        arrays.texts("ledger.unit", lines().map(|(_, line)| line.unit.as_str()))?;
        arrays.numbers("ledger.share", &of(|line| line.share))?;
    }
    if !snapshot.conditions.is_empty() {
        let shown: Vec<(String, f64, &str)> = snapshot
            .conditions
            .iter()
            .map(|condition| match &condition.value {
                Value::Number { value, unit } => (condition.value.to_string(), *value, unit.as_str()),
                other => (other.to_string(), f64::NAN, ""),
            })
            .collect();
        arrays.texts("conditions.name", snapshot.conditions.iter().map(|each| each.name.as_str()))?;
        arrays.texts("conditions.text", shown.iter().map(|(text, ..)| text.as_str()))?;
        arrays.numbers("conditions.value", &shown.iter().map(|(_, value, _)| *value).collect::<Vec<_>>())?;
        arrays.texts("conditions.unit", shown.iter().map(|(.., unit)| *unit))?;
    }
    Ok(arrays.zip.finish().map_err(failed)?.into_inner())
}

/// Writes a sweep as an NPZ file: `point`, one array a column under its name with its unit (`bsf_nm`) and one for its
/// errors (`voc_error_V`), `reason`. Absent numbers are NaN, flags `|b1` with `NAME_known` beside them where some are
/// absent. The sweep is read once for every few columns.
///
/// # Errors
/// [`ArchiveError::Encoding`] and those of reading the sweep.
pub fn npz_sheet(
    form: &Form,
    archive: &Archive,
    sweep: &Sweep,
    out: impl Write + Seek,
) -> Result<(), ArchiveError> {
    let mut arrays = Arrays { zip: ZipWriter::new(out), taken: BTreeSet::new() };
    let indices = form.rows(archive, sweep).map(|row| row.map(|row| row.index.to_le_bytes()));
    let indices: Vec<[u8; 8]> = indices.collect::<Result<_, _>>()?;
    arrays.put("point", "<u8", form.rows, indices.as_flattened())?;
    drop(indices);
    for stretch in form.stretches() {
        let sheet = form.gathered(stretch, form.rows(archive, sweep).map(without_reason))?;
        for column in &sheet.columns {
            arrays.column(column)?;
        }
    }
    let reasons = form.gathered(0..0, form.rows(archive, sweep))?.reasons;
    arrays.texts("reason", reasons.iter().map(String::as_str))?;
    arrays.zip.finish().map_err(failed)?;
    Ok(())
}

fn without_reason(row: Result<Row, ArchiveError>) -> Result<Row, ArchiveError> {
    row.map(|row| Row { reason: String::new(), ..row })
}

fn failed(error: impl std::fmt::Display) -> ArchiveError {
    ArchiveError::Encoding { what: "NPZ".to_owned(), reason: error.to_string() }
}

struct Arrays<W: Write + Seek> {
    zip: ZipWriter<W>,
    taken: BTreeSet<String>,
}

impl<W: Write + Seek> Arrays<W> {
    /// A column of a sweep.
    fn column(&mut self, column: &SheetColumn) -> Result<(), ArchiveError> {
        let title = column.form.title();
        match &column.cells {
            SheetCells::Numbers { values, errors } => {
                self.optional(&title, values)?;
                if !errors.is_empty() {
                    self.optional(&column.form.error_title(), errors)?;
                }
            }
            SheetCells::Flags(flags) => {
                let bytes: Vec<u8> = flags.iter().map(|flag| u8::from(*flag == Some(true))).collect();
                self.put(&title, "|b1", flags.len(), &bytes)?;
                if flags.contains(&None) {
                    let known: Vec<u8> = flags.iter().map(|flag| u8::from(flag.is_some())).collect();
                    self.put(&format!("{}_known", column.form.name), "|b1", flags.len(), &known)?;
                }
            }
            SheetCells::Texts(texts) => {
                self.texts(&title, texts.iter().map(|text| text.as_deref().unwrap_or_default()))?;
            }
        }
        Ok(())
    }

    fn optional(&mut self, name: &str, values: &[Option<f64>]) -> Result<(), ArchiveError> {
        let bytes: Vec<[u8; 8]> =
            values.iter().map(|value| value.unwrap_or(f64::NAN).to_le_bytes()).collect();
        self.put(name, "<f8", values.len(), bytes.as_flattened())
    }

    fn numbers(&mut self, name: &str, values: &[f64]) -> Result<(), ArchiveError> {
        let bytes: Vec<u8> = values.iter().flat_map(|value| value.to_le_bytes()).collect();
        self.put(name, "<f8", values.len(), &bytes)
    }

    /// Texts as UCS-4, each padded with zeros to the longest, written as they are made: padding may take much.
    fn texts<'a>(
        &mut self,
        name: &str,
        texts: impl Iterator<Item = &'a str> + Clone,
    ) -> Result<(), ArchiveError> {
        let (count, width) = texts.clone().fold((0, 1), |(count, width): (usize, usize), text| {
            (count + 1, width.max(text.chars().count()))
        });
        self.begin(name, &format!("<U{width}"), count, 4 * width * count)?;
        let mut bytes = Vec::new();
        for text in texts {
            // A zero character ends a text for numpy; none of ours has a use for one.
            let letters = text.chars().map(|c| if c == '\0' { u32::from(' ') } else { u32::from(c) });
            let padded = letters.chain(std::iter::repeat(0)).take(width);
            bytes.extend(padded.flat_map(u32::to_le_bytes));
            if bytes.len() > 1 << 20 {
                self.zip.write_all(&bytes).map_err(failed)?;
                bytes.clear();
            }
        }
        self.zip.write_all(&bytes).map_err(failed)
    }

    fn put(&mut self, name: &str, kind: &str, count: usize, data: &[u8]) -> Result<(), ArchiveError> {
        self.begin(name, kind, count, data.len())?;
        self.zip.write_all(data).map_err(failed)
    }

    /// Begins an array of so many bytes.
    fn begin(&mut self, name: &str, kind: &str, count: usize, bytes: usize) -> Result<(), ArchiveError> {
        let name = unique_name(plain_name(name), &mut self.taken);
        let options = SimpleFileOptions::default()
            .compression_method(CompressionMethod::Stored)
            .last_modified_time(DateTime::default())
            .unix_permissions(0o644)
            .large_file(bytes >= 1 << 31);
        self.zip.start_file(format!("{name}.npy"), options).map_err(failed)?;
        self.zip.write_all(&npy_header(kind, count)).map_err(failed)
    }
}

/// The header of a one-dimensional `.npy` array, padded so that the data begin at a multiple of 64.
fn npy_header(kind: &str, count: usize) -> Vec<u8> {
    const BEFORE: usize = 10;
    let mut about = format!("{{'descr': '{kind}', 'fortran_order': False, 'shape': ({count},), }}");
    let spaces = (BEFORE + about.len() + 1).next_multiple_of(64) - (BEFORE + about.len() + 1);
    about.push_str(&" ".repeat(spaces));
    about.push('\n');
    let mut out = b"\x93NUMPY\x01\x00".to_vec();
    // The text is below two hundred bytes whatever the numbers.
    out.extend((about.len() as u16).to_le_bytes());
    out.extend(about.as_bytes());
    out
}
