//! End-to-end tests.

mod floors;
