//! The `epiloom` command.

use std::process::ExitCode;

fn main() -> ExitCode {
    epiloom::command::run().into()
}
