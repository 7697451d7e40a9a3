//! Blocks of points into bytes and back: numbers and errors as raw columns, everything else in the payload.
//!
//! A block is what one sync makes durable while a run lasts, and what one read opens of a finished archive.

use std::collections::{BTreeMap, VecDeque};

use serde::{Deserialize, Serialize};

use super::encoding::{Sections, decode, labelled_sections};
use super::error::ArchiveError;
use super::layout::{Digest, Kind};
use super::model::{Label, Status};
use super::sweep::{Cell, Point, PointOutput, SnapshotPlace, StoredPoint, SweepColumn, SweepStart};

/// Most points of a block.
pub(crate) const BLOCK_POINTS: usize = 1024;
/// Bytes of texts and snapshots' labels from which on a block takes no further point.
pub(crate) const BLOCK_BYTES: usize = 1 << 22;

record! {
    /// What is known of a block without reading its body.
    pub struct BlockLabel {
        /// Name of the sweep.
        pub sweep: String,
        /// Its step.
        pub step: u64,
        /// Index of its first point.
        pub first: u64,
        /// Index of its last point.
        pub last: u64,
        /// Number of its points.
        pub count: u64,
        /// How many of them failed.
        pub failed: u64,
    }
}

record! {
    /// Points of a sweep, by their index.
    pub struct PointBlock {
        /// The same as in the label of the frame.
        pub label: BlockLabel,
        /// The indices of its points in the plan, ascending. The row of a point is its place here.
        pub indices: Vec<u64>,
        /// The coordinates, in the plan's order.
        pub coordinates: Vec<PointColumn>,
        /// Everything that the points returned, by name and unit.
        pub outputs: Vec<PointColumn>,
        /// Every text of the block, once each, in the order of their first use; the numbers below count in it.
        pub texts: Vec<String>,
        /// The points that failed, by row, each with one text: the reason.
        pub failed: Vec<RowTexts>,
        /// The lines that points printed, by row.
        pub printed: Vec<RowTexts>,
        /// The warnings of points, by row.
        pub warnings: Vec<RowTexts>,
        /// The snapshots that points stored, by row, in the order of the script.
        pub snapshots: Vec<RowSnapshot>,
    }
}

record! {
    /// One column of a block.
    pub struct PointColumn {
        /// Its name.
        pub name: String,
        /// Its unit.
        pub unit: String,
        /// What each row holds: 0 the point has no such output, 1 a number, 2 a number with its error, 3 a text, 4 no,
        /// 5 yes, 6 nothing, with a text for the reason (empty where none is known).
        pub cells: Vec<u8>,
        /// Whether the number block holds a value for each row; NaN where the row holds no number.
        pub values: bool,
        /// Whether it holds an error for each row, after the values; NaN where the row holds none.
        pub errors: bool,
        /// The texts of the rows that hold 3 or 6, by row.
        pub texts: Vec<u32>,
    }
}

record! {
    /// Texts of a row.
    pub struct RowTexts {
        /// The row.
        pub row: u32,
        /// The texts.
        pub texts: Vec<u32>,
    }
}

record! {
    /// A snapshot that a point stored. Its frame stands before the block, after the block before it.
    pub struct RowSnapshot {
        /// The row of the point.
        pub row: u32,
        /// The same label as in its frame.
        pub label: Label,
        /// Where its frame begins.
        pub offset: u64,
        /// Length of its frame in bytes.
        pub length: u64,
        /// Digest of its frame header.
        pub header_digest: Digest,
    }
}

const NOT_THERE: u8 = 0;
const NUMBER: u8 = 1;
const WITH_ERROR: u8 = 2;
const TEXT: u8 = 3;
const NO: u8 = 4;
const YES: u8 = 5;
const ABSENT: u8 = 6;

/// Bytes that a point adds to a block beyond its columns, about: for closing a block early.
pub(crate) fn weight(point: &Point, labels: usize) -> usize {
    let cells = point.coordinates.iter().chain(point.outputs.iter().map(|output| &output.cell));
    let in_cells: usize = cells
        .map(|cell| match cell {
            Cell::Text(text) | Cell::Absent { reason: text } => text.len() + 8,
            Cell::Number { .. } | Cell::Flag(_) => 0,
        })
        .sum();
    let lines: usize = point.printed.iter().chain(&point.warnings).map(|line| line.len() + 16).sum();
    let reason = match &point.status {
        Status::Solved => 0,
        Status::Failed { reason } => reason.len(),
    };
    in_cells + lines + reason + labels
}

/// Texts, each kept once.
#[derive(Default)]
struct Texts<'a> {
    numbers: BTreeMap<&'a str, u32>,
    texts: Vec<String>,
}

