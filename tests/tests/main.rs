//! End-to-end tests.

mod archives;
mod catalogue;
mod floors;
mod runs;
mod scenarios;
mod support;
