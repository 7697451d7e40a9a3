//! Reflectance of the lit face: a number, a table, or a coating of coherent films.

use std::sync::Arc;

pub use crate::materials::OpticalConstants;

/// One film of a coating.
#[derive(Clone, Debug)]
pub struct Film<P = f64> {
    /// Its substance.
    pub constants: Arc<OpticalConstants>,
    /// Thickness, m.
    pub thickness: P,
}

/// Reflectance of the lit face for light from outside, at normal incidence.
#[derive(Clone, Debug)]
pub enum Reflectance<P = f64> {
    /// The same at every wavelength.
    Number(P),
    /// A table against vacuum wavelength (m, increasing), linear between its points, constant beyond them.
    Table {
        /// Wavelengths, m: `[points]`.
        wavelength: Vec<f64>,
        /// Reflectance there, 0 to 1: `[points]`.
        reflectance: Vec<P>,
    },
    /// Coherent films, outermost first, on the first semiconductor.
    Coating(Vec<Film<P>>),
}
