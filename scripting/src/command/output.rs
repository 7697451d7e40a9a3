//! Where text goes: results to standard output, everything else to standard error, a progress line between them on a terminal.

use std::io::{self, IsTerminal, Write};
use std::time::Duration;

use indicatif::{ProgressBar, ProgressStyle};

use crate::diagnostics::{Diagnostic, Look, SourceText, codes, render, visible};

/// Both streams of a command.
#[derive(Debug)]
pub struct Output {
    look: Look,
    progress: ProgressBar,
    failed: Option<io::Error>,
}

impl Output {
    /// The streams of this process; colours only on a terminal and unless `NO_COLOR` is set.
    pub fn new() -> Self {
        let terminal = io::stderr().is_terminal();
        let colour = terminal && std::env::var_os("NO_COLOR").is_none_or(|value| value.is_empty());
        let width = console::Term::stderr()
            .size_checked()
            .map_or(Look::plain().width, |(_, columns)| usize::from(columns));
        Output {
            look: Look { colour, width: width.clamp(40, 200) },
            progress: ProgressBar::hidden(),
            failed: None,
        }
    }

    /// Shows a progress line from now on, if standard error is a terminal.
    pub fn show_progress(&mut self) {
        if io::stderr().is_terminal() {
            self.progress = ProgressBar::new_spinner();
            // the template is a constant that this version of the crate reads; without it its own look is used
            if let Ok(style) = ProgressStyle::with_template("{spinner} {msg}  {elapsed}  {pos} stored") {
                self.progress.set_style(style);
            }
            self.progress.enable_steady_tick(Duration::from_millis(120));
        }
    }

    /// What is being worked on.
    pub fn working(&mut self, what: &str) {
        self.progress.set_message(what.to_string());
    }

    /// One more result is stored.
    pub fn stored(&mut self) {
        self.progress.inc(1);
    }

    /// Takes the progress line away.
    pub fn end_progress(&mut self) {
        self.progress.finish_and_clear();
        self.progress = ProgressBar::hidden();
    }

    /// Prints a result. A reader that has gone away (`| head`) is no fault and stops nothing.
    ///
    /// Control characters are written out, never sent to the terminal: names may come from a foreign archive.
    pub fn result(&mut self, text: &str) {
        if self.failed.is_some() {
            return;
        }
        let text = visible(text);
        let written = self.progress.suspend(|| {
            let mut out = io::stdout().lock();
            out.write_all(text.as_bytes()).and_then(|()| out.flush())
        });
        self.failed = written.err();
    }

    /// Prints a remark about the run itself.
    pub fn remark(&mut self, text: &str) {
        // nothing is left to tell a person with when standard error is gone
        self.progress.suspend(|| {
            let _ = writeln!(io::stderr().lock(), "{text}");
        });
    }

    /// Prints a diagnostic.
    pub fn diagnostic(&mut self, diagnostic: &Diagnostic, source: Option<&SourceText>) {
        let text = render(diagnostic, source, self.look);
        self.progress.suspend(|| {
            // a blank line sets messages apart
            let _ = writeln!(io::stderr().lock(), "{text}");
        });
    }

    /// Columns of the terminal, 120 where there is none.
    pub fn width(&self) -> usize {
        self.look.width
    }

    /// What kept results from being printed, if anything but a reader that has gone away.
    pub fn failure(&self) -> Option<Diagnostic> {
        let error = self.failed.as_ref().filter(|e| e.kind() != io::ErrorKind::BrokenPipe)?;
        Some(Diagnostic::new(codes::UNWRITABLE, format!("standard output cannot be written: {error}")))
    }
}
