//! Floor 1: physical constants. All values are SI.

pub mod constants;
