//! The bytes around the payloads: the start of the file, the frame header, the footer.
//!
//! `FORMAT.md` is written from the constants here. Every number is little-endian. Every section has a
//! digest of its own, the header's included, so that a wrong length is seen as damage before it is used.

/// First eight bytes of every archive.
pub(crate) const MAGIC: [u8; 8] = *b"\xE7piloom\x1A";
/// First eight bytes of every frame.
pub(crate) const FRAME_MAGIC: [u8; 8] = *b"\xE7frame\r\n";
/// First eight bytes of the footer of a finished archive.
pub(crate) const FOOTER_MAGIC: [u8; 8] = *b"\xE7whole\r\n";
/// Version of the container: the start, the frame header and the footer.
pub(crate) const CONTAINER_VERSION: u32 = 1;
/// Length of the start of the file.
pub(crate) const START_LENGTH: usize = 32;
/// Length of a frame header.
pub(crate) const HEADER_LENGTH: usize = 104;
/// Length of the footer.
pub(crate) const FOOTER_LENGTH: usize = 64;
/// Length of a digest: the first bytes of a BLAKE3 hash.
pub(crate) const DIGEST_LENGTH: usize = 16;
/// Longest label in bytes.
pub(crate) const LABEL_LIMIT: usize = 1 << 16;
/// Longest payload of a run or a snapshot in bytes.
pub(crate) const PAYLOAD_LIMIT: usize = 1 << 26;
/// Longest payload of an index in bytes.
pub(crate) const INDEX_LIMIT: usize = 1 << 28;

/// The first 16 bytes of a BLAKE3 hash.
pub(crate) type Digest = [u8; DIGEST_LENGTH];

/// The digest of these bytes.
pub(crate) fn digest(bytes: &[u8]) -> Digest {
    truncated(&blake3::hash(bytes))
}

/// The first bytes of a full hash.
pub(crate) fn truncated(hash: &blake3::Hash) -> Digest {
    bytes_at(hash.as_bytes(), 0)
}

/// `length` rounded up to a multiple of eight.
pub(crate) fn padded(length: u64) -> Option<u64> {
    length.checked_add(7).map(|sum| sum & !7)
}

/// The `N` bytes at a constant offset; zero where the slice is too short, which no caller's is.
fn bytes_at<const N: usize>(bytes: &[u8], offset: usize) -> [u8; N] {
    let mut out = [0; N];
    if let Some(found) = bytes.get(offset..offset + N) {
        out.copy_from_slice(found);
    }
    out
}

/// What a frame holds.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(crate) enum Kind {
    /// The description of the run.
    Run,
    /// One snapshot.
    Snapshot,
    /// The index of a finished archive.
    Index,
    /// The description of a sweep.
    Sweep,
    /// A block of points of a sweep.
    Points,
}

impl Kind {
    /// Every kind, in the order of its number.
    pub(crate) const ALL: [Kind; 5] = [Kind::Run, Kind::Snapshot, Kind::Index, Kind::Sweep, Kind::Points];

    /// The number in the frame header.
    pub(crate) fn number(self) -> u16 {
        match self {
            Kind::Run => 1,
            Kind::Snapshot => 2,
            Kind::Index => 3,
            Kind::Sweep => 4,
            Kind::Points => 5,
        }
    }

    /// The schema that this program writes, and the highest that it reads.
    pub(crate) fn schema(self) -> u16 {
        match self {
            Kind::Run | Kind::Snapshot | Kind::Sweep | Kind::Points => 1,
            Kind::Index => 2,
        }
    }

    /// The longest payload of this kind.
    pub(crate) fn payload_limit(self) -> usize {
        match self {
            Kind::Run | Kind::Snapshot | Kind::Sweep | Kind::Points => PAYLOAD_LIMIT,
            Kind::Index => INDEX_LIMIT,
        }
    }

    /// The kind of that number.
    pub(crate) fn from_number(number: u16) -> Option<Kind> {
        Kind::ALL.into_iter().find(|kind| kind.number() == number)
    }
}

/// Where each field of the start of the file begins.
pub(crate) mod start {
    /// The magic.
    pub(crate) const MAGIC: usize = 0;
    /// The container version, u32.
    pub(crate) const VERSION: usize = 8;
    /// Four zero bytes.
    pub(crate) const ZERO: usize = 12;
    /// Digest of all bytes before it.
    pub(crate) const DIGEST: usize = 16;
}

