//! Records into bytes and back: bincode in one fixed configuration, numbers as a raw block.
//!
//! Decoding is bounded: by the limit of the configuration, by the lengths of the sections (already
//! checked against the file), and by the absence of recursive types.

use bincode::config;
use serde::de::DeserializeOwned;
use serde::{Deserialize, Serialize};

use super::error::ArchiveError;
use super::layout::{Digest, Header, Kind, LABEL_LIMIT, digest};
use super::model::{Label, Snapshot};

record! {
    /// The index of a finished archive, in the order of the whole.
    pub struct Index {
        /// The snapshots, but those that the points of a sweep stored.
        pub entries: Vec<IndexEntry>,
        /// The sweeps.
        pub sweeps: Vec<SweepPlace>,
    }
}

/// The index in its schema 1, which knew no sweeps.
#[derive(Debug, Deserialize)]
pub(crate) struct FirstIndex {
    pub entries: Vec<IndexEntry>,
}

record! {
    /// Where one snapshot stands.
    pub struct IndexEntry {
        /// The same label as in its frame.
        pub label: Label,
        /// Where its frame begins.
        pub offset: u64,
        /// Length of its frame in bytes.
        pub length: u64,
        /// Digest of its frame header, which covers the digests of label and body.
        pub header_digest: Digest,
    }
}

record! {
    /// Where a sweep stands.
    pub struct SweepPlace {
        /// Its name.
        pub name: String,
        /// Its step.
        pub step: u64,
        /// Where the frame of its description begins.
        pub offset: u64,
        /// Length of that frame in bytes.
        pub length: u64,
        /// Digest of the header of that frame.
        pub header_digest: Digest,
        /// Its blocks of points, by index.
        pub blocks: Vec<BlockPlace>,
    }
}

record! {
    /// Where a block of points stands.
    pub struct BlockPlace {
        /// Index of its first point.
        pub first: u64,
        /// Index of its last point.
        pub last: u64,
        /// Number of its points.
        pub count: u64,
        /// How many of them failed.
        pub failed: u64,
        /// Where its frame begins.
        pub offset: u64,
        /// Length of its frame in bytes.
        pub length: u64,
        /// Digest of its frame header, which covers the digests of label and body.
        pub header_digest: Digest,
    }
}

/// The sections of a frame, padded, with their lengths before padding.
#[derive(Debug)]
pub(crate) struct Sections {
    kind: Kind,
    label: Vec<u8>,
    label_length: u32,
    /// Padded payload, then the number block.
    body: Vec<u8>,
    payload_length: u64,
    numbers: u64,
}

impl Sections {
    /// The header of these sections at that place in the file.
    pub(crate) fn header(&self, ordinal: u64, run: Digest) -> Header {
        Header {
            kind: self.kind.number(),
            schema: self.kind.schema(),
            label: self.label_length,
            payload: self.payload_length,
            numbers: self.numbers,
            ordinal,
            run,
            label_digest: digest(&self.label),
            body_digest: self.body_digest(),
        }
    }

    /// Digest of payload and numbers.
    pub(crate) fn body_digest(&self) -> Digest {
        digest(&self.body)
    }

    /// The whole frame with that header.
    pub(crate) fn frame(&self, header: &Header) -> Vec<u8> {
        [&header.to_bytes()[..], &self.label, &self.body].concat()
    }
}

fn too_large(what: impl Into<String>, bytes: usize, limit: usize) -> ArchiveError {
    ArchiveError::TooLarge { what: what.into(), bytes: bytes as u64, limit: limit as u64 }
}

fn encode<T: Serialize>(what: &str, value: &T, limit: usize) -> Result<Vec<u8>, ArchiveError> {
    let bytes = bincode::serde::encode_to_vec(value, config::legacy())
        .map_err(|error| ArchiveError::Encoding { what: what.to_owned(), reason: error.to_string() })?;
    if bytes.len() > limit { Err(too_large(what, bytes.len(), limit)) } else { Ok(bytes) }
}

