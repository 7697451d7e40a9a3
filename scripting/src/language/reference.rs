//! The reference page, written from the vocabulary: `epiloom reference` prints it, `REFERENCE.md` is its copy.

use std::fmt::Write;

use super::units::{Scale, UNITS};
use super::vocabulary::{Sort, topics};

/// The reference page as Markdown.
pub fn reference() -> String {
    let mut page = String::from(
        "# Reference of the script language\n\n\
         Written by `epiloom reference` from the table that teaches the language its words; a test keeps this copy in step.\n\
         Scripts are Rhai: `let`, `if`, `for`, `while`, `fn`, closures `|t| ..`, arrays `[..]`, maps `#{ .. }`, texts in double\n\
         quotes, or in back quotes with `${..}` inside.\n",
    );
    for topic in topics() {
        // writing to a text cannot fail, here and below
        let _ = write!(page, "\n## {}\n\n{}\n", topic.title, topic.intro);
        for entry in topic.entries {
            let title = match entry.sort {
                Sort::Function | Sort::Constant => format!("`{}`", entry.name),
                Sort::Method | Sort::Property => format!("`{}` of a {}", entry.name, entry.owner),
            };
            let _ = write!(page, "\n### {title}\n\n");
            for form in entry.forms {
                let _ = writeln!(page, "- `{form}`");
            }
            let _ = write!(page, "\n{}\n", entry.doc);
            if !entry.options.is_empty() {
                let _ = write!(page, "\n| option | takes | |\n|---|---|---|\n");
                for option in entry.options {
                    let _ = writeln!(page, "| `{}` | {} | {} |", option.key, option.takes, option.doc);
                }
            }
            let _ = write!(page, "\n```rhai\n{}\n```\n", entry.example);
        }
    }
    page.push_str("\n## Units\n\n| unit | printed | what it is | in SI |\n|---|---|---|---|\n");
    for unit in UNITS {
        let si = match unit.scale {
            Scale::Times(factor) => format!("{factor:e}"),
            Scale::Over(divisor) => format!("1/{divisor:e}"),
        };
        let _ = writeln!(
            page,
            "| `{}` | {} | {} | {si} {} |",
            unit.name,
            unit.symbol,
            unit.words,
            unit.dimension.base_units()
        );
    }
    page
}
