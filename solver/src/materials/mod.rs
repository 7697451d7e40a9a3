//! Floor 2: the parameter library. Values with their validity ranges and sources, for library and custom materials alike.

mod law;
mod library;
mod listing;
pub mod material;
pub mod optical;
pub mod parameter;
mod record;
mod values;

pub use library::names;
pub use listing::{Listing, Provenance, library, listing};
pub use material::{Material, MaterialBase, MaterialError, Values};
pub use optical::{Absorber, Absorption, AbsorptionBasis, OpticalConstants, Refraction};
pub use parameter::{Kind, Parameter};
pub use record::Origin;
pub use values::{REQUIRED, TEMPERATURE_LIMITS};

#[cfg(test)]
mod tests;
