//! Values of points as archives keep them, and back: a number in a unit that follows from its dimension alone.

use rhai::{Dynamic, ImmutableString, Map};

use crate::archive::{Cell, PointOutput, SweepColumn};
use crate::diagnostics::codes;

use super::dimension::Dimension;
use super::fault::Fault;
use super::plan::{Coordinate, Kind, plain_words};
use super::quantity::Quantity;
use super::units::{Unit, default_unit, unit};
use super::value::{Unknown, any_quantity, described};

/// The unit that numbers of this dimension have in tables; `None` for plain numbers, and where scripts have no unit.
fn unit_of(dimension: Dimension) -> Option<&'static Unit> {
    match dimension {
        Dimension::LENGTH => unit("nm"),
        Dimension::TIME => unit("ns"),
        _ => default_unit(dimension, 1.0),
    }
}

/// What a column of numbers of this dimension is in, where a value is shown in this unit.
fn column_unit(dimension: Dimension, shown_in: Option<&'static Unit>) -> (Option<&'static Unit>, String) {
    if dimension.is_none() {
        // only percent says how the number is meant; suns and none are the number itself
        let percent = shown_in.filter(|u| u.name == "percent");
        return (percent, percent.map_or(String::new(), |u| u.name.to_string()));
    }
    match unit_of(dimension) {
        Some(unit) => (Some(unit), unit.name.to_string()),
        None => (None, dimension.base_units()),
    }
}

/// Dimension and unit of a column by the unit it names.
pub fn of_unit(name: &str) -> Option<(Dimension, Option<&'static Unit>)> {
    if name.is_empty() {
        return Some((Dimension::NONE, None));
    }
    match unit(name) {
        Some(unit) => Some((unit.dimension, Some(unit))),
        None => Some((Dimension::of_base_units(name)?, None)),
    }
}

/// The column of a coordinate.
pub fn coordinate_column(coordinate: &Coordinate) -> SweepColumn {
    let unit = match coordinate.kind {
        Kind::Number(dimension, shown_in) if dimension.is_none() => column_unit(dimension, shown_in).1,
        Kind::Number(dimension, Some(unit)) if unit.dimension == dimension => unit.name.to_string(),
        Kind::Number(dimension, _) => dimension.base_units(),
        Kind::Flag | Kind::Words => String::new(),
    };
    SweepColumn { name: coordinate.name.to_string(), unit }
}

/// A coordinate's value in the unit of its column.
pub fn coordinate_cell(value: &Dynamic, column: &SweepColumn) -> Cell {
    match any_quantity(value) {
        Some(q) => {
            let number = unit(&column.unit).map_or(q.value, |u| u.typed(q.value));
            Cell::Number {
                value: number,
                error: q.error.map(|e| unit(&column.unit).map_or(e, |u| u.from_si(e))),
            }
        }
        None => match value.as_bool() {
            Ok(flag) => Cell::Flag(flag),
            Err(_) => Cell::Text(plain_words(value)),
        },
    }
}

/// What a closure gave for a point: a map of figures, or one figure alone, which is called `value`.
///
/// # Errors
/// Values that are no quantity, number, text, yes or no, nor nothing; an output that is called like a coordinate and
/// is not its value.
pub fn outputs(
    given: &Dynamic,
    coordinates: &[Coordinate],
    point: &[Dynamic],
) -> Result<Vec<PointOutput>, Fault> {
    if let Some(map) = given.read_lock::<Map>() {
        let mut list = Vec::with_capacity(map.len());
        for (key, value) in map.iter() {
            if let Some(at) = coordinates.iter().position(|c| c.name == key.as_str()) {
                if same(value, &point[at]) {
                    continue;
                }
                return Err(Fault::new(
                    codes::PLAN,
                    format!("the point gives a figure `{key}`, and has a coordinate of that name"),
                )
                .help("a table has the coordinates anyway; give the figure another name"));
            }
            list.push(output(key, value)?);
        }
        return Ok(list);
    }
    if given.is_unit() {
        return Ok(Vec::new());
    }
    Ok(vec![output("value", given)?])
}

fn same(a: &Dynamic, b: &Dynamic) -> bool {
    match (any_quantity(a), any_quantity(b)) {
        (Some(a), Some(b)) => a.same_value(&b),
        (None, None) => plain_words(a) == plain_words(b),
        _ => false,
    }
}

fn output(key: &str, value: &Dynamic) -> Result<PointOutput, Fault> {
    let plain =
        |cell| PointOutput { column: SweepColumn { name: key.to_string(), unit: String::new() }, cell };
    if let Some(q) = any_quantity(value) {
        let (unit, name) = column_unit(q.dimension, q.shown_in);
        let convert = |v: f64| unit.map_or(v, |u| u.from_si(v));
        return Ok(PointOutput {
            column: SweepColumn { name: key.to_string(), unit: name },
            cell: Cell::Number {
                value: unit.map_or(q.value, |u| u.typed(q.value)),
                error: q.error.map(convert),
            },
        });
    }
    if let Ok(flag) = value.as_bool() {
        return Ok(plain(Cell::Flag(flag)));
    }
    if let Some(text) = value.read_lock::<ImmutableString>() {
        return Ok(plain(Cell::Text(text.to_string())));
    }
    if value.is_unit() {
        return Ok(plain(Cell::Absent { reason: String::new() }));
    }
    if value.is::<Unknown>() {
        return Err(Fault::of_unknown());
    }
    Err(Fault::new(codes::WRONG_KIND, format!("`{key}` cannot stand in a table"))
        .label(format!("this is {}", described(value)))
        .help("give figures: quantities, numbers, texts, yes or no; whole results are kept by `store(\"name\", result)` in the closure"))
}

/// A cell as a script gets it.
pub fn value(cell: &Cell, column_unit: &str) -> Dynamic {
    match cell {
        Cell::Number { value, error } => {
            let (dimension, unit) = of_unit(column_unit).unwrap_or_default();
            let convert = |v: f64| unit.map_or(v, |u| u.to_si(v));
            let mut q = Quantity::si(convert(*value), dimension);
            q.error = error.map(convert);
            q.shown_in = unit;
            Dynamic::from(q)
        }
        Cell::Text(text) => text.clone().into(),
        Cell::Flag(flag) => (*flag).into(),
        Cell::Absent { .. } => Dynamic::UNIT,
    }
}
