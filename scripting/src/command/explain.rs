//! `epiloom explain`: what a code means and how to mend it.

use std::fmt::Write;

use crate::diagnostics::{Diagnostic, Entry, codes, entries, explain, suggest};

use super::columns::{columns, wrapped};
use super::exit::Exit;
use super::output::Output;

/// `epiloom explain [CODE]`.
#[derive(clap::Args, Debug)]
pub struct Explain {
    /// The code in brackets in a message, such as E210; without one all codes are listed
    pub code: Option<String>,
}

impl Explain {
    /// Prints the page of the code.
    pub fn run(&self, output: &mut Output) -> Exit {
        let Some(code) = &self.code else {
            let rows: Vec<Vec<String>> =
                entries().map(|e| vec![e.code.to_string(), e.title.to_string()]).collect();
            output.result(&columns(&rows, &[], 0));
            return Exit::Done;
        };
        match explain(code.trim().trim_matches(['[', ']'])) {
            Some(entry) => {
                output.result(&page(entry));
                Exit::Done
            }
            None => {
                let near = suggest(&code.to_uppercase(), entries().map(|e| e.code.as_str()));
                let help = match near {
                    Some(near) => format!("did you mean `{near}`? `epiloom explain` lists all"),
                    None => "`epiloom explain` lists all codes".to_string(),
                };
                output.diagnostic(
                    &Diagnostic::new(codes::UNKNOWN_CODE, format!("no code `{code}`")).help(help),
                    None,
                );
                Exit::of(codes::UNKNOWN_CODE)
            }
        }
    }
}

/// The page of a code.
fn page(entry: &Entry) -> String {
    let mut text = format!("{}: {}\n\n{}\n", entry.code, entry.title, wrapped(entry.explanation, 88, 0));
    text.push_str("Example:\n");
    for line in entry.example.lines() {
        // writing to a text cannot fail
        let _ = writeln!(text, "    {line}");
    }
    text
}
