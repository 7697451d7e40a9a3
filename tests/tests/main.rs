//! End-to-end tests.

mod archives;
mod floors;
mod runs;
mod scenarios;
mod support;
