//! What shines on a stack.

use std::sync::Arc;

/// A spectral irradiance on a grid of vacuum wavelengths.
#[derive(Clone, Debug)]
pub struct Spectrum {
    /// Its name ("AM1.5G", "black body 5800 K", a file's name).
    pub name: String,
    /// Where it is from, for archives and reports.
    pub source: String,
    /// Vacuum wavelengths, m, increasing: `[wavelengths]`.
    pub wavelength: Vec<f64>,
    /// Spectral irradiance, W m^-2 m^-1: `[wavelengths]`.
    pub irradiance: Vec<f64>,
}

/// What shines on a stack.
#[derive(Clone, Debug)]
pub enum Light {
    /// Nothing.
    Dark,
    /// A spectrum times a concentration.
    Spectrum {
        /// The spectrum at one sun.
        spectrum: Arc<Spectrum>,
        /// Concentration in suns.
        suns: f64,
    },
    /// One photon flux, absorbed by each layer's scalar `absorption`, or, with a wavelength, by its table there.
    Monochromatic {
        /// Photons that enter the stack, m^-2 s^-1.
        photon_flux: f64,
        /// Vacuum wavelength, m; `None` gives the photons no energy.
        wavelength: Option<f64>,
    },
}
