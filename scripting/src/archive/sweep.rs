//! A sweep as it is stored: what its plan asked for, and what each point gave. Plain data, like the other records.

use serde::{Deserialize, Serialize};

use super::model::{Snapshot, Status};

/// What is known of a sweep before its first point is solved.
#[derive(Clone, Debug, Default, PartialEq, Serialize, Deserialize)]
pub struct SweepStart {
    /// Name of the sweep, unique among the snapshots and sweeps of its archive.
    pub name: String,
    /// Position of the call that runs it in the run of the script, from 0.
    pub step: u64,
    /// Indices of the whole plan, whatever share of them this run solves. Each is a point, but those that a filter of
    /// the plan leaves out: nothing is stored for them.
    pub points: u64,
    /// The plan in words, such as `grid of bsf (3) by x (15)`.
    pub plan: String,
    /// Names of what the plan varies and the units of the coordinates, in the plan's order.
    pub coordinates: Vec<SweepColumn>,
}

/// Name and unit of a column.
#[derive(Clone, Debug, Default, PartialEq, Eq, Serialize, Deserialize)]
pub struct SweepColumn {
    /// Its name, such as `bsf`.
    pub name: String,
    /// Its unit as a script spells it, which follows from the dimension alone; `percent` for a share that is shown so;
    /// empty for a plain number, a text or a flag.
    pub unit: String,
}

/// One value of a point.
#[derive(Clone, Debug, PartialEq, Serialize, Deserialize)]
pub enum Cell {
    /// A number in the unit of its column.
    Number {
        /// The value.
        value: f64,
        /// Estimate of its absolute numerical error, where there is one.
        error: Option<f64>,
    },
    /// A text.
    Text(String),
    /// Yes or no.
    Flag(bool),
    /// Nothing, and why where it is known.
    Absent {
        /// The reason; empty when the script gave `()`.
        reason: String,
    },
}

/// One output of a point.
#[derive(Clone, Debug, PartialEq, Serialize, Deserialize)]
pub struct PointOutput {
    /// Name and unit.
    pub column: SweepColumn,
    /// The value.
    pub cell: Cell,
}

/// What one point of a plan gave. It depends on the point alone.
#[derive(Clone, Debug, Default, PartialEq, Serialize, Deserialize)]
pub struct Point {
    /// Its index in the whole plan, from 0.
    pub index: u64,
    /// Its coordinates, as many as [`SweepStart::coordinates`].
    pub coordinates: Vec<Cell>,
    /// What the script returned for it, ordered by name; empty when it failed.
    pub outputs: Vec<PointOutput>,
    /// Solved, or failed with the reason as a person reads it.
    pub status: Status,
    /// Lines that the script printed for it.
    pub printed: Vec<String>,
    /// Warnings of its analyses.
    pub warnings: Vec<String>,
    /// Results that the script stored for it, in the order of the script.
    pub snapshots: Vec<Snapshot>,
}
