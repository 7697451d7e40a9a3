//! Floor 2: the parameter library. Values with their validity ranges and sources, for library and custom materials alike.
//!
//! To add a material: write its record in `library/` (each law with its range, origin and source), list it in
//! `library::ALL`, give it an `OpticalModel` with its source and, where it has a table, put the file with its citation into
//! `data/` and its edge into `optical/models.rs`. The tests of this floor go over every record of the list.

pub mod choice;
mod law;
mod library;
mod lifetime;
mod listing;
pub mod material;
mod narrowing;
pub mod optical;
pub mod parameter;
mod record;
mod temperature;
mod values;

pub use choice::Choice;
pub use library::names;
pub use listing::{Listing, Provenance, library, listing};
pub use material::{Dopants, Material, MaterialBase, MaterialError, Values};
pub use narrowing::narrowing_materials;
pub use optical::{
    Absorber, Absorption, AbsorptionBasis, OpticalConstants, Refraction, equilibrium_emission,
    film_constants, film_names,
};
pub use parameter::{Kind, Parameter};
pub use record::Origin;
pub use values::{REQUIRED, TEMPERATURE_LIMITS};

#[cfg(test)]
mod tests;
