//! End-to-end tests.

mod archives;
mod browser;
mod catalogue;
#[cfg(unix)]
mod cluster;
mod floors;
mod pictures;
mod report;
mod runs;
mod scenarios;
mod support;
mod sweeps;
