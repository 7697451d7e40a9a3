//! `epiloom report`: an archive as one page that stands alone.

use std::path::{Path, PathBuf};

use crate::archive::export::write_whole;
use crate::diagnostics::{Diagnostic, codes};
use crate::picture::report::{Contents, Options, page};

use super::exit::Exit;
use super::output::Output;
use super::show::{condition, open, tell};

/// `epiloom report FILE -o report.html`.
#[derive(clap::Args, Debug)]
#[command(after_help = "\
The page is one file that any browser of 2023 or later opens, from a mail too: script, inputs, every snapshot with its
plots, tables and ledgers, materials with their sources, warnings, numerical errors, and how to replay. It asks nothing
of any network. So that it stays under 2 MB, long tables of large archives lose rows: extremes and interfaces stay, no
number is changed, and the page says how many rows it holds. A file at PATH is replaced.")]
pub struct Report {
    /// The archive
    #[arg(value_hint = clap::ValueHint::FilePath)]
    pub file: PathBuf,
    /// The page to write [default: the archive's name with .html, in the current folder]
    #[arg(short, long, value_name = "PATH")]
    pub out: Option<PathBuf>,
    /// Keep every row, however large the page becomes
    #[arg(long)]
    pub all_rows: bool,
}

impl Report {
    /// Writes the page.
    pub fn run(&self, output: &mut Output) -> Exit {
        let archive = match open(&self.file, output) {
            Ok(archive) => archive,
            Err(exit) => return exit,
        };
        let path = self.out.clone().unwrap_or_else(|| page_path(&self.file));
        if same_file(&path, &self.file) {
            let fault =
                Diagnostic::new(codes::OTHER_ARCHIVE, format!("`{}` is the archive itself", path.display()));
            output.diagnostic(&fault.help("give the page another name, `-o report.html`"), None);
            return Exit::File;
        }
        let contents = Contents::of(&archive, &file_name(&self.file));
        let damage: Vec<String> = contents.damage().into_iter().map(str::to_string).collect();
        for reason in &damage {
            output.remark(&format!("left out of the page: {reason}"));
        }
        let mut options = Options::default();
        if self.all_rows {
            options.size = None;
        }
        let made = page(&contents, options);
        if let Some(rows) = made.rows.filter(|_| made.thinned > 0) {
            let tables = if made.thinned == 1 {
                "1 table has".to_string()
            } else {
                format!("{} tables have", made.thinned)
            };
            output.remark(&format!(
                "{tables} at most about {rows} of their rows in the page, so that it stays under 2 MB; --all-rows keeps all"
            ));
        }
        if made.every > 1 {
            output.remark(&format!(
                "of the sweeps, one point in {} has its curves in the page, so that it stays under 2 MB; --all-rows keeps all",
                made.every
            ));
        }
        if options.size.is_some_and(|size| made.html.len() > size) {
            output.remark(&format!(
                "the page has {:.1} MB: its sweeps alone take so much",
                made.html.len() as f64 / 1e6
            ));
        }
        if let Err(error) = write_whole(&path, made.html.as_bytes()) {
            return tell(&error, output);
        }
        output.result(&format!("{}\n", path.display()));
        if damage.is_empty() { condition(&archive) } else { Exit::Archive }
    }
}

/// The last part of a path.
pub fn file_name(path: &Path) -> String {
    path.file_name().map_or_else(|| path.display().to_string(), |name| name.to_string_lossy().into_owned())
}

/// `NAME.html` for `NAME.epiloom` and `NAME.epiloom.unfinished`.
fn page_path(archive: &Path) -> PathBuf {
    let name = file_name(archive);
    let name = name.strip_suffix(".unfinished").unwrap_or(&name);
    PathBuf::from(format!("{}.html", name.strip_suffix(".epiloom").unwrap_or(name)))
}

fn same_file(a: &Path, b: &Path) -> bool {
    matches!((a.canonicalize(), b.canonicalize()), (Ok(a), Ok(b)) if a == b)
}

#[cfg(test)]
mod tests {
    use super::*;

    /// Source of truth: the rule of the manual, by hand.
    #[test]
    fn pages_take_the_name_of_their_archive() {
        assert_eq!(page_path(Path::new("a/lot 12.epiloom")), Path::new("lot 12.html"));
        assert_eq!(page_path(Path::new("lot.epiloom.unfinished")), Path::new("lot.html"));
        assert_eq!(page_path(Path::new("lot")), Path::new("lot.html"));
    }
}
