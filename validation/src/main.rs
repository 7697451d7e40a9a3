//! Checks of Epiloom against sources outside the project: prints one table, writes it to REPORT.md and fails where a check fails.

use std::path::Path;
use std::process::ExitCode;

mod bulk;
mod check;
#[cfg(test)]
mod mutations;
mod not_covered;
mod report;
mod stored;
mod topics;

const USAGE: &str = "epiloom-validation            all checks; writes REPORT.md\n\
                     epiloom-validation topic NAME the checks of one topic (a file of src/topics); writes nothing";

/// Every check; their table goes to REPORT.md.
fn all() -> Result<bool, stored::Failure> {
    let checks = topics::all()?;
    print!("{}", report::plain(&checks));
    let path = Path::new(env!("CARGO_MANIFEST_DIR")).join("REPORT.md");
    std::fs::write(path, report::markdown(&checks))?;
    Ok(checks.iter().all(check::Check::passes))
}

/// The checks of one topic.
fn one(name: &str) -> Result<bool, stored::Failure> {
    let known: Vec<&str> = topics::TOPICS.iter().map(|(known, _)| *known).collect();
    let (_, topic) = topics::TOPICS
        .iter()
        .find(|(known, _)| *known == name)
        .ok_or_else(|| format!("no topic `{name}`; the topics: {}", known.join(", ")))?;
    let checks = topic()?;
    print!("{}", report::plain(&checks));
    Ok(checks.iter().all(check::Check::passes))
}

fn main() -> ExitCode {
    let arguments: Vec<String> = std::env::args().skip(1).collect();
    let words: Vec<&str> = arguments.iter().map(String::as_str).collect();
    let outcome = match words[..] {
        [] => all(),
        ["topic", name] => one(name),
        _ => Err(USAGE.into()),
    };
    match outcome {
        Ok(true) => ExitCode::SUCCESS,
        Ok(false) => ExitCode::from(1),
        Err(failure) => {
            eprintln!("error: the checks could not be finished: {failure}");
            ExitCode::from(2)
        }
    }
}
