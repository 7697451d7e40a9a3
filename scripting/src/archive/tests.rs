//! Tests of the archive.

mod damage;
mod exports;
mod format_page;
mod other_readers;
mod power_cut;
mod round_trip;
mod sample;
mod sweeps;
mod writing;
