//! Faults and warnings of archives as diagnostics.

use crate::archive::{ArchiveError, ArchiveWarning};
use crate::diagnostics::{Code, Diagnostic, codes};
use crate::picture::PictureError;

/// An archive's fault for a person.
pub fn archive_error(error: &ArchiveError) -> Diagnostic {
    let code = match error {
        ArchiveError::Io { action: "open" | "read", .. } => codes::UNREADABLE,
        ArchiveError::Foreign { .. } => codes::NOT_AN_ARCHIVE,
        ArchiveError::Newer { .. } => codes::NEWER_ARCHIVE,
        ArchiveError::NoWholeFrame { .. } => codes::TORN_ARCHIVE,
        ArchiveError::DamagedStart { .. }
        | ArchiveError::DamagedSnapshot { .. }
        | ArchiveError::DamagedPoints { .. }
        | ArchiveError::DamagedRun => codes::DAMAGED_FRAME,
        ArchiveError::NoSuchSnapshot { .. }
        | ArchiveError::NoSuchIndex { .. }
        | ArchiveError::NoSuchSweep { .. }
        | ArchiveError::NoSuchPoint { .. } => codes::UNKNOWN_SNAPSHOT,
        ArchiveError::HeldByAnotherRun { .. } => codes::BUSY,
        ArchiveError::NameTaken { .. } => codes::SNAPSHOT_TWICE,
        ArchiveError::RaggedTable { .. } | ArchiveError::Encoding { .. } => codes::INTERNAL,
        _ => codes::UNWRITABLE,
    };
    diagnostic(code, error.to_string(), error.help())
}

/// A fault of writing an archive for a person.
pub fn writing_error(error: &ArchiveError) -> Diagnostic {
    match error {
        ArchiveError::Io { .. } => diagnostic(codes::UNWRITABLE, error.to_string(), error.help()),
        _ => archive_error(error),
    }
}

/// Damage that was found by reading, which is an error for whoever wants that part.
pub fn damage(warning: &ArchiveWarning) -> Diagnostic {
    diagnostic(codes::DAMAGED_FRAME, warning.to_string(), None)
}

/// Why there is no picture, for a person.
pub fn picture_error(error: &PictureError) -> Diagnostic {
    let code = match error {
        PictureError::Conversion { .. } => codes::INTERNAL,
        _ => codes::NO_PICTURE,
    };
    let diagnostic = Diagnostic::new(code, error.to_string());
    match error.help() {
        Some(help) => diagnostic.help(help),
        None => diagnostic,
    }
}

/// An archive's warning for a person.
pub fn archive_warning(warning: &ArchiveWarning) -> Diagnostic {
    let code = match warning {
        ArchiveWarning::NotFinished { .. } => codes::UNFINISHED,
        ArchiveWarning::TornTail { .. } => codes::TORN,
        _ => codes::DAMAGED,
    };
    diagnostic(code, warning.to_string(), None)
}

fn diagnostic(code: Code, message: String, help: Option<String>) -> Diagnostic {
    let diagnostic = Diagnostic::new(code, message);
    match help {
        Some(help) => diagnostic.help(help),
        None => diagnostic,
    }
}
