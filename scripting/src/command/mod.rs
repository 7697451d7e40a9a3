//! The command line: one file for each verb, two streams, documented exit codes.
//!
//! [`run`] is all that `main` calls. Results go to standard output, everything else to standard error.

mod archived;
mod check;
mod columns;
mod compare;
mod completions;
mod exit;
mod explain;
mod export;
mod gather;
mod holder;
mod inputs;
mod job;
mod materials;
mod output;
mod overview;
mod pictures;
mod plot;
mod recorder;
mod reference;
mod replay;
mod report;
mod report_page;
mod script;
mod show;
mod sweeps;
mod table;
mod trouble;
mod watch;

// the verb of the same name
#[path = "run.rs"]
mod run_script;

use clap::{CommandFactory, Parser, Subcommand};

pub use exit::Exit;

use output::Output;

/// What `epiloom` takes.
#[derive(Parser, Debug)]
#[command(
    name = "epiloom",
    bin_name = "epiloom",
    version,
    about = "Scripted drift-diffusion simulation of epitaxial photovoltaic stacks",
    after_help = exit::help(),
    max_term_width = 100
)]
struct Cli {
    #[command(subcommand)]
    verb: Verb,
}

/// The verbs.
#[derive(Subcommand, Debug)]
enum Verb {
    /// Run a script: solve what it asks for and store the results in an archive
    Run(run_script::Run),
    /// Look for all faults of a script and solve nothing
    Check(check::Check),
    /// Show what an archive holds, one snapshot, one sweep or one point of it
    Show(show::Show),
    /// Write a snapshot or a sweep as CSV, NPZ, JSON or Parquet
    Export(export::Export),
    /// Write an archive as one page for a browser, to be kept or sent
    Report(report_page::Report),
    /// Show the page of a run that is not over, on this machine only
    Watch(watch::Watch),
    /// Draw a snapshot, or several laid over each other, as SVG, PNG or PDF
    Plot(plot::Plot),
    /// Run an archived script again and compare every number, bit by bit
    Replay(replay::Replay),
    /// Compare two archives: inputs, materials and numbers, and what moved beyond its numerical error
    Compare(compare::Compare),
    /// Make one archive of the parts of a run
    Gather(gather::Gather),
    /// Print a script that runs the parts of a run on a cluster with Slurm
    Job(job::Job),
    /// List the built-in materials, or the values of one with ranges and sources
    Materials(materials::Materials),
    /// Explain a code such as E210
    Explain(explain::Explain),
    /// Print the reference page of the script language
    Reference(reference::Reference),
    /// Print the completion script for a shell
    Completions(completions::Completions),
}

/// Reads the command line of this process and does what it says.
pub fn run() -> Exit {
    let cli = match Cli::try_parse() {
        Ok(cli) => cli,
        Err(message) => {
            // help and version are results, everything else is a fault of usage; the text goes to its own stream
            let told = message.print().is_ok();
            return if message.use_stderr() || !told { Exit::Usage } else { Exit::Done };
        }
    };
    let mut output = Output::new();
    let exit = match &cli.verb {
        Verb::Run(verb) => verb.run(&mut output),
        Verb::Check(verb) => verb.run(&mut output),
        Verb::Show(verb) => verb.run(&mut output),
        Verb::Export(verb) => verb.run(&mut output),
        Verb::Report(verb) => verb.run(&mut output),
        Verb::Watch(verb) => verb.run(&mut output),
        Verb::Plot(verb) => verb.run(&mut output),
        Verb::Replay(verb) => verb.run(&mut output),
        Verb::Compare(verb) => verb.run(&mut output),
        Verb::Gather(verb) => verb.run(&mut output),
        Verb::Job(verb) => verb.run(&mut output),
        Verb::Materials(verb) => verb.run(&mut output),
        Verb::Explain(verb) => verb.run(&mut output),
        Verb::Reference(verb) => verb.run(&mut output),
        Verb::Completions(verb) => verb.run(Cli::command(), &mut output),
    };
    output.end_progress();
    match output.failure() {
        Some(failure) if exit == Exit::Done => {
            output.diagnostic(&failure, None);
            Exit::File
        }
        _ => exit,
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    /// Source of truth: clap's own consistency check, and the table of exit codes.
    #[test]
    fn the_command_line_is_consistent_and_tells_its_exit_codes() {
        Cli::command().debug_assert();
        let help = Cli::command().render_long_help().to_string();
        for (_, code, meaning) in exit::TABLE {
            assert!(
                help.contains(&format!("{code:>3}  "))
                    && help.contains(meaning.split(' ').next().unwrap_or(meaning)),
                "{code}: {help}"
            );
        }
    }
}
