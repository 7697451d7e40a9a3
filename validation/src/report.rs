//! The table of the checks: for a terminal and for REPORT.md, whose step with the program a test keeps.

use crate::check::{Check, Tolerance};
use crate::not_covered::NOT_COVERED;
use crate::populations::POPULATIONS;

const HEADERS: [&str; 9] =
    ["topic", "what", "source", "reference", "ours", "difference", "tolerance", "why this tolerance", "pass"];

/// A number to so many significant digits, plain where that is readable.
fn number(value: f64, digits: usize) -> String {
    format!("{value:.*e}", digits.saturating_sub(1))
}

fn row(check: &Check) -> [String; 9] {
    let tolerance = match check.tolerance {
        Tolerance::Relative(t) => format!("{t:e} relative"),
        Tolerance::Absolute(t) => format!("{t:e} absolute"),
        Tolerance::AtMost => "at most the reference".to_string(),
        Tolerance::AtLeast => "at least the reference".to_string(),
    };
    [
        check.topic.to_string(),
        check.what.clone(),
        check.source.to_string(),
        number(check.reference, check.digits()),
        number(check.ours, check.digits()),
        format!("{:.0e}", check.difference()),
        tolerance,
        check.reason.to_string(),
        if check.passes() { "yes" } else { "NO" }.to_string(),
    ]
}

/// One line that says how many hold.
fn summary(checks: &[Check]) -> String {
    let passed = checks.iter().filter(|c| c.passes()).count();
    format!("{passed} of {} checks hold.", checks.len())
}

/// The table in columns.
pub fn plain(checks: &[Check]) -> String {
    let mut rows = vec![HEADERS.map(str::to_string)];
    rows.extend(checks.iter().map(row));
    let width = |column: usize| rows.iter().map(|r| r[column].chars().count()).max().unwrap_or(0);
    let widths: Vec<usize> = (0..HEADERS.len()).map(width).collect();
    let mut text = String::new();
    for row in &rows {
        let cells: Vec<String> = row.iter().zip(&widths).map(|(cell, w)| format!("{cell:<w$}")).collect();
        text.push_str(cells.join("  ").trim_end());
        text.push('\n');
    }
    text.push_str(&summary(checks));
    text.push('\n');
    text
}

/// The table as a page.
pub fn markdown(checks: &[Check]) -> String {
    let mut text = String::from(
        "# Checks against sources outside the project\n\n\
         Written by `cargo run --release -p epiloom-validation`; a test keeps it in step. Numbers carry as many digits as the \
         tolerance resolves, and one more.\n\n",
    );
    text.push_str(&format!("{}\n\n", summary(checks)));
    text.push_str(&format!("| {} |\n", HEADERS.join(" | ")));
    text.push_str(&format!("|{}\n", "---|".repeat(HEADERS.len())));
    for check in checks {
        text.push_str(&format!("| {} |\n", row(check).map(|c| c.replace('|', "\\|")).join(" | ")));
    }
    text.push_str("\n## Populations of random devices\n\n");
    for population in POPULATIONS {
        text.push_str(&format!("- {population}\n"));
    }
    text.push_str("\n## Not covered\n\n");
    for gap in NOT_COVERED {
        text.push_str(&format!("- {gap}\n"));
    }
    text
}

#[cfg(test)]
mod tests {
    use std::sync::OnceLock;

    use super::*;

    /// The checks, run once for the tests here.
    fn checks() -> &'static [Check] {
        static CHECKS: OnceLock<Vec<Check>> = OnceLock::new();
        CHECKS.get_or_init(|| crate::topics::all().expect("every topic could be worked out"))
    }

    /// Truth: each check's own source, within its own tolerance.
    #[test]
    fn every_check_holds() {
        let failed: Vec<&Check> = checks().iter().filter(|c| !c.passes()).collect();
        assert!(!checks().is_empty());
        assert!(failed.is_empty(), "{failed:#?}");
    }

    /// Truth: the checks as they run now. Texts must be the same; our numbers within the check's tolerance and the digits
    /// printed; the differences, which are rounding, are not compared.
    #[test]
    fn the_report_is_in_step() {
        const DIFFERENCE: usize = 5;
        const OURS: usize = 4;
        let stored = include_str!("../REPORT.md");
        let fresh = markdown(checks());
        let (old, new): (Vec<&str>, Vec<&str>) = (stored.lines().collect(), fresh.lines().collect());
        let help = "run `cargo run --release -p epiloom-validation` and look at what changed";
        assert_eq!(old.len(), new.len(), "{help}");
        let table = old.iter().position(|l| l.starts_with("|---")).map_or(old.len(), |l| l + 1);
        let rows = table..table + checks().len();
        for (line, (a, b)) in old.iter().zip(&new).enumerate() {
            let (x, y): (Vec<&str>, Vec<&str>) = (a.split(" | ").collect(), b.split(" | ").collect());
            assert_eq!(x.len(), y.len(), "line {}: {help}", line + 1);
            for (column, (p, q)) in x.iter().zip(&y).enumerate() {
                if rows.contains(&line) && column == DIFFERENCE {
                    continue;
                }
                if rows.contains(&line) && column == OURS {
                    let check = &checks()[line - table];
                    let stored = Check { ours: p.parse().unwrap_or(f64::NAN), ..check.clone() };
                    let near = (stored.ours - check.ours).abs();
                    let measure = match stored.tolerance {
                        Tolerance::Relative(t) => t * check.reference.abs(),
                        Tolerance::Absolute(t) => t,
                        // A bound says nothing of the number itself: it may move by what an extrapolated figure may.
                        Tolerance::AtMost | Tolerance::AtLeast => 1e-2 * check.ours.abs(),
                    };
                    assert!(near <= measure, "line {}: {p} is now {q}; {help}", line + 1);
                    continue;
                }
                // Which of many is the worst may turn on rounding.
                let part = |t: &str| t.split(": worst of").next().unwrap_or_default().to_string();
                let worst = x.get(1).is_some_and(|what| what.contains(": worst of"));
                if column == 1 {
                    assert_eq!(part(p), part(q), "line {}: {help}", line + 1);
                } else if !(worst && column == 3) {
                    assert_eq!(p, q, "line {}: {help}", line + 1);
                }
            }
        }
    }
}
