//! Checks of Epiloom against sources outside the project: prints one table, writes it to REPORT.md and fails where a check fails.

use std::path::Path;
use std::process::ExitCode;

mod check;
#[cfg(test)]
mod mutations;
mod report;
mod stored;
mod topics;

fn run() -> Result<bool, stored::Failure> {
    let checks = topics::all()?;
    print!("{}", report::plain(&checks));
    let path = Path::new(env!("CARGO_MANIFEST_DIR")).join("REPORT.md");
    std::fs::write(path, report::markdown(&checks))?;
    Ok(checks.iter().all(check::Check::passes))
}

fn main() -> ExitCode {
    match run() {
        Ok(true) => ExitCode::SUCCESS,
        Ok(false) => ExitCode::from(1),
        Err(failure) => {
            eprintln!("error: the checks could not be finished: {failure}");
            ExitCode::from(2)
        }
    }
}