/// The start of a file.
pub(crate) fn start_bytes() -> [u8; START_LENGTH] {
    let mut out = [0; START_LENGTH];
    out[start::MAGIC..start::VERSION].copy_from_slice(&MAGIC);
    out[start::VERSION..start::ZERO].copy_from_slice(&CONTAINER_VERSION.to_le_bytes());
    let sum = digest(&out[..start::DIGEST]);
    out[start::DIGEST..].copy_from_slice(&sum);
    out
}

/// The container version that a start names, or nothing when it is damaged.
pub(crate) fn start_version(bytes: &[u8; START_LENGTH]) -> Option<u32> {
    let whole = digest(&bytes[..start::DIGEST]) == bytes[start::DIGEST..];
    whole.then(|| u32::from_le_bytes(bytes_at(bytes, start::VERSION)))
}

/// Where each field of a frame header begins.
pub(crate) mod header {
    /// The magic.
    pub(crate) const MAGIC: usize = 0;
    /// The kind, u16.
    pub(crate) const KIND: usize = 8;
    /// The schema of the payload, u16.
    pub(crate) const SCHEMA: usize = 10;
    /// Length of the label without padding, u32.
    pub(crate) const LABEL: usize = 12;
    /// Length of the payload without padding, u64.
    pub(crate) const PAYLOAD: usize = 16;
    /// Count of numbers in the number block, u64.
    pub(crate) const NUMBERS: usize = 24;
    /// Number of the frame in the file, u64.
    pub(crate) const ORDINAL: usize = 32;
    /// The run that the frame belongs to.
    pub(crate) const RUN: usize = 40;
    /// Digest of the padded label.
    pub(crate) const LABEL_DIGEST: usize = 56;
    /// Digest of the padded payload and the number block.
    pub(crate) const BODY_DIGEST: usize = 72;
    /// Digest of all header bytes before it.
    pub(crate) const DIGEST: usize = 88;
}

/// A frame header.
#[derive(Clone, Debug, PartialEq, Eq)]
pub(crate) struct Header {
    /// The number of the kind; it may be one that this program does not know.
    pub kind: u16,
    /// The schema of the payload.
    pub schema: u16,
    /// Length of the label without padding.
    pub label: u32,
    /// Length of the payload without padding.
    pub payload: u64,
    /// Count of numbers in the number block.
    pub numbers: u64,
    /// Number of the frame in the file, from 0.
    pub ordinal: u64,
    /// The run: the body digest of its first frame.
    pub run: Digest,
    /// Digest of the padded label.
    pub label_digest: Digest,
    /// Digest of the padded payload and the number block.
    pub body_digest: Digest,
}

impl Header {
    /// The header as it stands in the file, its own digest included.
    pub(crate) fn to_bytes(&self) -> [u8; HEADER_LENGTH] {
        let mut out = [0; HEADER_LENGTH];
        out[header::MAGIC..header::KIND].copy_from_slice(&FRAME_MAGIC);
        out[header::KIND..header::SCHEMA].copy_from_slice(&self.kind.to_le_bytes());
        out[header::SCHEMA..header::LABEL].copy_from_slice(&self.schema.to_le_bytes());
        out[header::LABEL..header::PAYLOAD].copy_from_slice(&self.label.to_le_bytes());
        out[header::PAYLOAD..header::NUMBERS].copy_from_slice(&self.payload.to_le_bytes());
        out[header::NUMBERS..header::ORDINAL].copy_from_slice(&self.numbers.to_le_bytes());
        out[header::ORDINAL..header::RUN].copy_from_slice(&self.ordinal.to_le_bytes());
        out[header::RUN..header::LABEL_DIGEST].copy_from_slice(&self.run);
        out[header::LABEL_DIGEST..header::BODY_DIGEST].copy_from_slice(&self.label_digest);
        out[header::BODY_DIGEST..header::DIGEST].copy_from_slice(&self.body_digest);
        let sum = digest(&out[..header::DIGEST]);
        out[header::DIGEST..].copy_from_slice(&sum);
        out
    }

