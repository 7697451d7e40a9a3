//! Everything as JSON: numbers read back as the same bits; what is no number is null, with the reason.

use std::io::Write;

use serde::Serialize;
use serde::ser::{Error, SerializeMap, SerializeSeq, Serializer};

use crate::archive::error::ArchiveError;
use crate::archive::model::{
    Column, Condition, Figure, Layer, Ledger, LedgerLine, MaterialValue, MeshValue, OrderKey, RunHeader,
    Snapshot, Stack, Status, Table, Value,
};
use crate::archive::reader::{Archive, Entry};
use crate::archive::stored::Sweep;
use crate::archive::sweep::{Cell, StoredPoint, SweepColumn};

use super::sheet::{Form, Row, SheetCells, SheetColumn};

/// The snapshot as JSON, ended by a line feed.
///
/// # Errors
/// [`ArchiveError::Encoding`].
pub fn json_snapshot(snapshot: &Snapshot) -> Result<Vec<u8>, ArchiveError> {
    text(&SnapshotView::of(snapshot))
}

/// The run, the list of snapshots and the warnings of an archive as JSON, ended by a line feed.
///
/// # Errors
/// [`ArchiveError::Encoding`].
pub fn json_listing(archive: &Archive) -> Result<Vec<u8>, ArchiveError> {
    text(&ListingView {
        run: archive.run().ok().map(RunView::of),
        snapshots: archive.entries().iter().map(EntryView::of).collect(),
        sweeps: archive.sweeps().iter().map(SweepView::of).collect(),
        finished: archive.is_finished(),
        warnings: archive.warnings().iter().map(ToString::to_string).collect(),
    })
}

/// Writes a sweep as JSON: its points' indices, its columns with units, errors and reasons, ended by a line feed. The sweep
/// is read once for every few columns.
///
/// # Errors
/// [`ArchiveError::Encoding`].
pub fn json_sheet(
    form: &Form,
    archive: &Archive,
    sweep: &Sweep,
    mut out: impl Write,
) -> Result<(), ArchiveError> {
    let read = Reading { form, archive, sweep };
    let view = SheetView {
        sweep: &form.name,
        points: Indices(&read),
        columns: Columns(&read),
        reasons: Reasons(&read),
    };
    serde_json::to_writer_pretty(&mut out, &view).map_err(failed)?;
    out.write_all(b"\n").and_then(|()| out.flush()).map_err(failed)
}

/// One point as JSON: coordinates, outputs, status, lines, warnings and the names of what it stored.
///
/// # Errors
/// [`ArchiveError::Encoding`].
pub fn json_point(sweep: &Sweep, stored: &StoredPoint) -> Result<Vec<u8>, ArchiveError> {
    let point = &stored.point;
    let unnamed = SweepColumn::default();
    let columns = sweep.record().map(|record| record.start.coordinates.as_slice()).unwrap_or_default();
    let coordinate = |(place, cell)| CellView(columns.get(place).unwrap_or(&unnamed), cell);
    text(&PointView {
        sweep: &sweep.name,
        point: point.index,
        failed: match &point.status {
            Status::Solved => None,
            Status::Failed { reason } => Some(reason),
        },
        coordinates: point.coordinates.iter().enumerate().map(coordinate).collect(),
        outputs: point.outputs.iter().map(|output| CellView(&output.column, &output.cell)).collect(),
        printed: &point.printed,
        warnings: &point.warnings,
        snapshots: stored.snapshots.iter().map(|place| place.label.name.as_str()).collect(),
    })
}

#[derive(Serialize)]
struct PointView<'a> {
    sweep: &'a str,
    point: u64,
    failed: Option<&'a String>,
    coordinates: Vec<CellView<'a>>,
    outputs: Vec<CellView<'a>>,
    printed: &'a [String],
    warnings: &'a [String],
    snapshots: Vec<&'a str>,
}

struct CellView<'a>(&'a SweepColumn, &'a Cell);

impl Serialize for CellView<'_> {
    fn serialize<S: Serializer>(&self, serializer: S) -> Result<S::Ok, S::Error> {
        let mut map = serializer.serialize_map(None)?;
        map.serialize_entry("name", &self.0.name)?;
        map.serialize_entry("unit", &self.0.unit)?;
        match self.1 {
            Cell::Number { value, error } => {
                put_number(&mut map, Some(*value), None)?;
                map.serialize_entry("numerical_error", error)?;
            }
            Cell::Text(text) => map.serialize_entry("value", text)?,
            Cell::Flag(flag) => map.serialize_entry("value", flag)?,
            Cell::Absent { reason } => put_number(&mut map, None, Some(reason))?,
        }
        map.end()
    }
}

