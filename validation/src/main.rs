//! Runs all checks.

fn main() {}
