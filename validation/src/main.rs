//! Checks of Epiloom against sources outside the project: prints one table, writes it to REPORT.md and fails where a check fails.
//! With a command, one topic, or one of the two populations of random devices: `survey` (robustness) and `errors` (the stated error).

use std::io::Write;
use std::path::Path;
use std::process::ExitCode;

use clap::{Parser, Subcommand};

mod bulk;
mod check;
mod estimates;
#[cfg(test)]
mod mutations;
mod not_covered;
mod populations;
mod report;
mod stored;
mod survey;
mod topics;

/// Checks of Epiloom against sources outside the project.
#[derive(Parser)]
struct Arguments {
    #[command(subcommand)]
    command: Option<Command>,
}

/// What to do instead of the checks.
#[derive(Subcommand)]
enum Command {
    /// The checks of one topic (a file of src/topics); writes nothing.
    Topic {
        /// Its name.
        name: String,
    },
    /// Random legal devices: solved or diagnosed, and their accounts derived again.
    Survey {
        /// How many.
        #[arg(long, default_value_t = 300)]
        count: u64,
        /// Seed of the survey.
        #[arg(long, default_value_t = 0)]
        seed: u64,
        /// Index of the first device.
        #[arg(long, default_value_t = 0)]
        first: u64,
        /// Describes the first device and what became of it, and no other.
        #[arg(long)]
        describe: bool,
    },
    /// Random cells: the error that the program states against a solution on many nodes.
    Errors {
        /// How many cells with figures.
        #[arg(long, default_value_t = 100)]
        count: usize,
        /// Seed of the population.
        #[arg(long, default_value_t = 1)]
        seed: u64,
        /// Fewest nodes of the finest reference.
        #[arg(long, default_value_t = 40_000)]
        nodes: usize,
        /// The relative accuracy asked for.
        #[arg(long, default_value_t = estimates::ACCURACY)]
        accuracy: f64,
        /// Lists every figure: cell, name, value, error, reference, its doubt, the value on each mesh.
        #[arg(long)]
        list: bool,
    },
}

/// A line on the terminal that counts.
fn progress(done: usize) {
    if done.is_multiple_of(10) {
        eprint!("\r{done} done ");
        // Progress that cannot be shown is no reason to stop.
        std::io::stderr().flush().unwrap_or_default();
    }
}

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

fn run(command: Option<Command>) -> Result<bool, stored::Failure> {
    match command {
        None => all(),
        Some(Command::Topic { name }) => one(&name),
        Some(Command::Survey { seed, first, describe: true, .. }) => {
            let device = survey::seed_of(seed, first);
            println!("{}", survey::specimen::describe(device));
            println!("{:#?}", survey::examine::examine(device));
            Ok(true)
        }
        Some(Command::Survey { count, seed, first, describe: false }) => {
            let found = survey::survey(seed, first, count, progress);
            eprintln!();
            print!("{}", found.report());
            Ok(found.reach_the_goal())
        }
        Some(Command::Errors { count, seed, nodes, accuracy, list }) => {
            let found = estimates::population(seed, count, nodes, accuracy, progress)?;
            eprintln!();
            if list {
                for s in &found.scored {
                    println!(
                        "{}\t{}\t{:e}\t{:e}\t{:e}\t{:e}\t{:?}",
                        s.seed,
                        s.figure,
                        s.stated.value,
                        s.stated.error,
                        s.reference,
                        s.doubt,
                        s.stated.levels
                    );
                }
            }
            print!("{}", found.report());
            Ok(found.is_honest())
        }
    }
}

fn main() -> ExitCode {
    match run(Arguments::parse().command) {
        Ok(true) => ExitCode::SUCCESS,
        Ok(false) => ExitCode::from(1),
        Err(failure) => {
            eprintln!("error: the checks could not be finished: {failure}");
            ExitCode::from(2)
        }
    }
}