impl<'a> Texts<'a> {
    fn number(&mut self, text: &'a str) -> u32 {
        // A block of 2^32 texts would be far beyond the limit of a payload.
        let next = self.texts.len() as u32;
        *self.numbers.entry(text).or_insert_with(|| {
            self.texts.push(text.to_owned());
            next
        })
    }
}

/// One column while it is filled.
struct Filling {
    column: PointColumn,
    values: Vec<f64>,
    errors: Vec<f64>,
}

impl Filling {
    fn new(name: &str, unit: &str, rows: usize) -> Self {
        let column = PointColumn {
            name: name.to_owned(),
            unit: unit.to_owned(),
            cells: vec![NOT_THERE; rows],
            ..PointColumn::default()
        };
        Filling { column, values: vec![f64::NAN; rows], errors: vec![f64::NAN; rows] }
    }

    fn set<'a>(&mut self, row: usize, cell: &'a Cell, texts: &mut Texts<'a>) {
        self.column.cells[row] = match cell {
            Cell::Number { value, error } => {
                self.values[row] = *value;
                self.column.values = true;
                match error {
                    Some(error) => {
                        self.errors[row] = *error;
                        self.column.errors = true;
                        WITH_ERROR
                    }
                    None => NUMBER,
                }
            }
            Cell::Text(text) => {
                self.column.texts.push(texts.number(text));
                TEXT
            }
            Cell::Flag(false) => NO,
            Cell::Flag(true) => YES,
            Cell::Absent { reason } => {
                self.column.texts.push(texts.number(reason));
                ABSENT
            }
        };
    }
}

/// The sections of a block of points with their snapshots already placed.
///
/// The points come in ascending order of index, each with as many coordinates as the sweep and its outputs ascending
/// by name.
pub(crate) fn block_sections(start: &SweepStart, points: &[StoredPoint]) -> Result<Sections, ArchiveError> {
    let rows = points.len();
    let bad = |index: u64, why: &str| ArchiveError::Encoding {
        what: format!("point {index} of the sweep `{}`", start.name),
        reason: why.to_owned(),
    };
    let mut texts = Texts::default();
    let mut coordinates: Vec<Filling> =
        start.coordinates.iter().map(|each| Filling::new(&each.name, &each.unit, rows)).collect();
    let mut outputs: BTreeMap<(&str, &str), Filling> = BTreeMap::new();
    let mut block = PointBlock::default();
    for (row, StoredPoint { point, snapshots }) in points.iter().enumerate() {
        if block.indices.last().is_some_and(|last| *last >= point.index) {
            return Err(bad(point.index, "it comes out of order"));
        }
        block.indices.push(point.index);
        if point.coordinates.len() != coordinates.len() {
            return Err(bad(point.index, "it has another number of coordinates than its plan"));
        }
        for (cell, filling) in point.coordinates.iter().zip(&mut coordinates) {
            filling.set(row, cell, &mut texts);
        }
        let mut before: Option<&str> = None;
        for PointOutput { column, cell } in &point.outputs {
            if before.is_some_and(|name| name >= column.name.as_str()) {
                return Err(bad(point.index, "its outputs are not ordered by name"));
            }
            before = Some(&column.name);
            let filling = outputs
                .entry((&column.name, &column.unit))
                .or_insert_with(|| Filling::new(&column.name, &column.unit, rows));
            filling.set(row, cell, &mut texts);
        }
        // At most BLOCK_POINTS rows.
        let row = row as u32;
        if let Status::Failed { reason } = &point.status {
            block.failed.push(RowTexts { row, texts: vec![texts.number(reason)] });
        }
        for (lines, into) in [(&point.printed, &mut block.printed), (&point.warnings, &mut block.warnings)] {
            if !lines.is_empty() {
                let texts = lines.iter().map(|line| texts.number(line)).collect();
                into.push(RowTexts { row, texts });
            }
        }
        block.snapshots.extend(snapshots.iter().map(|place| RowSnapshot {
            row,
            label: place.label.clone(),
            offset: place.offset,
            length: place.length,
            header_digest: place.header_digest,
        }));
    }
    block.label = BlockLabel {
        sweep: start.name.clone(),
        step: start.step,
        first: block.indices.first().copied().unwrap_or(0),
        last: block.indices.last().copied().unwrap_or(0),
        count: rows as u64,
        failed: block.failed.len() as u64,
    };
    block.texts = texts.texts;
    let mut numbers: Vec<f64> = Vec::new();
    for filling in coordinates.iter().chain(outputs.values()) {
        numbers.extend(filling.values.iter().filter(|_| filling.column.values));
        numbers.extend(filling.errors.iter().filter(|_| filling.column.errors));
    }
    block.coordinates = coordinates.into_iter().map(|filling| filling.column).collect();
    block.outputs = outputs.into_values().map(|filling| filling.column).collect();
    let what = format!("points of the sweep `{}`", start.name);
    let mut made = labelled_sections(Kind::Points, &what, &block.label, &block)?;
    made.push_numbers(&numbers);
    Ok(made)
}

