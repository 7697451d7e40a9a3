//! From a snapshot to its charts: which kinds it gives, and the data of each.

mod capacitance;
mod curves;
mod depth;
mod ledger;
mod range;
mod response;
pub mod sweep;
pub mod table;

use crate::archive::{Snapshot, Status, Table, Value};
use crate::figure_text::significant;

use super::chart::{Body, Chart, Kind};
use super::error::PictureError;

pub use ledger::{CLOSURES, COMES_IN};
pub use table::{Choice, Columns, Numbers};

/// Every chart that a snapshot gives, the most telling one first. A table gives one for its own choice of columns.
pub fn of_snapshot(snapshot: &Snapshot) -> Vec<Chart> {
    kinds(snapshot).into_iter().filter_map(|kind| chart(snapshot, kind, &Choice::default()).ok()).collect()
}

/// The kinds of chart that a snapshot gives.
pub fn kinds(snapshot: &Snapshot) -> Vec<Kind> {
    let mut found = Vec::new();
    if rows(snapshot, "points") > 0 {
        found.push(Kind::CurrentVoltage);
        if snapshot.label.kind == "light J-V" {
            found.push(Kind::Power);
        }
    }
    if rows(snapshot, "capacitance") > 0 {
        found.push(Kind::Capacitance);
    }
    if rows(snapshot, "response") > 0 {
        found.push(Kind::Response);
    }
    if rows(snapshot, "profiles") > 0 {
        found.extend([Kind::Bands, Kind::Carriers, Kind::Field, Kind::Rates]);
    }
    if ledger::gives(snapshot) {
        found.push(Kind::Ledger);
    }
    if let Some(table) = snapshot.tables.iter().find(|table| table.rows > 0) {
        // the tables of analyses have charts of their own; their columns can still be asked for by name
        let own = found.is_empty();
        let columns = Columns::of_table(table);
        if own {
            found.extend(columns.kinds());
        }
    }
    found
}

/// The kind that tells most of a snapshot.
///
/// # Errors
/// A snapshot without data for any.
pub fn first(snapshot: &Snapshot) -> Result<Kind, PictureError> {
    kinds(snapshot).first().copied().ok_or_else(|| PictureError::Nothing {
        snapshot: snapshot.name().to_string(),
        of: snapshot.label.kind.clone(),
        reason: match &snapshot.label.status {
            Status::Failed { reason } => format!("it failed: {reason}"),
            Status::Solved => String::new(),
        },
    })
}

/// The chart of that kind of a snapshot; `choice` names columns where the chart is of a table.
///
/// # Errors
/// A snapshot without the data that the chart needs, or without a column that was chosen.
pub fn chart(snapshot: &Snapshot, kind: Kind, choice: &Choice) -> Result<Chart, PictureError> {
    let none = |reason: &str| {
        let gives = kinds(snapshot);
        let (of, name, reason) =
            (snapshot.label.kind.clone(), snapshot.name().to_string(), reason.to_string());
        if gives.is_empty() {
            PictureError::Nothing { snapshot: name, of, reason }
        } else {
            PictureError::NoSuchChart { snapshot: name, of, wanted: kind, reason, gives }
        }
    };
    let table = |name: &str| snapshot.table(name).filter(|table| table.rows > 0);
    let mut notes = Vec::new();
    if let Status::Failed { reason } = &snapshot.label.status {
        notes.push(format!("failed: {reason}"));
    }
    let body = match kind {
        Kind::CurrentVoltage | Kind::Power => {
            let points = table("points").ok_or_else(|| none(""))?;
            curves::body(snapshot, points, kind, &mut notes).ok_or_else(|| none("it has no such column"))?
        }
        Kind::Capacitance => {
            let points = table("capacitance").ok_or_else(|| none(""))?;
            capacitance::body(points, &mut notes).ok_or_else(|| none("a column is missing"))?
        }
        Kind::Response => {
            let response = table("response").ok_or_else(|| none(""))?;
            response::body(response).ok_or_else(|| none("a column is missing"))?
        }
        Kind::Bands | Kind::Carriers | Kind::Field | Kind::Rates => {
            let profiles = table("profiles").ok_or_else(|| none(""))?;
            depth::body(snapshot, profiles, kind, &mut notes).ok_or_else(|| none("a column is missing"))?
        }
        Kind::Ledger => Body::Waterfall(ledger::body(snapshot, &mut notes).ok_or_else(|| none(""))?),
        Kind::Lines | Kind::Map | Kind::Histogram => {
            let table = snapshot.tables.iter().find(|table| table.rows > 0).ok_or_else(|| none(""))?;
            let columns = Columns::of_table(table);
            return table::chart(snapshot.name(), &columns, kind, choice).map(|mut chart| {
                chart.notes.splice(0..0, notes);
                chart
            });
        }
    };
    Ok(Chart {
        kind,
        snapshots: vec![snapshot.name().to_string()],
        title: snapshot.name().to_string(),
        conditions: conditions(snapshot),
        notes,
        body,
    })
}

fn rows(snapshot: &Snapshot, table: &str) -> u64 {
    snapshot.table(table).map_or(0, |table| table.rows)
}

/// The numbers of a column.
fn numbers<'a>(table: &'a Table, name: &str) -> Option<&'a [f64]> {
    table.column(name).map(|column| column.values.as_slice())
}

/// The number of a condition.
fn condition(snapshot: &Snapshot, name: &str) -> Option<f64> {
    let all = snapshot.conditions.iter().chain(&snapshot.stack.settings);
    all.filter(|each| each.name == name).find_map(|each| match &each.value {
        Value::Number { value, .. } => Some(*value),
        _ => None,
    })
}

/// Light, temperature and voltage in a few words.
fn conditions(snapshot: &Snapshot) -> String {
    let text = |name: &str| {
        snapshot.conditions.iter().find(|each| each.name == name).and_then(|each| match &each.value {
            Value::Text(text) => Some(text.clone()),
            Value::Number { .. } | Value::Flag(_) => None,
        })
    };
    let mut words = Vec::new();
    if !snapshot.stack.name.is_empty() {
        words.push(snapshot.stack.name.clone());
    }
    if let Some(light) = text("light") {
        let suns = condition(snapshot, "suns").filter(|suns| *suns != 1.0);
        words.push(suns.map_or(light.clone(), |suns| format!("{light}, {} suns", significant(suns, 4))));
    }
    if let Some(voltage) = condition(snapshot, "voltage") {
        words.push(format!("{} V", significant(voltage, 4)));
    }
    if let Some(temperature) = condition(snapshot, "temperature") {
        words.push(format!("{} K", significant(temperature, 5)));
    }
    words.join(", ")
}
