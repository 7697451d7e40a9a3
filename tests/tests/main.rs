//! End-to-end tests.

mod archives;
mod browser;
mod catalogue;
mod floors;
mod report;
mod runs;
mod scenarios;
mod support;