/// A block that was read and checked.
#[derive(Debug)]
pub(crate) struct Block {
    raw: PointBlock,
    /// Of each coordinate, then of each output.
    numbers: Vec<Numbers>,
    size: usize,
}

/// The numbers of a column.
#[derive(Debug)]
struct Numbers {
    values: Vec<f64>,
    errors: Vec<f64>,
    /// How many texts stand before that of each row; empty where there are none.
    texts_before: Vec<u32>,
}

impl Block {
    /// The block in this payload and number block; nothing when they do not agree to the last entry.
    pub(crate) fn decode(payload: &[u8], numbers: &[u8]) -> Option<Block> {
        let raw: PointBlock = decode(payload, Kind::Points)?;
        let rows = raw.indices.len();
        let label = &raw.label;
        let labelled = label.count == rows as u64
            && label.failed == raw.failed.len() as u64
            && raw.indices.first() == Some(&label.first)
            && raw.indices.last() == Some(&label.last)
            && raw.indices.is_sorted_by(|a, b| a < b);
        let in_texts = |number: &u32| (*number as usize) < raw.texts.len();
        let by_row = |lists: &[RowTexts]| {
            lists.is_sorted_by(|a, b| a.row < b.row)
                && lists.iter().all(|each| (each.row as usize) < rows && each.texts.iter().all(in_texts))
        };
        let listed = by_row(&raw.failed)
            && raw.failed.iter().all(|each| each.texts.len() == 1)
            && by_row(&raw.printed)
            && by_row(&raw.warnings)
            && raw.snapshots.is_sorted_by_key(|each| each.row)
            && raw.snapshots.iter().all(|each| (each.row as usize) < rows);
        if !labelled || !listed {
            return None;
        }
        let mut rest = numbers;
        let mut columns = Vec::with_capacity(raw.coordinates.len() + raw.outputs.len());
        for (place, column) in raw.coordinates.iter().chain(&raw.outputs).enumerate() {
            let is_coordinate = place < raw.coordinates.len();
            let mut take = |wanted: bool| -> Option<Vec<f64>> {
                let (taken, after) = rest.split_at_checked(if wanted { rows.checked_mul(8)? } else { 0 })?;
                rest = after;
                Some(taken.as_chunks::<8>().0.iter().map(|bytes| f64::from_le_bytes(*bytes)).collect())
            };
            let (values, errors) = (take(column.values)?, take(column.errors)?);
            let holds = |tag: &u8| match *tag {
                NOT_THERE => !is_coordinate,
                NUMBER => column.values,
                WITH_ERROR => column.values && column.errors,
                tag => tag <= ABSENT,
            };
            let has_text = |tag: u8| tag == TEXT || tag == ABSENT;
            let texts = column.cells.iter().filter(|tag| has_text(**tag)).count();
            if column.cells.len() != rows
                || !column.cells.iter().all(holds)
                || column.texts.len() != texts
                || !column.texts.iter().all(in_texts)
            {
                return None;
            }
            let mut before = 0;
            let count = |tag: &u8| {
                let here = before;
                before += u32::from(has_text(*tag));
                here
            };
            let texts_before = if texts == 0 { Vec::new() } else { column.cells.iter().map(count).collect() };
            columns.push(Numbers { values, errors, texts_before });
        }
        let size = payload.len() + numbers.len();
        rest.is_empty().then_some(Block { raw, numbers: columns, size })
    }

    /// Its label.
    pub(crate) fn label(&self) -> &BlockLabel {
        &self.raw.label
    }

    /// The indices of its points, ascending.
    pub(crate) fn indices(&self) -> &[u64] {
        &self.raw.indices
    }

    /// Bytes that it takes in memory, about.
    pub(crate) fn size(&self) -> usize {
        self.size
    }

    /// Every snapshot that its points stored, with its row.
    pub(crate) fn snapshots(&self) -> &[RowSnapshot] {
        &self.raw.snapshots
    }

    /// The row of the point of that index.
    pub(crate) fn row(&self, index: u64) -> Option<usize> {
        self.raw.indices.binary_search(&index).ok()
    }

