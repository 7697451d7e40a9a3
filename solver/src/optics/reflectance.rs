//! Reflectance of the lit face: a number, a table, or a coating of coherent films.

use std::sync::Arc;

/// Refractive index and extinction coefficient against vacuum wavelength.
#[derive(Clone, Debug)]
pub struct OpticalConstants {
    /// Name of the substance.
    pub name: String,
    /// Where the table is from.
    pub source: String,
    /// Vacuum wavelengths, m, increasing: `[wavelengths]`.
    pub wavelength: Vec<f64>,
    /// Refractive index: `[wavelengths]`.
    pub n: Vec<f64>,
    /// Extinction coefficient: `[wavelengths]`.
    pub k: Vec<f64>,
}

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
