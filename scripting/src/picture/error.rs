//! What can be wrong with the wish for a picture.

use thiserror::Error;

use crate::diagnostics::suggest;

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
    #[error("{}", ending_text(.ending))]
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

fn ending_text(ending: &str) -> String {
    if ending.is_empty() {
        return "the name of a picture needs an ending".to_string();
    }
    format!("no picture ends in `.{ending}`")
}

fn reason_text(reason: &str) -> String {
    if reason.is_empty() { String::new() } else { format!(": {reason}") }
}

impl PictureError {
    /// What would serve; none where nothing can be said.
    pub fn help(&self) -> Option<String> {
        let list =
            |words: &[String]| words.iter().map(|word| format!("`{word}`")).collect::<Vec<_>>().join(", ");
        let words = |kinds: &[Kind]| kinds.iter().map(|kind| kind.word().to_string()).collect::<Vec<_>>();
        let near = |name: &str, known: &[String]| {
            suggest(name, known.iter().map(String::as_str)).map(|near| format!("did you mean `{near}`? "))
        };
        match self {
            PictureError::NoSuchChart { gives, .. } if !gives.is_empty() => {
                Some(format!("it gives {}", list(&words(gives))))
            }
            PictureError::UnknownChart { word } => {
                let known = words(Kind::ALL);
                let near = near(word, &known).unwrap_or_default();
                Some(format!("{near}there are {}", list(&known)))
            }
            PictureError::NoSuchColumn { column, columns, .. } => {
                let near = near(column, columns).unwrap_or_default();
                Some(format!("{near}it has {}", list(columns)))
            }
            PictureError::UnknownEnding { .. } => Some("end the name in .svg, .png or .pdf".to_string()),
            PictureError::Nothing { .. } => {
                Some("curves, responses, bias points and tables can be drawn".to_string())
            }
            PictureError::NotTogether { .. } => {
                Some("draw them one by one, or choose one --chart".to_string())
            }
            _ => None,
        }
    }
}
