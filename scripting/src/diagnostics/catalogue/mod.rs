//! The catalogue: every code with its title, its explanation and an example; one row adds a code.
//!
//! | family | about |
//! |---|---|
//! | E1 | the script as a text: names, functions, kinds of value, inputs |
//! | E2 | quantities, materials, stacks, light |
//! | E3 | solving |
//! | E4 | files and archives |
//! | E5 | limits on scripts, interruption |
//! | E9 | faults of Epiloom itself |
//! | W | warnings: the work goes on |

mod files;
mod quantities;
mod script;
mod solving;
mod stack;
mod warnings;

use std::fmt;

use super::Severity;

/// A stable code ("E210"), only ever one of the catalogue's.
#[derive(Clone, Copy, PartialEq, Eq, PartialOrd, Ord, Hash)]
pub struct Code(&'static str);

impl Code {
    /// The code of this text, in either case, if the catalogue has it.
    pub fn find(text: &str) -> Option<Code> {
        entries().find(|entry| entry.code.0.eq_ignore_ascii_case(text.trim())).map(|entry| entry.code)
    }

    /// Its text.
    pub fn as_str(self) -> &'static str {
        self.0
    }

    /// A warning for W, an error for E.
    pub fn severity(self) -> Severity {
        if self.0.starts_with('W') { Severity::Warning } else { Severity::Error }
    }
}

impl fmt::Display for Code {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        f.write_str(self.0)
    }
}

impl fmt::Debug for Code {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        f.write_str(self.0)
    }
}

/// One row of the catalogue.
#[derive(Clone, Copy, Debug)]
pub struct Entry {
    /// The code.
    pub code: Code,
    /// What it is about, in a few words.
    pub title: &'static str,
    /// What it means, why it is so, how to mend it.
    pub explanation: &'static str,
    /// A small example, as it is typed.
    pub example: &'static str,
}

/// Rows `NAME = "code", "title", "explanation", "example";`: a constant for each, and the table.
macro_rules! rows {
    ($($name:ident = $code:literal, $title:literal, $explanation:literal, $example:literal;)*) => {
        use super::{Code, Entry};
        $(
            #[doc = concat!($code, ": ", $title, ".")]
            pub const $name: Code = Code($code);
        )*
        /// The rows of this family.
        pub(super) static ENTRIES: &[Entry] = &[
            $(Entry { code: $name, title: $title, explanation: $explanation, example: $example },)*
        ];
    };
}
use rows;

/// The codes by name.
pub mod codes {
    pub use super::files::*;
    pub use super::quantities::*;
    pub use super::script::*;
    pub use super::solving::*;
    pub use super::stack::*;
    pub use super::warnings::*;
}

/// All rows, by family.
pub fn entries() -> impl Iterator<Item = &'static Entry> {
    [
        script::ENTRIES,
        quantities::ENTRIES,
        stack::ENTRIES,
        solving::ENTRIES,
        files::ENTRIES,
        warnings::ENTRIES,
    ]
    .into_iter()
    .flatten()
}

/// The row of a code given in either case, if there is one.
pub fn explain(code: &str) -> Option<&'static Entry> {
    let code = Code::find(code)?;
    entries().find(|entry| entry.code == code)
}
