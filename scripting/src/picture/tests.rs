//! Tests of pictures: what charts say of made-up snapshots, and drawings against the ones that were looked at.

mod data;
mod golden;
mod sample;
