//! Floor 3: pure functions of the local state: statistics and recombination. No mesh, no device.
//!
//! All quantities here are reduced: energies over kT, densities over the density scale, rates over the rate scale.

pub mod auger;
pub mod carriers;
pub mod defects;
pub mod emission;
pub mod interface_level;
pub mod ionisation;
pub mod radiative;
pub mod shockley_read_hall;
pub mod statistics;

pub use carriers::Carriers;
pub use statistics::{Statistics, ln_occupancy_excess, ln_occupancy_excess_with_slope};
