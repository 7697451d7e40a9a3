//! The one place where a diagnostic becomes text.

use annotate_snippets::{AnnotationKind, Level, Origin, Renderer, Snippet};

use super::{Diagnostic, Severity, SourceText};

/// How messages are drawn.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct Look {
    /// With terminal colours.
    pub colour: bool,
    /// Columns of the terminal; long script lines are cut around the guilty place.
    pub width: usize,
}

impl Look {
    /// Without colour, 120 columns: files, pipes, tests.
    pub fn plain() -> Self {
        Look { colour: false, width: 120 }
    }
}

/// The diagnostic as a person reads it, ending in a line feed.
///
/// With a source and a label the script line is shown with carets under the guilty place; with a source alone its
/// name; without a source only the message. Control characters in names and messages are shown, never sent to the
/// terminal, since they may come from a foreign file.
pub fn render(diagnostic: &Diagnostic, source: Option<&SourceText>, look: Look) -> String {
    let level = match diagnostic.severity {
        Severity::Error => Level::ERROR,
        Severity::Warning => Level::WARNING,
    };
    let title = level.primary_title(visible(&diagnostic.message)).id(diagnostic.code.as_str());
    let path = source.map(|s| visible(&s.name));
    let text = source.map(|s| s.text.as_str()).unwrap_or_default();
    let mut group = match (&path, diagnostic.labels.is_empty()) {
        (Some(path), false) => {
            let annotations = diagnostic.labels.iter().enumerate().map(|(index, label)| {
                let kind = if index == 0 { AnnotationKind::Primary } else { AnnotationKind::Context };
                let span = label.span.within(text);
                let words = (!label.text.is_empty()).then(|| visible(&label.text));
                kind.span(span.start..span.end).label(words)
            });
            title.element(Snippet::source(text).path(path.as_str()).annotations(annotations))
        }
        (Some(path), true) => title.element(Origin::path(path.as_str())),
        (None, _) => title.elements(std::iter::empty::<Origin<'_>>()),
    };
    for note in &diagnostic.notes {
        group = group.element(Level::NOTE.message(visible(note)));
    }
    if let Some(help) = &diagnostic.help {
        group = group.element(Level::HELP.message(visible(help)));
    }
    let renderer = if look.colour { Renderer::styled() } else { Renderer::plain() };
    let mut drawn = renderer.term_width(look.width).render(&[group]);
    drawn.push('\n');
    drawn
}

/// `text` with control characters other than line feeds and tabs written out, `\u{1b}` for an escape.
pub fn visible(text: &str) -> String {
    let mut shown = String::with_capacity(text.len());
    for c in text.chars() {
        if c.is_control() && c != '\n' && c != '\t' {
            shown.extend(c.escape_default())
        } else {
            shown.push(c)
        }
    }
    shown
}
