//! A sweep as it is stored: what its plan asked for, and what each point gave. Plain data, like the other records.

use serde::{Deserialize, Serialize};

use super::layout::Digest;
use super::model::{Label, OrderKey, Snapshot, Status};

record! {
    /// What is known of a sweep before its first point is solved.
    pub struct SweepStart {
        /// Name of the sweep, unique among the snapshots and sweeps of its archive.
        pub name: String,
        /// Position of the call that runs it in the run of the script, from 0.
        pub step: u64,
        /// Indices of the whole plan, whatever share of them this run solves. Each is a point, but those that a filter
        /// of the plan leaves out: nothing is stored for them.
        pub points: u64,
        /// The plan in words, such as `grid of bsf (3) by x (15)`.
        pub plan: String,
        /// Names of what the plan varies and the units of the coordinates, in the plan's order.
        pub coordinates: Vec<SweepColumn>,
    }
}

record! {
    /// Name and unit of a column.
    pub struct SweepColumn {
        /// Its name, such as `bsf`.
        pub name: String,
        /// Its unit as a script spells it, which follows from the dimension alone; `percent` for a share that is shown
        /// so; empty for a plain number, a text or a flag.
        pub unit: String,
    }
}

impl Eq for SweepColumn {}

impl PartialOrd for SweepColumn {
    fn partial_cmp(&self, other: &Self) -> Option<std::cmp::Ordering> {
        Some(self.cmp(other))
    }
}

impl Ord for SweepColumn {
    fn cmp(&self, other: &Self) -> std::cmp::Ordering {
        (&self.name, &self.unit).cmp(&(&other.name, &other.unit))
    }
}

record! {
    /// One of equal shares of every plan: the points whose index leaves `number - 1` when divided by `of`.
    pub struct Share {
        /// Which share, from 1.
        pub number: u64,
        /// How many shares there are.
        pub of: u64,
    }
}

impl Copy for Share {}
impl Eq for Share {}

impl Share {
    /// Whether the point of that index belongs to the share.
    pub fn holds(self, index: u64) -> bool {
        self.of == 0 || index % self.of == self.number.wrapping_sub(1)
    }

    /// How many points of a plan of that many belong to it.
    pub fn count(self, points: u64) -> u64 {
        match self.number.checked_sub(1) {
            Some(first) if self.of > 0 && first < points => (points - 1 - first) / self.of + 1,
            _ => 0,
        }
    }
}

impl std::fmt::Display for Share {
    fn fmt(&self, f: &mut std::fmt::Formatter<'_>) -> std::fmt::Result {
        write!(f, "{}/{}", self.number, self.of)
    }
}

record! {
    /// The description of a sweep.
    pub struct SweepRecord {
        /// Its plan.
        pub start: SweepStart,
        /// The share of its points that the run solves; absent for all.
        pub share: Option<Share>,
        /// Digest of the payload of the description of the run as it was when the sweep began.
        pub run: Digest,
        /// How many indices of the share the filter of the plan leaves out; absent until all its points are done.
        pub left_out: Option<u64>,
    }
}

impl SweepRecord {
    /// Whether the points of the one are those of the other: the same plan in the same place of the same run.
    pub(crate) fn same_points(&self, other: &SweepRecord) -> bool {
        self.start == other.start && self.share == other.share && self.run == other.run
    }
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

impl Cell {
    /// The number of the cell, if it is one.
    pub fn number(&self) -> Option<f64> {
        match self {
            Cell::Number { value, .. } => Some(*value),
            _ => None,
        }
    }
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
    /// Results that the script stored for it, in the order of the script, each under the name that
    /// [`point_snapshot_name`] makes and in the order key of the sweep's step and the point's index.
    pub snapshots: Vec<Snapshot>,
}

impl Point {
    /// The output of that name.
    pub fn output(&self, name: &str) -> Option<&PointOutput> {
        self.outputs.iter().find(|output| output.column.name == name)
    }
}

/// A point as it is read from an archive: what it stored is named, and read when it is asked for.
#[derive(Clone, Debug, Default, PartialEq)]
pub struct StoredPoint {
    /// The point, without its snapshots.
    pub point: Point,
    /// Where its snapshots stand, in the order of the script.
    pub snapshots: Vec<SnapshotPlace>,
}

/// Where a snapshot that a point stored stands.
#[derive(Clone, Debug, Default, PartialEq)]
pub struct SnapshotPlace {
    /// Its label.
    pub label: Label,
    /// Where its frame begins.
    pub offset: u64,
    /// Length of its frame in bytes.
    pub length: u64,
    pub(crate) header_digest: Digest,
}

/// The name in the archive of what a point stores as `name`: `map/12/bands`.
pub fn point_snapshot_name(sweep: &str, index: u64, name: &str) -> String {
    format!("{sweep}/{index}/{name}")
}

/// A sweep and the index of one of its points from `map/12`, and what follows after another `/`.
pub fn point_of_name(name: &str) -> Option<(&str, u64, Option<&str>)> {
    // The first part that can be an index is one: a sweep's own name has none.
    for (slash, _) in name.match_indices('/') {
        let (sweep, rest) = (&name[..slash], &name[slash + 1..]);
        let (digits, inside) = match rest.split_once('/') {
            Some((digits, inside)) => (digits, Some(inside)),
            None => (rest, None),
        };
        let plain = !digits.is_empty() && digits.bytes().all(|byte| byte.is_ascii_digit());
        let plain = plain && (digits == "0" || !digits.starts_with('0'));
        if let Some(index) = digits.parse().ok().filter(|_| plain && !sweep.is_empty()) {
            return Some((sweep, index, inside));
        }
    }
    None
}

/// The order key of what a point of a sweep stores.
pub(crate) fn point_order(step: u64, index: u64) -> OrderKey {
    OrderKey { step, point: index }
}
