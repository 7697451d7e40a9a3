//! Floor 5: light and what the layers absorb of it.

pub mod light;
pub mod reflectance;

pub use light::{Light, Spectrum};
pub use reflectance::{Film, OpticalConstants, Reflectance};
