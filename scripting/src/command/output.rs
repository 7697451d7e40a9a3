//! Where text goes: results to standard output, everything else to standard error, a progress line between them on a terminal.

use std::io::{self, IsTerminal, Write};
use std::time::{Duration, Instant};

use indicatif::{ProgressBar, ProgressStyle};

use crate::diagnostics::{Diagnostic, Look, SourceText, codes, render, visible};

/// Both streams of a command.
#[derive(Debug)]
pub struct Output {
    look: Look,
    progress: ProgressBar,
    failed: Option<io::Error>,
    /// Whether a person, or a log, is told how far the work is.
    following: bool,
    log_every: Duration,
    sweep: Option<Followed>,
}

/// A sweep that is going on.
#[derive(Debug)]
struct Followed {
    name: String,
    total: u64,
    /// Points that were stored before.
    found: u64,
    began: Instant,
    told: Instant,
}

/// Seconds between two lines of progress in a log.
pub const LOG_EVERY: u64 = 30;

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
            following: false,
            log_every: Duration::from_secs(LOG_EVERY),
            sweep: None,
        }
    }

    /// Shows a progress line from now on, if standard error is a terminal; a line of a log now and then otherwise.
    pub fn show_progress(&mut self) {
        self.following = true;
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

    /// Writes a line of progress into a log after each such time.
    pub fn log_every(&mut self, time: Duration) {
        self.log_every = time;
    }

    /// A sweep of that many points begins, some of which were stored before.
    pub fn sweep_begins(&mut self, name: &str, total: u64, found: u64) {
        if !self.following {
            return;
        }
        let now = Instant::now();
        self.sweep = Some(Followed { name: name.to_string(), total, found, began: now, told: now });
        if io::stderr().is_terminal() {
            self.progress.finish_and_clear();
            self.progress = ProgressBar::new(total);
            let template = "{prefix} {wide_bar} {pos} of {len} points  {per_sec}  {eta} left{msg}";
            // a constant that this version of the crate reads; without it its own look is used
            if let Ok(style) = ProgressStyle::with_template(template) {
                self.progress.set_style(style);
            }
            self.progress.set_prefix(name.to_string());
            self.progress.set_position(found);
            self.progress.reset_eta();
            self.progress.enable_steady_tick(Duration::from_millis(250));
        }
    }

    /// So many points of the sweep are done and stored, and so many of them failed.
    pub fn sweep_goes_on(&mut self, done: u64, failed: u64) {
        let Some(sweep) = &mut self.sweep else { return };
        if !self.progress.is_hidden() {
            self.progress.set_position(done);
            if failed > 0 {
                self.progress.set_message(format!("  {failed} failed"));
            }
        }
        if io::stderr().is_terminal() || sweep.told.elapsed() < self.log_every {
            return;
        }
        sweep.told = Instant::now();
        let line = log_line(sweep, done, failed, sweep.began.elapsed().as_secs_f64());
        self.remark(&line);
    }

    /// The sweep is done.
    pub fn sweep_ends(&mut self) {
        self.sweep = None;
        self.progress.finish_and_clear();
        self.progress = ProgressBar::hidden();
        if self.following {
            self.show_progress();
        }
    }

    /// Takes the progress line away.
    pub fn end_progress(&mut self) {
        self.following = false;
        self.sweep = None;
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

/// How far a sweep is, after so many seconds of this run.
fn log_line(sweep: &Followed, done: u64, failed: u64, seconds: f64) -> String {
    let rate = done.saturating_sub(sweep.found) as f64 / seconds.max(1e-9);
    let mut line = format!("sweep `{}`: {done} of {} points", sweep.name, sweep.total);
    if failed > 0 {
        line.push_str(&format!(", {failed} failed"));
    }
    if rate > 0.0 {
        let left = sweep.total.saturating_sub(done) as f64 / rate;
        line.push_str(&format!(
            ", {} a second, about {} left",
            crate::figure_text::significant(rate, 2),
            span(left)
        ));
    }
    line
}

/// A time as a person says it.
fn span(seconds: f64) -> String {
    match seconds {
        s if s < 99.5 => format!("{s:.0} s"),
        s if s < 5970.0 => format!("{:.0} min", s / 60.0),
        s if s < 172_800.0 => format!("{:.1} h", s / 3600.0),
        s => format!("{:.1} days", s / 86400.0),
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    /// Source of truth: rate and time left worked out by hand; what was stored before does not count as speed.
    #[test]
    fn a_log_tells_rate_time_left_and_failures() {
        let now = Instant::now();
        let sweep = Followed { name: "map".to_string(), total: 1000, found: 400, began: now, told: now };
        assert_eq!(
            log_line(&sweep, 500, 3, 50.0),
            "sweep `map`: 500 of 1000 points, 3 failed, 2 a second, about 4 min left"
        );
        assert_eq!(log_line(&sweep, 400, 0, 50.0), "sweep `map`: 400 of 1000 points");
        assert_eq!(
            [span(2.0), span(600.0), span(7200.0), span(200_000.0)],
            ["2 s", "10 min", "2.0 h", "2.3 days"]
        );
    }
}