#[derive(Serialize)]
struct SheetView<'a> {
    sweep: &'a str,
    points: Indices<'a>,
    columns: Columns<'a>,
    /// Why a point failed, or has no value in a column; empty where there is nothing to say.
    reasons: Reasons<'a>,
}

/// A sweep that is read while it is written.
struct Reading<'a> {
    form: &'a Form,
    archive: &'a Archive,
    sweep: &'a Sweep,
}

impl Reading<'_> {
    /// Something of each row, one after the other.
    fn each<S: Serializer, T: Serialize>(&self, serializer: S, of: fn(Row) -> T) -> Result<S::Ok, S::Error> {
        let mut list = serializer.serialize_seq(Some(self.form.rows))?;
        for row in self.form.rows(self.archive, self.sweep) {
            list.serialize_element(&of(row.map_err(S::Error::custom)?))?;
        }
        list.end()
    }
}

struct Indices<'a>(&'a Reading<'a>);
struct Columns<'a>(&'a Reading<'a>);
struct Reasons<'a>(&'a Reading<'a>);

impl Serialize for Indices<'_> {
    fn serialize<S: Serializer>(&self, serializer: S) -> Result<S::Ok, S::Error> {
        self.0.each(serializer, |row| row.index)
    }
}

impl Serialize for Reasons<'_> {
    fn serialize<S: Serializer>(&self, serializer: S) -> Result<S::Ok, S::Error> {
        self.0.each(serializer, |row| row.reason)
    }
}

impl Serialize for Columns<'_> {
    fn serialize<S: Serializer>(&self, serializer: S) -> Result<S::Ok, S::Error> {
        let Reading { form, archive, sweep } = self.0;
        let mut list = serializer.serialize_seq(Some(form.columns.len()))?;
        for stretch in form.stretches() {
            let sheet = form.gathered(stretch, form.rows(archive, sweep)).map_err(S::Error::custom)?;
            for column in &sheet.columns {
                list.serialize_element(&SheetColumnView::of(column))?;
            }
        }
        list.end()
    }
}

#[derive(Serialize)]
struct SheetColumnView<'a> {
    name: &'a str,
    unit: &'a str,
    coordinate: bool,
    #[serde(flatten)]
    cells: CellsView<'a>,
}

#[derive(Serialize)]
#[serde(untagged)]
enum CellsView<'a> {
    Numbers {
        values: &'a [Option<f64>],
        #[serde(skip_serializing_if = "<[_]>::is_empty")]
        numerical_errors: &'a [Option<f64>],
        #[serde(skip_serializing_if = "Vec::is_empty")]
        not_numbers: Vec<NoNumber>,
    },
    Flags {
        values: &'a [Option<bool>],
    },
    Texts {
        values: &'a [Option<String>],
    },
}

impl<'a> SheetColumnView<'a> {
    fn of(column: &'a SheetColumn) -> Self {
        let cells = match &column.cells {
            SheetCells::Numbers { values, errors } => CellsView::Numbers {
                values,
                numerical_errors: errors,
                not_numbers: values
                    .iter()
                    .enumerate()
                    .filter_map(|(row, value)| {
                        value.and_then(no_number).map(|reason| NoNumber { row, reason })
                    })
                    .collect(),
            },
            SheetCells::Flags(values) => CellsView::Flags { values },
            SheetCells::Texts(values) => CellsView::Texts { values },
        };
        let form = &column.form;
        SheetColumnView { name: &form.name, unit: &form.unit, coordinate: form.coordinate, cells }
    }
}

#[derive(Serialize)]
struct SweepView<'a> {
    name: &'a str,
    step: u64,
    plan: Option<&'a str>,
    indices: Option<u64>,
    points: u64,
    failed: u64,
    part: Option<String>,
}

impl<'a> SweepView<'a> {
    fn of(sweep: &'a Sweep) -> Self {
        let record = sweep.record();
        SweepView {
            name: &sweep.name,
            step: sweep.step,
            plan: record.map(|record| record.start.plan.as_str()),
            indices: record.map(|record| record.start.points),
            points: sweep.count(),
            failed: sweep.failed(),
            part: record.and_then(|record| record.share).map(|share| share.to_string()),
        }
    }
}

fn text(view: &impl Serialize) -> Result<Vec<u8>, ArchiveError> {
    let mut out = serde_json::to_vec_pretty(view).map_err(failed)?;
    out.push(b'\n');
    Ok(out)
}

fn failed(error: impl std::fmt::Display) -> ArchiveError {
    ArchiveError::Encoding { what: "JSON".to_owned(), reason: error.to_string() }
}

/// What a number that JSON cannot hold is called.
fn no_number(value: f64) -> Option<&'static str> {
    match value {
        value if value.is_nan() => Some("NaN"),
        f64::INFINITY => Some("infinity"),
        f64::NEG_INFINITY => Some("-infinity"),
        _ => None,
    }
}

