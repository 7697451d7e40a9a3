//! Benchmarks of the main job.

fn main() {}
