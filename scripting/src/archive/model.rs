//! What an archive holds: the header of a run and its snapshots, as plain data.
//!
//! These types know no script, no solver and no file. Whoever fills them chooses the words (kind,
//! figure and column names); the archive keeps them as they are. The order of the fields *is* the
//! order of the bytes in a payload: to change a field, give the frame kind a new schema number.

use std::collections::BTreeMap;

use serde::{Deserialize, Serialize};

/// Declares a stored record and, for `FORMAT.md`, the list of its fields as they are written.
macro_rules! record {
    (
        $(#[doc = $about:literal])+
        pub struct $name:ident {
            $( $(#[doc = $doc:literal])+ $(#[serde($mark:ident)])? pub $field:ident : $kind:ty, )+
        }
    ) => {
        $(#[doc = $about])+
        #[derive(Clone, Debug, Default, PartialEq, Serialize, Deserialize)]
        pub struct $name {
            $( $(#[doc = $doc])+ $(#[serde($mark)])? pub $field: $kind, )+
        }

        #[cfg(test)]
        impl $name {
            /// Name, type, meaning and mark (`skip`: not in the payload) of each field, in order.
            pub(crate) const FIELDS: &'static [crate::archive::model::Field] = &[ $(
                (stringify!($field), stringify!($kind), concat!($($doc),+), concat!("", $(stringify!($mark))?)),
            )+ ];
        }
    };
}

#[cfg(test)]
pub(crate) type Field = (&'static str, &'static str, &'static str, &'static str);

record! {
    /// What one run was: program, script, inputs, data and tolerances; nothing of clock, host or threads.
    pub struct RunHeader {
        /// Version of the program that ran the script.
        pub program_version: String,
        /// File name of the script, without its folder.
        pub script_name: String,
        /// The whole text of the script.
        pub script_text: String,
        /// The inputs that the script declared, by name.
        pub inputs: BTreeMap<String, Input>,
        /// The data files that were read, by name relative to the script.
        pub data_files: BTreeMap<String, DataFile>,
        /// Tolerances and other settings of the solver that were in force.
        pub tolerances: Vec<Condition>,
    }
}

record! {
    /// One declared input of a script.
    pub struct Input {
        /// The value that the script gives.
        pub default: Value,
        /// The value that this run used.
        pub used: Value,
        /// Whether the value was set from outside the script.
        pub overridden: bool,
    }
}

record! {
    /// One data file that a script read.
    pub struct DataFile {
        /// BLAKE3 digest of its bytes, 64 hexadecimal digits.
        pub blake3: String,
        /// Its length in bytes.
        pub length: u64,
    }
}

impl DataFile {
    /// The digest and length of these bytes.
    pub fn of(bytes: &[u8]) -> Self {
        DataFile { blake3: blake3::hash(bytes).to_hex().to_string(), length: bytes.len() as u64 }
    }
}

/// A setting: a number with its unit, a text, or yes and no.
#[derive(Clone, Debug, PartialEq, Serialize, Deserialize)]
pub enum Value {
    /// A number and its unit (empty when it has none).
    Number {
        /// The number, in that unit.
        value: f64,
        /// The unit as a script spells it.
        unit: String,
    },
    /// A text.
    Text(String),
    /// Yes or no.
    Flag(bool),
}

impl Default for Value {
    fn default() -> Self {
        Value::Text(String::new())
    }
}

impl Value {
    /// A number with its unit.
    pub fn number(value: f64, unit: impl Into<String>) -> Self {
        Value::Number { value, unit: unit.into() }
    }

    /// A text.
    pub fn text(text: impl Into<String>) -> Self {
        Value::Text(text.into())
    }
}

impl std::fmt::Display for Value {
    fn fmt(&self, f: &mut std::fmt::Formatter<'_>) -> std::fmt::Result {
        match self {
            Value::Number { value, unit } if unit.is_empty() => write!(f, "{value:?}"),
            Value::Number { value, unit } => write!(f, "{value:?} {unit}"),
            Value::Text(text) => f.write_str(text),
            Value::Flag(flag) => f.write_str(if *flag { "yes" } else { "no" }),
        }
    }
}

record! {
    /// Where a snapshot stands in the finished whole: by step, then by point.
    pub struct OrderKey {
        /// Position of the storing call in the run of the script, from 0.
        pub step: u64,
        /// Index of the point in its plan; 0 outside a plan.
        pub point: u64,
    }
}

impl Copy for OrderKey {}
impl Eq for OrderKey {}

impl PartialOrd for OrderKey {
    fn partial_cmp(&self, other: &Self) -> Option<std::cmp::Ordering> {
        Some(self.cmp(other))
    }
}

impl Ord for OrderKey {
    fn cmp(&self, other: &Self) -> std::cmp::Ordering {
        (self.step, self.point).cmp(&(other.step, other.point))
    }
}

/// Whether a snapshot holds a solution.
#[derive(Clone, Debug, Default, PartialEq, Eq, Serialize, Deserialize)]
pub enum Status {
    /// Solved to the stated tolerances.
    #[default]
    Solved,
    /// Not solved: what is here is the last good state.
    Failed {
        /// Why, with equation, layer, depth and bias.
        reason: String,
    },
}

record! {
    /// What a listing shows of a snapshot without reading it.
    pub struct Label {
        /// Name of the snapshot, unique in its archive.
        pub name: String,
        /// What it is, such as `light J-V`; the word is the caller's.
        pub kind: String,
        /// Its place in the finished whole.
        pub order: OrderKey,
        /// Solved, or failed with the reason.
        pub status: Status,
    }
}

record! {
    /// One stored result with everything that it stands on.
    pub struct Snapshot {
        /// Name, kind, place and status; the same as in the label of the frame.
        pub label: Label,
        /// The conditions of the result, in the order in which a person reads them.
        pub conditions: Vec<Condition>,
        /// Figures of merit.
        pub figures: Vec<Figure>,
        /// Tables of numbers; the numbers themselves stand in the number block of the frame.
        pub tables: Vec<Table>,
        /// The accounts of photons, carriers and energy.
        pub ledgers: Vec<Ledger>,
        /// The device.
        pub stack: Stack,
        /// Every material value that was actually used.
        pub materials: Vec<MaterialValue>,
        /// What the person should know before using the figures.
        pub warnings: Vec<String>,
    }
}

impl Snapshot {
    /// Name of the snapshot.
    pub fn name(&self) -> &str {
        &self.label.name
    }

    /// The table of that name.
    pub fn table(&self, name: &str) -> Option<&Table> {
        self.tables.iter().find(|table| table.name == name)
    }

    /// The figure of that name.
    pub fn figure(&self, name: &str) -> Option<&Figure> {
        self.figures.iter().find(|figure| figure.name == name)
    }
}

record! {
    /// A named setting.
    pub struct Condition {
        /// What is set.
        pub name: String,
        /// To what.
        pub value: Value,
    }
}

impl Condition {
    /// A setting of that name and value.
    pub fn new(name: impl Into<String>, value: Value) -> Self {
        Condition { name: name.into(), value }
    }
}

record! {
    /// One figure of merit with its numerical error.
    pub struct Figure {
        /// Name, such as `voc`.
        pub name: String,
        /// The extrapolated value; absent when the figure has no meaning here.
        pub value: Option<f64>,
        /// Estimate of the absolute numerical error, in the same unit.
        pub error: Option<f64>,
        /// Unit; empty for a fraction.
        pub unit: String,
        /// Why the value is absent.
        pub reason: Option<String>,
        /// The value on each mesh, coarsest first.
        pub meshes: Vec<MeshValue>,
    }
}

record! {
    /// A figure on one of the nested meshes.
    pub struct MeshValue {
        /// Number of nodes of the mesh.
        pub nodes: u64,
        /// The value there, in the unit of the figure.
        pub value: f64,
    }
}

record! {
    /// A table: columns of equal length.
    pub struct Table {
        /// Name, such as `points` or `bands`.
        pub name: String,
        /// Number of rows; every column holds as many numbers.
        pub rows: u64,
        /// The columns.
        pub columns: Vec<Column>,
    }
}

impl Table {
    /// A table of these columns; its row count is that of the first one.
    ///
    /// Columns of unequal length are refused when the snapshot is written.
    pub fn new(name: impl Into<String>, columns: Vec<Column>) -> Self {
        let rows = columns.first().map_or(0, |column| column.values.len() as u64);
        Table { name: name.into(), rows, columns }
    }

    /// The column of that name.
    pub fn column(&self, name: &str) -> Option<&Column> {
        self.columns.iter().find(|column| column.name == name)
    }
}

record! {
    /// One column of a table.
    pub struct Column {
        /// Name with its unit, such as `depth_um`.
        pub name: String,
        /// The unit alone.
        pub unit: String,
        /// The numbers, one a row; stored in the number block of the frame.
        #[serde(skip)]
        pub values: Vec<f64>,
    }
}

impl Column {
    /// A column of that name (with its unit), unit and numbers.
    pub fn new(name: impl Into<String>, unit: impl Into<String>, values: Vec<f64>) -> Self {
        Column { name: name.into(), unit: unit.into(), values }
    }
}

record! {
    /// One account.
    pub struct Ledger {
        /// What is accounted for, such as `photons`.
        pub title: String,
        /// Its lines, in the order in which a person reads them.
        pub lines: Vec<LedgerLine>,
    }
}

record! {
    /// One line of an account.
    pub struct LedgerLine {
        /// The heading under which it stands, such as a layer.
        pub group: String,
        /// What it counts.
        pub label: String,
        /// How much; absent when it could not be checked or has no meaning.
        pub value: Option<f64>,
        /// Unit of the value.
        pub unit: String,
        /// Its share of the total, as a fraction.
        pub share: Option<f64>,
        /// A remark, such as `not independently checked`.
        pub note: String,
    }
}

record! {
    /// The device as it was solved.
    pub struct Stack {
        /// Name of the stack.
        pub name: String,
        /// Its layers, the front one first.
        pub layers: Vec<Layer>,
        /// Contacts, interfaces, temperature, statistics and optics of the whole.
        pub settings: Vec<Condition>,
    }
}

record! {
    /// One layer of the device.
    pub struct Layer {
        /// Name, unique in its stack.
        pub name: String,
        /// Material, with its composition.
        pub material: String,
        /// Thickness.
        pub thickness: Value,
        /// Doping as a person reads it.
        pub doping: String,
        /// Options given for this layer alone.
        pub settings: Vec<Condition>,
    }
}

record! {
    /// One material value that a solution used.
    pub struct MaterialValue {
        /// The layer that it was used in.
        pub layer: String,
        /// The material that it belongs to.
        pub material: String,
        /// The parameter.
        pub parameter: String,
        /// Its value.
        pub value: Value,
        /// Where it comes from: a citation, `from memory`, or the script.
        pub source: String,
        /// Valid range, illustrative, overridden and the like.
        pub note: String,
    }
}