    /// The header in these bytes, or nothing when they are not an undamaged header.
    pub(crate) fn from_bytes(bytes: &[u8; HEADER_LENGTH]) -> Option<Header> {
        if bytes[..header::KIND] != FRAME_MAGIC || digest(&bytes[..header::DIGEST]) != bytes[header::DIGEST..]
        {
            return None;
        }
        Some(Header {
            kind: u16::from_le_bytes(bytes_at(bytes, header::KIND)),
            schema: u16::from_le_bytes(bytes_at(bytes, header::SCHEMA)),
            label: u32::from_le_bytes(bytes_at(bytes, header::LABEL)),
            payload: u64::from_le_bytes(bytes_at(bytes, header::PAYLOAD)),
            numbers: u64::from_le_bytes(bytes_at(bytes, header::NUMBERS)),
            ordinal: u64::from_le_bytes(bytes_at(bytes, header::ORDINAL)),
            run: bytes_at(bytes, header::RUN),
            label_digest: bytes_at(bytes, header::LABEL_DIGEST),
            body_digest: bytes_at(bytes, header::BODY_DIGEST),
        })
    }

    /// The digest of the header, which names this very frame: it covers the digests of all its parts.
    pub(crate) fn own_digest(&self) -> Digest {
        bytes_at(&self.to_bytes(), header::DIGEST)
    }

    /// Length of the padded label.
    pub(crate) fn label_length(&self) -> u64 {
        u64::from(self.label).next_multiple_of(8)
    }

    /// Length of the padded payload and the number block; nothing when it overflows.
    pub(crate) fn body_length(&self) -> Option<u64> {
        padded(self.payload)?.checked_add(self.numbers.checked_mul(8)?)
    }

    /// Length of the whole frame; nothing when it overflows.
    pub(crate) fn frame_length(&self) -> Option<u64> {
        (HEADER_LENGTH as u64 + self.label_length()).checked_add(self.body_length()?)
    }
}

/// Where each field of the footer begins.
pub(crate) mod footer {
    /// The magic.
    pub(crate) const MAGIC: usize = 0;
    /// Where the index frame begins, u64.
    pub(crate) const INDEX: usize = 8;
    /// Length of the whole file, footer included, u64.
    pub(crate) const LENGTH: usize = 16;
    /// Number of snapshots, u64.
    pub(crate) const SNAPSHOTS: usize = 24;
    /// Digest of the header of the index frame, which covers the index.
    pub(crate) const INDEX_DIGEST: usize = 32;
    /// Digest of all footer bytes before it.
    pub(crate) const DIGEST: usize = 48;
}

/// The end of a finished archive.
#[derive(Clone, Debug, PartialEq, Eq)]
pub(crate) struct Footer {
    /// Where the index frame begins.
    pub index: u64,
    /// Length of the whole file.
    pub length: u64,
    /// Number of snapshots.
    pub snapshots: u64,
    /// Digest of the header of the index frame.
    pub index_digest: Digest,
}

impl Footer {
    /// The footer as it stands in the file.
    pub(crate) fn to_bytes(&self) -> [u8; FOOTER_LENGTH] {
        let mut out = [0; FOOTER_LENGTH];
        out[footer::MAGIC..footer::INDEX].copy_from_slice(&FOOTER_MAGIC);
        out[footer::INDEX..footer::LENGTH].copy_from_slice(&self.index.to_le_bytes());
        out[footer::LENGTH..footer::SNAPSHOTS].copy_from_slice(&self.length.to_le_bytes());
        out[footer::SNAPSHOTS..footer::INDEX_DIGEST].copy_from_slice(&self.snapshots.to_le_bytes());
        out[footer::INDEX_DIGEST..footer::DIGEST].copy_from_slice(&self.index_digest);
        let sum = digest(&out[..footer::DIGEST]);
        out[footer::DIGEST..].copy_from_slice(&sum);
        out
    }

    /// The footer in these bytes, or nothing when they are not an undamaged footer.
    pub(crate) fn from_bytes(bytes: &[u8; FOOTER_LENGTH]) -> Option<Footer> {
        if bytes[..footer::INDEX] != FOOTER_MAGIC
            || digest(&bytes[..footer::DIGEST]) != bytes[footer::DIGEST..]
        {
            return None;
        }
        Some(Footer {
            index: u64::from_le_bytes(bytes_at(bytes, footer::INDEX)),
            length: u64::from_le_bytes(bytes_at(bytes, footer::LENGTH)),
            snapshots: u64::from_le_bytes(bytes_at(bytes, footer::SNAPSHOTS)),
            index_digest: bytes_at(bytes, footer::INDEX_DIGEST),
        })
    }
}
