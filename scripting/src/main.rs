//! The `epiloom` command.

fn main() {}
