//! What can be wrong with the wish for a picture.

use thiserror::Error;

use super::chart::Kind;

/// Why there is no picture.
#[derive(Clone, Debug, PartialEq, Error)]
#[non_exhaustive]
pub enum PictureError {
    /// The snapshot has other data.
    #[error("the snapshot `{snapshot}` ({of}) gives no chart `{}`{}", .wanted.word(), reason_text(.reason))]
    NoSuchChart {
        /// The snapshot.
        snapshot: String,
        /// What it is.
        of: String,
        /// What was asked for.
        wanted: Kind,
        /// Why not, where there is more to say.
        reason: String,
        /// What it gives.
        gives: Vec<Kind>,
    },
    /// The snapshot gives no chart at all.
    #[error("the snapshot `{snapshot}` ({of}) holds nothing to draw{}", reason_text(.reason))]
    Nothing {
        /// The snapshot.
        snapshot: String,
        /// What it is.
        of: String,
        /// Why, where there is more to say.
        reason: String,
    },
    /// No kind of chart has that word.
    #[error("no chart is called `{word}`")]
    UnknownChart {
        /// The word.
        word: String,
    },
    /// The table has no such column.
    #[error("the snapshot `{snapshot}` has no column `{column}`")]
    NoSuchColumn {
        /// The snapshot.
        snapshot: String,
        /// The column asked for.
        column: String,
        /// The columns that it has.
        columns: Vec<String>,
    },
    /// Charts that cannot be laid over each other.
    #[error("`{first}` and `{second}` cannot be laid over each other: {reason}")]
    NotTogether {
        /// A snapshot.
        first: String,
        /// Another.
        second: String,
        /// Why not.
        reason: String,
    },
    /// A range or scale that the data cannot have.
    #[error("{what}: {reason}")]
    BadAxis {
        /// Which axis, such as `the vertical axis`.
        what: String,
        /// Why not.
        reason: String,
    },
    /// No format has that ending.
    #[error("a picture ends in .svg, .png or .pdf, not in `{ending}`")]
    UnknownEnding {
        /// The ending; empty when the name has none.
        ending: String,
    },
    /// The drawing could not be turned into that format.
    #[error("the picture cannot be made as {format}: {reason}")]
    Conversion {
        /// The format.
        format: &'static str,
        /// Why not.
        reason: String,
    },
}

fn reason_text(reason: &str) -> String {
    if reason.is_empty() { String::new() } else { format!(": {reason}") }
}

impl PictureError {
    /// What would serve, by name, for suggestions; empty where nothing can be listed.
    pub fn candidates(&self) -> Vec<String> {
        let words = |kinds: &[Kind]| kinds.iter().map(|kind| kind.word().to_string()).collect();
        match self {
            PictureError::NoSuchChart { gives, .. } => words(gives),
            PictureError::UnknownChart { .. } => words(Kind::ALL),
            PictureError::NoSuchColumn { columns, .. } => columns.clone(),
            _ => Vec::new(),
        }
    }

    /// The name that was asked for and is not there, if that is what is wrong.
    pub fn wanted(&self) -> Option<&str> {
        match self {
            PictureError::NoSuchChart { wanted, .. } => Some(wanted.word()),
            PictureError::UnknownChart { word } => Some(word),
            PictureError::NoSuchColumn { column, .. } => Some(column),
            _ => None,
        }
    }
}
