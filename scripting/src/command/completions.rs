//! `epiloom completions`: completion of commands and options for a shell.

use super::exit::Exit;
use super::output::Output;

/// `epiloom completions SHELL`.
#[derive(clap::Args, Debug)]
pub struct Completions {
    /// The shell; its manual says where the printed file belongs
    pub shell: clap_complete::Shell,
}

impl Completions {
    /// Prints the completion script.
    pub fn run(&self, mut command: clap::Command, output: &mut Output) -> Exit {
        let mut text = Vec::new();
        clap_complete::generate(self.shell, &mut command, "epiloom", &mut text);
        output.result(&String::from_utf8_lossy(&text));
        Exit::Done
    }
}