/// A number that may be none, with its reason beside it under `reason`.
fn put_number<M: SerializeMap>(
    map: &mut M,
    value: Option<f64>,
    reason: Option<&str>,
) -> Result<(), M::Error> {
    map.serialize_entry("value", &value)?;
    match (reason, value.and_then(no_number)) {
        (Some(reason), _) => map.serialize_entry("reason", reason),
        (None, Some(which)) => map.serialize_entry("reason", &format!("not a number: {which}")),
        (None, None) => Ok(()),
    }
}

struct ValueView<'a>(&'a Value);

impl Serialize for ValueView<'_> {
    fn serialize<S: Serializer>(&self, serializer: S) -> Result<S::Ok, S::Error> {
        match self.0 {
            Value::Number { value, unit } => {
                let mut map = serializer.serialize_map(None)?;
                put_number(&mut map, Some(*value), None)?;
                map.serialize_entry("unit", unit)?;
                map.end()
            }
            Value::Text(text) => serializer.serialize_str(text),
            Value::Flag(flag) => serializer.serialize_bool(*flag),
        }
    }
}

#[derive(Serialize)]
struct ConditionView<'a> {
    name: &'a str,
    value: ValueView<'a>,
}

fn conditions(list: &[Condition]) -> Vec<ConditionView<'_>> {
    list.iter().map(|each| ConditionView { name: &each.name, value: ValueView(&each.value) }).collect()
}

struct FigureView<'a>(&'a Figure);

impl Serialize for FigureView<'_> {
    fn serialize<S: Serializer>(&self, serializer: S) -> Result<S::Ok, S::Error> {
        let Figure { name, value, error, unit, reason, meshes } = self.0;
        let mut map = serializer.serialize_map(None)?;
        map.serialize_entry("name", name)?;
        put_number(&mut map, *value, reason.as_deref())?;
        map.serialize_entry("numerical_error", error)?;
        map.serialize_entry("unit", unit)?;
        map.serialize_entry("meshes", &meshes.iter().map(MeshView).collect::<Vec<_>>())?;
        map.end()
    }
}

struct MeshView<'a>(&'a MeshValue);

impl Serialize for MeshView<'_> {
    fn serialize<S: Serializer>(&self, serializer: S) -> Result<S::Ok, S::Error> {
        let mut map = serializer.serialize_map(None)?;
        map.serialize_entry("nodes", &self.0.nodes)?;
        put_number(&mut map, Some(self.0.value), None)?;
        map.end()
    }
}

#[derive(Serialize)]
struct TableView<'a> {
    name: &'a str,
    rows: u64,
    columns: Vec<ColumnView<'a>>,
}

#[derive(Serialize)]
struct ColumnView<'a> {
    name: &'a str,
    unit: &'a str,
    values: &'a [f64],
    #[serde(skip_serializing_if = "Vec::is_empty")]
    not_numbers: Vec<NoNumber>,
}

/// Why the value of a row is null.
#[derive(Serialize)]
struct NoNumber {
    row: usize,
    reason: &'static str,
}

impl<'a> TableView<'a> {
    fn of(table: &'a Table) -> Self {
        TableView {
            name: &table.name,
            rows: table.rows,
            columns: table.columns.iter().map(ColumnView::of).collect(),
        }
    }
}

impl<'a> ColumnView<'a> {
    fn of(column: &'a Column) -> Self {
        let not_numbers = column
            .values
            .iter()
            .enumerate()
            .filter_map(|(row, value)| no_number(*value).map(|reason| NoNumber { row, reason }))
            .collect();
        ColumnView { name: &column.name, unit: &column.unit, values: &column.values, not_numbers }
    }
}

#[derive(Serialize)]
struct LedgerView<'a> {
    title: &'a str,
    lines: Vec<LineView<'a>>,
}

struct LineView<'a>(&'a LedgerLine);

impl Serialize for LineView<'_> {
    fn serialize<S: Serializer>(&self, serializer: S) -> Result<S::Ok, S::Error> {
        let LedgerLine { group, label, value, unit, share, note } = self.0;
        let mut map = serializer.serialize_map(None)?;
        map.serialize_entry("group", group)?;
        map.serialize_entry("label", label)?;
        put_number(&mut map, *value, None)?;
        map.serialize_entry("unit", unit)?;
        map.serialize_entry("share", share)?;
        map.serialize_entry("note", note)?;
        map.end()
    }
}

#[derive(Serialize)]
struct StackView<'a> {
    name: &'a str,
    layers: Vec<LayerView<'a>>,
    settings: Vec<ConditionView<'a>>,
}

#[derive(Serialize)]
struct LayerView<'a> {
    name: &'a str,
    material: &'a str,
    thickness: ValueView<'a>,
    doping: &'a str,
    settings: Vec<ConditionView<'a>>,
}