    /// The point of that row; the row is below the number of indices, or the point is empty.
    pub(crate) fn point(&self, row: usize) -> StoredPoint {
        let raw = &self.raw;
        let text = |number: &u32| raw.texts.get(*number as usize).cloned().unwrap_or_default();
        let cell = |place: usize, column: &PointColumn| -> Option<Cell> {
            let numbers = self.numbers.get(place)?;
            let number = |of: &[f64]| of.get(row).copied().unwrap_or(f64::NAN);
            let its_text = || {
                let at = numbers.texts_before.get(row).and_then(|before| column.texts.get(*before as usize));
                at.map(text).unwrap_or_default()
            };
            Some(match *column.cells.get(row)? {
                NUMBER => Cell::Number { value: number(&numbers.values), error: None },
                WITH_ERROR => {
                    Cell::Number { value: number(&numbers.values), error: Some(number(&numbers.errors)) }
                }
                TEXT => Cell::Text(its_text()),
                NO => Cell::Flag(false),
                YES => Cell::Flag(true),
                ABSENT => Cell::Absent { reason: its_text() },
                _ => return None,
            })
        };
        let of_row = |lists: &[RowTexts]| -> Vec<String> {
            let found = lists.binary_search_by_key(&row, |each| each.row as usize);
            found.map_or_else(|_| Vec::new(), |at| lists[at].texts.iter().map(text).collect())
        };
        let first = raw.coordinates.len();
        let outputs = raw.outputs.iter().enumerate().filter_map(|(place, column)| {
            let cell = cell(first + place, column)?;
            let column = SweepColumn { name: column.name.clone(), unit: column.unit.clone() };
            Some(PointOutput { column, cell })
        });
        let status = match of_row(&raw.failed).pop() {
            Some(reason) => Status::Failed { reason },
            None => Status::Solved,
        };
        let point = Point {
            index: raw.indices.get(row).copied().unwrap_or(0),
            coordinates: raw.coordinates.iter().enumerate().filter_map(|(i, c)| cell(i, c)).collect(),
            outputs: outputs.collect(),
            status,
            printed: of_row(&raw.printed),
            warnings: of_row(&raw.warnings),
            snapshots: Vec::new(),
        };
        let begin = raw.snapshots.partition_point(|each| (each.row as usize) < row);
        let snapshots = raw.snapshots[begin..]
            .iter()
            .take_while(|each| each.row as usize == row)
            .map(|each| SnapshotPlace {
                label: each.label.clone(),
                offset: each.offset,
                length: each.length,
                header_digest: each.header_digest,
            })
            .collect();
        StoredPoint { point, snapshots }
    }
}

/// Where a point stands: its index, the block and the row.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord)]
pub(crate) struct PointPlace {
    pub index: u64,
    pub block: u32,
    pub row: u32,
}

/// By index, each once: where a point came twice, the later block counts.
pub(crate) fn sort_places(places: &mut Vec<PointPlace>) {
    places.sort_unstable();
    let mut kept: usize = 0;
    for at in 0..places.len() {
        let last_of_its_index = places.get(at + 1).is_none_or(|next| next.index != places[at].index);
        if last_of_its_index {
            places[kept] = places[at];
            kept += 1;
        }
    }
    places.truncate(kept);
}

/// Blocks that were read lately, so that points which were done about the same time cost one reading.
#[derive(Debug, Default)]
pub(crate) struct BlockCache {
    held: VecDeque<(u32, Block)>,
    bytes: usize,
}

/// Bytes of blocks that are kept at once.
const CACHE_BYTES: usize = 96 << 20;

impl BlockCache {
    /// The block of that number, read with `read` where it is not held.
    pub(crate) fn get(
        &mut self,
        number: u32,
        read: impl FnOnce() -> Result<Block, ArchiveError>,
    ) -> Result<&Block, ArchiveError> {
        let entry = match self.held.iter().position(|(held, _)| *held == number) {
            // The block used last stands in front.
            Some(0) => None,
            Some(at) => self.held.remove(at),
            None => {
                let block = read()?;
                self.bytes += block.size();
                while self.bytes > CACHE_BYTES
                    && let Some((_, oldest)) = self.held.pop_back()
                {
                    self.bytes -= oldest.size();
                }
                Some((number, block))
            }
        };
        if let Some(entry) = entry {
            self.held.push_front(entry);
        }
        // Something was put in front, or stood there.
        self.held.front().map(|(_, block)| block).ok_or_else(|| ArchiveError::Encoding {
            what: "a block".to_owned(),
            reason: "it was not kept".to_owned(),
        })
    }
}
