//! A sweep as an Apache Parquet file: one row group, uncompressed, absent values as nulls.

use std::sync::Arc;

use parquet::basic::{LogicalType, Repetition, Type as Physical};
use parquet::data_type::{BoolType, ByteArray, ByteArrayType, DataType, DoubleType, Int64Type};
use parquet::errors::ParquetError;
use parquet::file::metadata::KeyValue;
use parquet::file::properties::WriterProperties;
use parquet::file::writer::{SerializedFileWriter, SerializedRowGroupWriter};
use parquet::schema::types::Type;

use super::sheet::{Sheet, SheetCells};
use super::unique_name;
use crate::archive::error::ArchiveError;

/// One column as Parquet wants it: the values that are there, and which rows they belong to.
enum Data {
    Numbers(Vec<Option<f64>>),
    Flags(Vec<Option<bool>>),
    Texts(Vec<Option<String>>),
    Indices(Vec<u64>),
}

/// The sheet as the bytes of a Parquet file. The unit of each column stands in the metadata of the file, under
/// `unit of NAME`.
///
/// # Errors
/// [`ArchiveError::Encoding`].
pub fn parquet(sheet: &Sheet) -> Result<Vec<u8>, ArchiveError> {
    write(sheet)
        .map_err(|error| ArchiveError::Encoding { what: "Parquet".to_owned(), reason: error.to_string() })
}

fn write(sheet: &Sheet) -> Result<Vec<u8>, ParquetError> {
    let mut taken = std::collections::BTreeSet::new();
    let mut units = Vec::new();
    let mut columns =
        vec![(unique_name("point".to_owned(), &mut taken), Data::Indices(sheet.indices.clone()))];
    for column in &sheet.columns {
        let name = unique_name(column.title(), &mut taken);
        units.push(KeyValue::new(format!("unit of {name}"), column.unit.clone()));
        match &column.cells {
            SheetCells::Numbers { values, errors } => {
                columns.push((name, Data::Numbers(values.clone())));
                if !errors.is_empty() {
                    let name = unique_name(column.error_title(), &mut taken);
                    units.push(KeyValue::new(format!("unit of {name}"), column.unit.clone()));
                    columns.push((name, Data::Numbers(errors.clone())));
                }
            }
            SheetCells::Flags(flags) => columns.push((name, Data::Flags(flags.clone()))),
            SheetCells::Texts(texts) => columns.push((name, Data::Texts(texts.clone()))),
        }
    }
    let reasons = sheet.reasons.iter().map(|reason| Some(reason.clone()).filter(|it| !it.is_empty()));
    columns.push((unique_name("reason".to_owned(), &mut taken), Data::Texts(reasons.collect())));

    let fields: Result<Vec<Arc<Type>>, ParquetError> =
        columns.iter().map(|(name, data)| field(name, data).map(Arc::new)).collect();
    let schema = Arc::new(Type::group_type_builder("sweep").with_fields(fields?).build()?);
    let properties = WriterProperties::builder()
        .set_created_by(concat!("epiloom ", env!("CARGO_PKG_VERSION")).to_owned())
        .set_key_value_metadata(Some(units))
        .build();
    let mut writer = SerializedFileWriter::new(Vec::new(), schema, Arc::new(properties))?;
    let mut rows = writer.next_row_group()?;
    for (_, data) in columns {
        match data {
            Data::Numbers(values) => put::<DoubleType>(&mut rows, values)?,
            Data::Flags(flags) => put::<BoolType>(&mut rows, flags)?,
            Data::Texts(texts) => {
                let bytes = texts.into_iter().map(|text| text.map(|text| ByteArray::from(text.into_bytes())));
                put::<ByteArrayType>(&mut rows, bytes.collect())?;
            }
            // a plan has fewer than 2^63 points
            Data::Indices(indices) => {
                put::<Int64Type>(&mut rows, indices.into_iter().map(|index| Some(index as i64)).collect())?;
            }
        }
    }
    rows.close()?;
    writer.into_inner()
}

fn field(name: &str, data: &Data) -> Result<Type, ParquetError> {
    let (physical, logical, repetition) = match data {
        Data::Numbers(_) => (Physical::DOUBLE, None, Repetition::OPTIONAL),
        Data::Flags(_) => (Physical::BOOLEAN, None, Repetition::OPTIONAL),
        Data::Texts(_) => (Physical::BYTE_ARRAY, Some(LogicalType::String), Repetition::OPTIONAL),
        Data::Indices(_) => (Physical::INT64, None, Repetition::OPTIONAL),
    };
    Type::primitive_type_builder(name, physical)
        .with_logical_type(logical)
        .with_repetition(repetition)
        .build()
}

fn put<T: DataType>(
    rows: &mut SerializedRowGroupWriter<'_, Vec<u8>>,
    cells: Vec<Option<T::T>>,
) -> Result<(), ParquetError> {
    let levels: Vec<i16> = cells.iter().map(|cell| i16::from(cell.is_some())).collect();
    let values: Vec<T::T> = cells.into_iter().flatten().collect();
    // as many columns are asked for as the schema has
    let Some(mut column) = rows.next_column()? else { return Ok(()) };
    column.typed::<T>().write_batch(&values, Some(&levels), None)?;
    column.close()
}
