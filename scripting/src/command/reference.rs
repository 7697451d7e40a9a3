//! `epiloom reference`: the reference page of the script language.

use crate::language;

use super::exit::Exit;
use super::output::Output;

/// `epiloom reference`.
#[derive(clap::Args, Debug)]
pub struct Reference {}

impl Reference {
    /// Prints it.
    pub fn run(&self, output: &mut Output) -> Exit {
        output.result(&language::reference());
        Exit::Done
    }
}
