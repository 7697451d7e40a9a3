//! A sweep as an Apache Parquet file: row groups of 100,000 points, uncompressed, absent values as nulls.

use std::io::Write;
use std::sync::Arc;

use parquet::basic::{LogicalType, Repetition, Type as Physical};
use parquet::data_type::{BoolType, ByteArray, ByteArrayType, DataType, DoubleType, Int64Type};
use parquet::errors::ParquetError;
use parquet::file::metadata::KeyValue;
use parquet::file::properties::WriterProperties;
use parquet::file::writer::{SerializedFileWriter, SerializedRowGroupWriter};
use parquet::schema::types::Type;

use super::sheet::{CellKind, Form, Row, Sheet, SheetCells};
use super::unique_name;
use crate::archive::error::ArchiveError;

/// Points of a row group.
const GROUP: usize = 100_000;

/// Writes a sweep as a Parquet file. The unit of each column stands in the metadata of the file, under `unit of NAME`.
///
/// # Errors
/// [`ArchiveError::Encoding`] and those of the rows.
pub fn parquet(
    form: &Form,
    mut rows: impl Iterator<Item = Result<Row, ArchiveError>>,
    out: impl Write + Send,
) -> Result<(), ArchiveError> {
    let mut writer = begun(form, out).map_err(failed)?;
    let mut left = form.rows;
    // a sweep without points has one group without rows
    loop {
        let sheet = form.gathered(0..form.columns.len(), rows.by_ref().take(GROUP))?;
        left = left.saturating_sub(sheet.indices.len());
        group(&mut writer, sheet).map_err(failed)?;
        if left == 0 {
            break;
        }
    }
    writer.finish().map_err(failed)?;
    writer.inner_mut().flush().map_err(failed)
}

fn failed(error: impl std::fmt::Display) -> ArchiveError {
    ArchiveError::Encoding { what: "Parquet".to_owned(), reason: error.to_string() }
}

/// The file with its columns and their units.
fn begun<W: Write + Send>(form: &Form, out: W) -> Result<SerializedFileWriter<W>, ParquetError> {
    let mut taken = std::collections::BTreeSet::new();
    let mut units = Vec::new();
    let mut fields = vec![field(&unique_name("point".to_owned(), &mut taken), None)?];
    for column in &form.columns {
        let errors = column.has_errors().then(|| column.error_title());
        for title in std::iter::once(column.title()).chain(errors) {
            let name = unique_name(title, &mut taken);
            units.push(KeyValue::new(format!("unit of {name}"), column.unit.clone()));
            fields.push(field(&name, Some(column.kind))?);
        }
    }
    fields.push(field(&unique_name("reason".to_owned(), &mut taken), Some(CellKind::Texts))?);
    let fields = fields.into_iter().map(Arc::new).collect();
    let schema = Arc::new(Type::group_type_builder("sweep").with_fields(fields).build()?);
    let properties = WriterProperties::builder()
        .set_created_by(concat!("epiloom ", env!("CARGO_PKG_VERSION")).to_owned())
        .set_key_value_metadata(Some(units))
        .build();
    SerializedFileWriter::new(out, schema, Arc::new(properties))
}

/// A column; without a kind the indices of the points.
fn field(name: &str, kind: Option<CellKind>) -> Result<Type, ParquetError> {
    let (physical, logical) = match kind {
        Some(CellKind::Numbers { .. }) => (Physical::DOUBLE, None),
        Some(CellKind::Flags) => (Physical::BOOLEAN, None),
        Some(CellKind::Texts) => (Physical::BYTE_ARRAY, Some(LogicalType::String)),
        None => (Physical::INT64, None),
    };
    Type::primitive_type_builder(name, physical)
        .with_logical_type(logical)
        .with_repetition(Repetition::OPTIONAL)
        .build()
}

fn group<W: Write + Send>(writer: &mut SerializedFileWriter<W>, sheet: Sheet) -> Result<(), ParquetError> {
    let mut rows = writer.next_row_group()?;
    // a plan has fewer than 2^63 points
    put::<Int64Type, W>(&mut rows, sheet.indices.into_iter().map(|index| Some(index as i64)).collect())?;
    for column in sheet.columns {
        match column.cells {
            SheetCells::Numbers { values, errors } => {
                put::<DoubleType, W>(&mut rows, values)?;
                if column.form.has_errors() {
                    put::<DoubleType, W>(&mut rows, errors)?;
                }
            }
            SheetCells::Flags(flags) => put::<BoolType, W>(&mut rows, flags)?,
            SheetCells::Texts(texts) => put::<ByteArrayType, W>(&mut rows, bytes(texts))?,
        }
    }
    let reasons = sheet.reasons.into_iter().map(|reason| Some(reason).filter(|it| !it.is_empty()));
    put::<ByteArrayType, W>(&mut rows, bytes(reasons.collect()))?;
    rows.close().map(|_| ())
}

fn bytes(texts: Vec<Option<String>>) -> Vec<Option<ByteArray>> {
    texts.into_iter().map(|text| text.map(|text| ByteArray::from(text.into_bytes()))).collect()
}

fn put<T: DataType, W: Write + Send>(
    rows: &mut SerializedRowGroupWriter<'_, W>,
    cells: Vec<Option<T::T>>,
) -> Result<(), ParquetError> {
    let levels: Vec<i16> = cells.iter().map(|cell| i16::from(cell.is_some())).collect();
    let values: Vec<T::T> = cells.into_iter().flatten().collect();
    // as many columns are asked for as the schema has
    let Some(mut column) = rows.next_column()? else { return Ok(()) };
    column.typed::<T>().write_batch(&values, Some(&levels), None)?;
    column.close()
}