impl Sections {
    /// Adds numbers to the number block.
    pub(crate) fn push_numbers(&mut self, numbers: &[f64]) {
        self.numbers += numbers.len() as u64;
        self.body.extend(numbers.iter().flat_map(|number| number.to_le_bytes()));
    }
}

fn pad(bytes: &mut Vec<u8>) {
    bytes.resize(bytes.len().next_multiple_of(8), 0);
}

/// The sections of a frame that holds this record and no numbers.
pub(crate) fn sections<T: Serialize>(kind: Kind, what: &str, value: &T) -> Result<Sections, ArchiveError> {
    let mut body = encode(what, value, kind.payload_limit())?;
    let payload_length = body.len() as u64;
    pad(&mut body);
    Ok(Sections { kind, label: Vec::new(), label_length: 0, body, payload_length, numbers: 0 })
}

/// The sections of a frame that holds this record under this label, with no numbers yet.
pub(crate) fn labelled_sections<L: Serialize, T: Serialize>(
    kind: Kind,
    what: &str,
    label: &L,
    value: &T,
) -> Result<Sections, ArchiveError> {
    let mut label = encode(&format!("the label of {what}"), label, LABEL_LIMIT)?;
    // At most LABEL_LIMIT, which is far below u32.
    let label_length = label.len() as u32;
    pad(&mut label);
    Ok(Sections { label, label_length, ..sections(kind, what, value)? })
}

/// The sections of the frame of a snapshot: label, payload, and the columns of all tables in order.
pub(crate) fn snapshot_sections(snapshot: &Snapshot) -> Result<Sections, ArchiveError> {
    let what = format!("snapshot `{}`", snapshot.name());
    let mut made = labelled_sections(Kind::Snapshot, &what, &snapshot.label, snapshot)?;
    for table in &snapshot.tables {
        for column in &table.columns {
            let found = column.values.len() as u64;
            if found != table.rows {
                return Err(ArchiveError::RaggedTable {
                    table: table.name.clone(),
                    column: column.name.clone(),
                    found,
                    expected: table.rows,
                });
            }
            made.push_numbers(&column.values);
        }
    }
    Ok(made)
}

/// The record in exactly these bytes; nothing when they hold anything else, or bytes are left over.
pub(crate) fn decode<T: DeserializeOwned>(bytes: &[u8], kind: Kind) -> Option<T> {
    let decoded = match kind {
        Kind::Run | Kind::Snapshot | Kind::Sweep | Kind::Points => bincode::serde::decode_from_slice(
            bytes,
            config::legacy().with_limit::<{ super::layout::PAYLOAD_LIMIT }>(),
        ),
        Kind::Index => bincode::serde::decode_from_slice(
            bytes,
            config::legacy().with_limit::<{ super::layout::INDEX_LIMIT }>(),
        ),
    };
    match decoded {
        Ok((value, used)) if used == bytes.len() => Some(value),
        _ => None,
    }
}

/// The label in exactly these bytes.
pub(crate) fn decode_label<T: DeserializeOwned>(bytes: &[u8]) -> Option<T> {
    match bincode::serde::decode_from_slice(bytes, config::legacy().with_limit::<LABEL_LIMIT>()) {
        Ok((value, used)) if used == bytes.len() => Some(value),
        _ => None,
    }
}

/// The snapshot in this payload and number block; nothing when they do not agree to the last number.
pub(crate) fn decode_snapshot(payload: &[u8], numbers: &[u8]) -> Option<Snapshot> {
    let mut snapshot: Snapshot = decode(payload, Kind::Snapshot)?;
    let mut rest = numbers;
    for table in &mut snapshot.tables {
        let length = usize::try_from(table.rows.checked_mul(8)?).ok()?;
        for column in &mut table.columns {
            let (block, after) = rest.split_at_checked(length)?;
            rest = after;
            column.values = block.as_chunks::<8>().0.iter().map(|bytes| f64::from_le_bytes(*bytes)).collect();
        }
    }
    rest.is_empty().then_some(snapshot)
}
