//! What a person is told: faults and warnings with a place in the script, a stable code and a way to mend, rendered once.

mod catalogue;
mod render;
mod source;
mod suggest;

use std::fmt;

pub use catalogue::{Code, Entry, codes, entries, explain};
pub use render::{Look, render, visible};
pub use source::{SourceText, Span};
pub use suggest::{near, suggest};

/// How grave a message is.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord)]
pub enum Severity {
    /// Something to know; the work goes on.
    Warning,
    /// Something that must be mended.
    Error,
}

impl Severity {
    /// The word printed for it.
    pub fn word(self) -> &'static str {
        match self {
            Severity::Warning => "warning",
            Severity::Error => "error",
        }
    }
}

/// A place in the script with a few words about it.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Label {
    /// The place.
    pub span: Span,
    /// What is there ("this is -50 nm"); empty for a bare caret.
    pub text: String,
}

/// One message to a person: what is wrong, where, and how to mend it.
///
/// `message` is a lower-case phrase without a full stop. The first label is the guilty place; further labels point
/// at what it conflicts with. `help` is true and can be typed.
///
/// ```
/// use epiloom::diagnostics::{Diagnostic, Look, SourceText, Span, codes, render};
///
/// let script = SourceText::new("cell.rhai", "let t = 150;\nlayer(\"emitter\", gaas, (t - 200).nm)\n");
/// let fault = Diagnostic::new(codes::THICKNESS_NOT_POSITIVE, "thickness of layer `emitter` must be positive")
///     .label(Span::at(&script.text, 2, 24, Some(12)), "this is -50 nm")
///     .help("leave the layer out of the stack when it is not there");
/// assert!(render(&fault, Some(&script), Look::plain()).contains("^^^^^^^^^^^^ this is -50 nm"));
/// ```
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Diagnostic {
    /// How grave it is.
    pub severity: Severity,
    /// The stable code, with a page in the catalogue.
    pub code: Code,
    /// What is wrong, a lower-case phrase.
    pub message: String,
    /// Where, the guilty place first.
    pub labels: Vec<Label>,
    /// Facts that help to understand it.
    pub notes: Vec<String>,
    /// How to mend it.
    pub help: Option<String>,
}

impl Diagnostic {
    /// A message of this code; codes that begin with W are warnings, all others errors.
    pub fn new(code: Code, message: impl Into<String>) -> Self {
        Diagnostic {
            severity: code.severity(),
            code,
            message: message.into(),
            labels: Vec::new(),
            notes: Vec::new(),
            help: None,
        }
    }

    /// The same with one more place.
    pub fn label(mut self, span: Span, text: impl Into<String>) -> Self {
        self.labels.push(Label { span, text: text.into() });
        self
    }

    /// The same with one more fact.
    pub fn note(mut self, text: impl Into<String>) -> Self {
        self.notes.push(text.into());
        self
    }

    /// The same with this way to mend it.
    pub fn help(mut self, text: impl Into<String>) -> Self {
        self.help = Some(text.into());
        self
    }

    /// The same with the near name of `name` among `candidates` as its help, if there is one and no help stands yet.
    pub fn suggest<'a>(mut self, name: &str, candidates: impl IntoIterator<Item = &'a str>) -> Self {
        if self.help.is_none() {
            self.help = suggest(name, candidates).map(|near| format!("did you mean `{near}`?"));
        }
        self
    }

    /// The guilty place, if it is known.
    pub fn span(&self) -> Option<Span> {
        self.labels.first().map(|label| label.span)
    }
}

/// The message on one line: `error[E210]: thickness of layer `emitter` must be positive`.
impl fmt::Display for Diagnostic {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        write!(f, "{}[{}]: {}", self.severity.word(), self.code, self.message)
    }
}

impl std::error::Error for Diagnostic {}

#[cfg(test)]
mod tests;