impl<'a> StackView<'a> {
    fn of(stack: &'a Stack) -> Self {
        let layer = |layer: &'a Layer| LayerView {
            name: &layer.name,
            material: &layer.material,
            thickness: ValueView(&layer.thickness),
            doping: &layer.doping,
            settings: conditions(&layer.settings),
        };
        StackView {
            name: &stack.name,
            layers: stack.layers.iter().map(layer).collect(),
            settings: conditions(&stack.settings),
        }
    }
}

#[derive(Serialize)]
struct MaterialView<'a> {
    layer: &'a str,
    material: &'a str,
    parameter: &'a str,
    value: ValueView<'a>,
    source: &'a str,
    note: &'a str,
}

impl<'a> MaterialView<'a> {
    fn of(each: &'a MaterialValue) -> Self {
        MaterialView {
            layer: &each.layer,
            material: &each.material,
            parameter: &each.parameter,
            value: ValueView(&each.value),
            source: &each.source,
            note: &each.note,
        }
    }
}

#[derive(Serialize)]
struct SnapshotView<'a> {
    name: &'a str,
    kind: &'a str,
    order: OrderKey,
    status: &'static str,
    #[serde(skip_serializing_if = "Option::is_none")]
    failure: Option<&'a str>,
    conditions: Vec<ConditionView<'a>>,
    figures: Vec<FigureView<'a>>,
    tables: Vec<TableView<'a>>,
    ledgers: Vec<LedgerView<'a>>,
    stack: StackView<'a>,
    materials: Vec<MaterialView<'a>>,
    warnings: &'a [String],
}

fn status(status: &Status) -> (&'static str, Option<&str>) {
    match status {
        Status::Solved => ("solved", None),
        Status::Failed { reason } => ("failed", Some(reason)),
    }
}

impl<'a> SnapshotView<'a> {
    fn of(snapshot: &'a Snapshot) -> Self {
        let (status, failure) = status(&snapshot.label.status);
        let ledger = |ledger: &'a Ledger| LedgerView {
            title: &ledger.title,
            lines: ledger.lines.iter().map(LineView).collect(),
        };
        SnapshotView {
            name: &snapshot.label.name,
            kind: &snapshot.label.kind,
            order: snapshot.label.order,
            status,
            failure,
            conditions: conditions(&snapshot.conditions),
            figures: snapshot.figures.iter().map(FigureView).collect(),
            tables: snapshot.tables.iter().map(TableView::of).collect(),
            ledgers: snapshot.ledgers.iter().map(ledger).collect(),
            stack: StackView::of(&snapshot.stack),
            materials: snapshot.materials.iter().map(MaterialView::of).collect(),
            warnings: &snapshot.warnings,
        }
    }
}

#[derive(Serialize)]
struct EntryView<'a> {
    name: &'a str,
    kind: &'a str,
    order: OrderKey,
    status: &'static str,
    #[serde(skip_serializing_if = "Option::is_none")]
    failure: Option<&'a str>,
}

impl<'a> EntryView<'a> {
    fn of(entry: &'a Entry) -> Self {
        let (status, failure) = status(&entry.label.status);
        let label = &entry.label;
        EntryView { name: &label.name, kind: &label.kind, order: label.order, status, failure }
    }
}

#[derive(Serialize)]
struct InputView<'a> {
    name: &'a str,
    default: ValueView<'a>,
    used: ValueView<'a>,
    overridden: bool,
}

#[derive(Serialize)]
struct DataView<'a> {
    name: &'a str,
    blake3: &'a str,
    length: u64,
}

#[derive(Serialize)]
struct RunView<'a> {
    program_version: &'a str,
    script_name: &'a str,
    script_text: &'a str,
    inputs: Vec<InputView<'a>>,
    data_files: Vec<DataView<'a>>,
    tolerances: Vec<ConditionView<'a>>,
}

impl<'a> RunView<'a> {
    fn of(run: &'a RunHeader) -> Self {
        RunView {
            program_version: &run.program_version,
            script_name: &run.script_name,
            script_text: &run.script_text,
            inputs: run
                .inputs
                .iter()
                .map(|(name, input)| InputView {
                    name,
                    default: ValueView(&input.default),
                    used: ValueView(&input.used),
                    overridden: input.overridden,
                })
                .collect(),
            data_files: run
                .data_files
                .iter()
                .map(|(name, file)| DataView { name, blake3: &file.blake3, length: file.length })
                .collect(),
            tolerances: conditions(&run.tolerances),
        }
    }
}

#[derive(Serialize)]
struct ListingView<'a> {
    run: Option<RunView<'a>>,
    snapshots: Vec<EntryView<'a>>,
    sweeps: Vec<SweepView<'a>>,
    finished: bool,
    warnings: Vec<String>,
}
